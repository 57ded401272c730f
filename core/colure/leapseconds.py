"""Turn UTC into TAI and back by the shipped table of leap seconds, from 1972-01-01 on.

UTC is held as the MJD of its day and the seconds since the day began, which run to 86401 on a day that ends with a
leap second: no instant is lost or doubled. The table is our own; no process-wide table of another library is touched.
"""

from bisect import bisect_right
from functools import cache

import numpy as np

from colure import resources
from colure.arrays import Float, Int

START = 41317
"""MJD of 1972-01-01, from which UTC ticks SI seconds."""
DAY = 86400.0
TT_MINUS_TAI = 32.184


@cache
def _table() -> tuple[Int, Int]:
    """Return the MJD at whose 0h each step takes effect, and TAI−UTC in seconds from then on."""
    table = np.asarray(resources.load_array("time/leapseconds.npy", mmap=False), dtype=np.int64)
    return np.ascontiguousarray(table[:, 0]), np.ascontiguousarray(table[:, 1])


@cache
def _lists() -> tuple[list[int], list[int]]:
    """Return the table as lists, for single moments."""
    days, offsets = _table()
    return days.tolist(), offsets.tolist()


def tai_minus_utc(mjd: Int | int) -> Int | int:
    """Return TAI−UTC in whole seconds during UTC days given by their MJD; the caller keeps to 1972 and later."""
    if isinstance(mjd, int):
        days, offsets = _lists()
        return offsets[max(bisect_right(days, mjd) - 1, 0)]
    table_days, table_offsets = _table()
    return np.asarray(table_offsets[np.maximum(np.searchsorted(table_days, mjd, side="right") - 1, 0)])


def day_length(mjd: Int | int) -> Int | int:
    """Return the length of UTC days in seconds, 86400 or 86401."""
    return 86400 + tai_minus_utc(mjd + 1) - tai_minus_utc(mjd)


def split_tt(jd1: Float | float, jd2: Float | float) -> tuple[Int | int, Float | float]:
    """Return the MJD and the seconds of the UTC day of TT Julian dates.

    `jd1` is a midnight (ends in .5) and `jd2` a part of a day, so that nothing is lost to rounding (1e-11 s).
    """
    if isinstance(jd1, float) and isinstance(jd2, float):
        days, offsets = _lists()
        base = round(jd1 - 2400000.5)
        tai = jd2 * DAY - TT_MINUS_TAI
        # Compare in seconds from a step: an MJD in one number would be good to a microsecond only.
        i = max(bisect_right(days, base + 1) - 1, 0)
        if i > 0 and (base - days[i]) * DAY + tai < offsets[i]:
            i -= 1
        seconds = tai - offsets[i]
        day = base + int(seconds // DAY)
        last = days[i + 1] - 1 if i + 1 < len(days) else day
        day = min(day, last)  # inside a leap second the day before is not over yet
        return day, seconds - (day - base) * DAY
    table_days, table_offsets = _table()
    base_days = np.rint(np.asarray(jd1) - 2400000.5).astype(np.int64)
    tai_seconds = np.asarray(jd2) * DAY - TT_MINUS_TAI
    index = np.maximum(np.searchsorted(table_days, base_days + 1, side="right") - 1, 0)
    early = (base_days - table_days[index]) * DAY + tai_seconds < table_offsets[index]
    index = np.maximum(index - early, 0)
    of_day = tai_seconds - table_offsets[index]
    utc_day = base_days + np.floor(of_day / DAY).astype(np.int64)
    ends = np.append(table_days[1:] - 1, np.iinfo(np.int64).max)
    utc_day = np.minimum(utc_day, ends[index])
    return utc_day, of_day - (utc_day - base_days) * DAY


def join_tt(mjd: Int | int, seconds: Float | float) -> tuple[Float | float, Float | float]:
    """Return TT Julian dates (midnight, part of a day, which may pass 1) of UTC days and seconds of the day."""
    clock = seconds + tai_minus_utc(mjd) + TT_MINUS_TAI
    if isinstance(mjd, int) and isinstance(clock, float):
        return mjd + 2400000.5, clock / DAY
    return np.asarray(mjd, dtype=np.float64) + 2400000.5, np.asarray(clock, dtype=np.float64) / DAY

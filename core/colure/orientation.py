"""Look up TT−UT1 and the pole of the Earth in the shipped IERS table, for one moment or many.

The table is daily at 0h UTC from 1962-01-01 (IERS 20 C04, then Bulletin A with its predictions) and is interpolated
linearly, as the table's users commonly do; the tides in UT1 of less than a day (0.03 ms) are left out.
"""

import math
from functools import cache

import numpy as np

from colure import resources
from colure.arrays import ARCSEC, Float, Int

MJD0 = 2400000.5
_DAY = 86400.0
_FADE = 365.25
"""Days over which the pole is led to zero at either end of the table, lest a drawn place should jump."""


@cache
def _table() -> Int:
    """Return the table (4, days), memory-mapped: MJD, TT−UT1 in 1e-7 s, pole x and y in 1e-6 arcsec."""
    return resources.load_array("time/iers.npy")


@cache
def span() -> tuple[float, float]:
    """Return the first and last Julian date (TT) at which the table gives TT−UT1."""
    table = _table()
    first, last = (float(table[0, i]) + MJD0 + float(table[1, i]) * 1e-7 / _DAY for i in (0, -1))
    return first, last


@cache
def utc_end() -> int:
    """Return the MJD of the last day of the table: UTC is not known to exist, or how, after its 0h."""
    return int(_table()[0, -1])


def _place(jd1: Float, jd2: Float) -> tuple[Int, Float]:
    """Return the table index before each moment and the fraction of the day after it.

    The fraction is of the UT1 day instead of the UTC day: they differ by less than 0.9 s, which at 4 ms a day is
    less than 0.05 µs of UT1.
    """
    table = _table()
    days = (jd1 - MJD0 - float(table[0, 0])) + jd2
    # The row before TT − 70 s is never after the moment; near midnight the last row is extrapolated by seconds.
    index = np.clip(np.floor(days - 8e-4).astype(np.int64), 0, table.shape[1] - 2)
    return index, days - index - table[1, index] * (1e-7 / _DAY)


def tt_minus_ut1(jd1: Float | float, jd2: Float | float) -> Float | float:
    """Return TT−UT1 in seconds at TT Julian dates inside `span()`; the caller sees to that.

    Scalars take and return Python floats.
    """
    table = _table()
    if isinstance(jd1, float) and isinstance(jd2, float):
        days = (jd1 - MJD0 - int(table[0, 0])) + jd2
        i = min(max(math.floor(days - 8e-4), 0), table.shape[1] - 2)
        a, b = int(table[1, i]), int(table[1, i + 1])
        return float((a + (b - a) * (days - i - a * (1e-7 / _DAY))) * 1e-7)
    index, part = _place(np.asarray(jd1), np.asarray(jd2))
    row = table[1]
    before = row[index].astype(np.float64)
    return np.asarray((before + (row[index + 1] - before) * part) * 1e-7)


def pole(jd1: Float | float, jd2: Float | float) -> tuple[Float, Float]:
    """Return the pole coordinates (xp, yp) in radians at TT Julian dates.

    Outside the table, where the pole is not known, they fall to zero within a year (0.3″ is 10 m on the ground).
    """
    first, last = span()
    if isinstance(jd1, float) and isinstance(jd2, float):
        return _pole_once(jd1, jd2, first, last)
    j1, j2 = np.asarray(jd1, dtype=np.float64), np.asarray(jd2, dtype=np.float64)
    before, after = (first - j1) - j2, (j1 - last) + j2
    weight = np.clip(1.0 - np.maximum(before, after) / _FADE, 0.0, 1.0)
    index, part = _place(j1, j2)
    part = np.clip(part, 0.0, 1.0)
    table = _table()
    scale = weight * (1e-6 * ARCSEC)
    x, y = ((row[index] + (row[index + 1] - row[index]) * part) * scale for row in (table[2], table[3]))
    return x, y


def _pole_once(jd1: float, jd2: float, first: float, last: float) -> tuple[Float, Float]:
    """Return the same for one moment in Python's numbers, three times as fast as arrays of no dimension."""
    table = _table()
    weight = min(max(1.0 - max((first - jd1) - jd2, (jd1 - last) + jd2) / _FADE, 0.0), 1.0)
    days = (jd1 - MJD0 - int(table[0, 0])) + jd2
    i = min(max(math.floor(days - 8e-4), 0), table.shape[1] - 2)
    part = min(max(days - i - int(table[1, i]) * (1e-7 / _DAY), 0.0), 1.0)
    scale = weight * (1e-6 * ARCSEC)
    x, y = ((int(row[i]) + (int(row[i + 1]) - int(row[i])) * part) * scale for row in (table[2], table[3]))
    return np.asarray(x), np.asarray(y)

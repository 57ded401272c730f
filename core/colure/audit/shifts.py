"""Mistakes of time (list E): how many days the moment that was used lies from the moment that was meant."""

from dataclasses import dataclass

import numpy as np

from colure import calendars
from colure.arrays import Float
from colure.moment import Moment

DAY = 86400.0
ZONES = tuple(
    h for h in (*range(-14, 15), -9.5, -4.5, -3.5, 3.5, 4.5, 5.5, 5.75, 6.5, 8.75, 9.5, 10.5) if abs(h) != 12 and h
)
"""Time zones in use, hours; twelve hours belong to a mistake of their own."""


@dataclass(frozen=True, slots=True)
class Shift:
    """One mistake of time: key, code, words, and the days (n,) to be added to the moment; NaN where it cannot be."""

    key: str
    code: str
    words: str
    days: Float


def shifts(moment: Moment, exposure_s: float | None) -> tuple[Shift, ...]:
    """Return every mistake of time that moves a body at the moments (n,)."""
    size = moment.size
    delta = np.broadcast_to(np.asarray(moment.delta_t_s, dtype=np.float64), (size,))
    found = []
    has_utc = np.broadcast_to(np.asarray(moment.has_utc, dtype=np.bool_), (size,))
    seconds = delta.copy()
    if np.any(has_utc):
        at = moment[np.flatnonzero(has_utc)]
        # TT − UTC is 32.184 s and whole leap seconds.
        late = (np.asarray(at.tt[0]) - np.asarray(at.utc[0])) + (np.asarray(at.tt[1]) - np.asarray(at.utc[1]))
        whole = np.full(size, np.nan)
        whole[has_utc] = np.rint(late * DAY - 32.184)
        seconds = np.where(has_utc, whole + 32.184, delta)
        tai = whole / DAY
        found += [
            Shift("tai-late", "E1", "TAI taken for UTC", -tai),
            Shift("tai-early", "E1", "UTC taken for TAI", tai),
        ]
    found += [
        Shift("tt-late", "E1", "TT taken for UTC (or UT: ΔT left out)", -seconds / DAY),
        Shift("tt-early", "E1", "UTC (or UT) taken for TT", seconds / DAY),
        Shift(
            "half-early",
            "E3",
            "12 h early (noon for midnight, or a Julian date that lacks its half day)",
            _days(-0.5, size),
        ),
        Shift("half-late", "E4", "12 h late (midnight for noon, or MJD with half a day added)", _days(0.5, size)),
    ]
    for hours in ZONES:
        way = "late" if hours > 0 else "early"
        found.append(Shift(f"zone{hours:+g}", "E2", f"{abs(hours):g} h {way} (time zone)", _days(hours / 24.0, size)))
    if exposure_s is not None:
        half = exposure_s / 2.0 / DAY
        found.append(Shift("middle", "E5", "middle of the exposure, not its start", _days(half, size)))
        found.append(Shift("end", "E5", "end of the exposure, not its start", _days(2.0 * half, size)))
    return (*found, *_civil(moment))


def _days(value: float, size: int) -> Float:
    return np.full(size, value)


def _civil(moment: Moment) -> tuple[Shift, ...]:
    """Return the mistakes of the calendar: the same written date in the other calendar, or a year away."""
    scale = "TT"
    year, month, day, *_ = moment.civil(scale)
    year, month, day = (np.atleast_1d(np.asarray(part, dtype=np.int64)) for part in (year, month, day))
    used = np.atleast_1d(np.asarray(moment.calendar_used))
    gregorian = used == "gregorian"
    # A day of February that only one calendar has is taken a day earlier: the shift is the same.
    safe = np.where((month == 2) & (day == 29), 28, day)
    by_gregorian = calendars.day_number(year, month, safe, "gregorian")
    by_julian = calendars.day_number(year, month, safe, "julian")
    other = np.where(gregorian, by_julian - by_gregorian, by_gregorian - by_julian).astype(np.float64)
    here = np.where(gregorian, by_gregorian, by_julian)
    found = []
    if np.any(other != 0.0):
        moved = np.where(other == 0.0, np.nan, other)
        found.append(Shift("calendar", "E6", "the date taken in the other calendar (Julian or Gregorian)", moved))
        found.append(
            Shift("calendar-back", "E6", "a date of the other calendar brought to this one the wrong way", -moved)
        )
    for step, words in (
        (-1, "a year early (counting without a year 0)"),
        (1, "a year late (counting without a year 0)"),
    ):
        to = np.where(
            gregorian,
            calendars.day_number(year + step, month, safe, "gregorian"),
            calendars.day_number(year + step, month, safe, "julian"),
        )
        found.append(Shift(f"year{step:+d}", "E7", words, (to - here).astype(np.float64)))
    return tuple(found)

"""Say where UTC exists and turn UT1 into TT: what a moment needs to be made from a clock reading."""

from typing import Any

import numpy as np

from colure import calendars, deltat, leapseconds, orientation
from colure.arrays import Float
from colure.errors import MomentError


def utc_span() -> str:
    """Return a clause that says where UTC exists and is known."""
    year, month, day = calendars.calendar_date(orientation.utc_end() + 2400001)
    return f"it starts in 1972 and is known up to {year}-{month:02d}-{day:02d}, the end of the shipped IERS table"


def scale_at(mjd: Any) -> str:
    """Return the scale meant where none is named: UTC from 1972 to the end of the IERS table, UT1 elsewhere."""
    days = np.asarray(mjd)
    known = (days >= leapseconds.START) & (days < orientation.utc_end())
    return "UTC" if np.all(known) else "UT1"


def refuse_utc(mjd: Any) -> None:
    """Raise MomentError if any of the UTC days (MJD) is before 1972 or not before the end of the IERS table."""
    days = np.asarray(mjd)
    bad = (days < leapseconds.START) | (days >= orientation.utc_end())
    if np.any(bad):
        year, month, day = calendars.calendar_date(np.asarray(days[bad]).flat[0] + 2400001)
        date = f"{calendars.year_text(int(year))}-{month:02d}-{day:02d}"
        raise MomentError(f"UTC at {date}: {utc_span()}; write UT1 or TT")


def ut1_to_tt(jd1: Float | float, jd2: Float | float) -> Float | float:
    """Return the day part of TT for UT1; ΔT changes by 1e-6 of the time at most, so that three rounds suffice."""
    tt2 = jd2
    for _ in range(4):
        tt2 = jd2 + deltat.of_tt(jd1, tt2) / leapseconds.DAY
    return tt2

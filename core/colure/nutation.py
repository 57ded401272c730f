"""Nutation in longitude and obliquity: IAU 2000A as adjusted to IAU 2006, exact for few moments, tabled for many."""

from functools import lru_cache

import erfa
import numpy as np

from colure import nutationtable
from colure.arrays import Float
from colure.errors import FrameError, SpanError
from colure.precession import Instant, julian_years, tt_parts

SERIES = ("iau2000a", "iau1980")
SPAN = (-8000.0, 12000.0)
"""Julian years. The series was fitted to a century; its arguments are extrapolated beyond, a degree at 5,000 years."""
FEW = 2
"""Up to this many moments the series itself is as quick as the table."""


def series_of(model: str) -> str:
    """Return the nutation series that belongs to a precession model."""
    return "iau1980" if model == "iau1976" else "iau2000a"


def nutation(at: Instant, series: str = "iau2000a") -> tuple[Float, Float]:
    """Return Δψ and Δε (*shape), rad, of date.

    More than FEW moments are interpolated from a table where it reaches (1550 to 2650), to 0.005 mas; the others
    come from ERFA's `nut06a`. Raises SpanError outside SPAN.
    """
    if series not in SERIES:
        raise FrameError(f"nutation series '{series}': expected {' or '.join(SERIES)}")
    jd1, jd2 = tt_parts(at)
    if series == "iau2000a" and isinstance(jd1, float) and isinstance(jd2, float):
        return _scalar(jd1, jd2)
    years = julian_years(at)
    if not (np.all(years >= SPAN[0]) and np.all(years <= SPAN[1])):
        raise _outside()
    if series == "iau1980":
        return _pair(erfa.nut80(jd1, jd2))
    if years.size <= FEW:
        return _pair(erfa.nut06a(jd1, jd2))
    return nutationtable.interpolate(jd1, jd2)


@lru_cache(maxsize=64)
def _scalar(jd1: float, jd2: float) -> tuple[Float, Float]:
    # One moment asks for its nutation several times: for its equator, its sidereal time, its obliquity.
    if not SPAN[0] <= float(julian_years((jd1, jd2))) <= SPAN[1]:
        raise _outside()
    return _pair(erfa.nut06a(jd1, jd2))


def _outside() -> SpanError:
    return SpanError(f"nutation: a year is outside the span of the series, {SPAN[0]:g} to {SPAN[1]:g}")


def _pair(values: tuple[Float, Float]) -> tuple[Float, Float]:
    return np.asarray(values[0]), np.asarray(values[1])


def matrix(mean_obliquity: Float, dpsi: Float, deps: Float) -> Float:
    """Return the matrix (*shape, 3, 3) from the mean to the true equator and equinox of date."""
    return np.asarray(erfa.numat(mean_obliquity, dpsi, deps))

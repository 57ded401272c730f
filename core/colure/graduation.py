"""Choose the steps of a graduation for a scale, and write its figures: from 30° on the whole sky down to 1″ in a field.

Every angle of a graduation is a whole number of arcseconds, so that ticks are counted in whole numbers and two figures
never differ by rounding.
"""

from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure.arrays import ARCSEC

TURN = 1296000
"""Arcseconds in a circle."""

# Smallest tick, middle tick, tick with a figure, in arcseconds; each divides the next, and the figures divide a circle.
_LADDER = (
    (1, 5, 10),
    (5, 10, 30),
    (10, 30, 60),
    (30, 60, 300),
    (60, 300, 600),
    (300, 600, 1800),
    (600, 1800, 3600),
    (1800, 3600, 7200),
    (3600, 18000, 36000),
    (18000, 36000, 108000),
    (36000, 108000, 108000),
    (108000, 108000, 324000),
)


class Steps(NamedTuple):
    """Steps in arcseconds of the smallest tick, the middle tick and the tick with a figure."""

    minor: int
    middle: int
    major: int


def steps(px_per_rad: float, closest_tick: float = 4.0, closest_figure: float = 46.0) -> Steps:
    """Return the finest graduation whose ticks and figures are at least so many pixels apart."""
    for minor, middle, major in _LADDER:
        apart = px_per_rad * ARCSEC
        if minor * apart >= closest_tick and major * apart >= closest_figure:
            return Steps(minor, middle, major)
    return Steps(*_LADDER[-1])


def grid_step(px_per_rad: float, closest: float = 110.0) -> int:
    """Return the spacing of grid lines in arcseconds: the smallest round one at least `closest` pixels wide."""
    round_ones = (1, 5, 10, 30, 60, 300, 600, 1800, 3600, 7200, 18000, 36000, 54000, 108000)
    return next((step for step in round_ones if step * ARCSEC * px_per_rad >= closest), round_ones[-1])


@lru_cache(maxsize=8192)
def figure(arcsec: int, signed: bool = False) -> str:
    """Return an angle in whole arcseconds as figures: `70°`, `63° 10′`, `−0° 05′ 10″`.

    Unsigned angles are longitudes, brought into 0…360°; signed ones are latitudes, with `+` or a true minus.
    """
    value = arcsec if signed else arcsec % TURN
    sign = ("\N{MINUS SIGN}" if value < 0 else "+" if value > 0 else "") if signed else ""
    degrees, rest = divmod(abs(value), 3600)
    minutes, seconds = divmod(rest, 60)
    if seconds:
        return f"{sign}{degrees}° {minutes:02d}′ {seconds:02d}″"
    return f"{sign}{degrees}° {minutes:02d}′" if minutes else f"{sign}{degrees}°"


def multiples(step: int, first: float, last: float) -> NDArray[np.int64]:
    """Return the multiples of `step` (arcsec) from `first` to `last`, angles in radians."""
    return np.arange(int(np.ceil(first / ARCSEC / step - 1e-9)), int(np.floor(last / ARCSEC / step + 1e-9)) + 1) * step


def visible_longitudes(lon: float, lat: float, radius: float, at_lat: float) -> tuple[float, float]:
    """Return the span of longitude, in radians, that a cone can show of the small circle at latitude `at_lat`.

    The cone is about (lon, lat) with `radius`. Answers (first, last) with last − first ≤ 2π; equal when it shows
    nothing.
    """
    if radius >= np.pi / 2 or abs(lat) + radius >= np.pi / 2 or abs(at_lat) > 1.57:
        touches = abs(lat - at_lat) <= radius + 1e-12
        return (lon - np.pi, lon + np.pi) if touches or radius >= np.pi / 2 else (lon, lon)
    cosine = (np.cos(radius) - np.sin(lat) * np.sin(at_lat)) / (np.cos(lat) * np.cos(at_lat))
    if cosine >= 1.0:
        return lon, lon
    half = float(np.arccos(max(cosine, -1.0)))
    return lon - half, lon + half

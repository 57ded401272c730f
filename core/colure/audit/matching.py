"""Match many positions to the catalogue at once: nearest star within a radius, by zones of declination."""

from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure.arrays import MAS, TWO_PI, Bool, Float, Int, spherical
from colure.starfiles import COARSE_MOTION, SLOW, TURN
from colure.stars import EPOCH, catalogue


@dataclass(frozen=True, slots=True)
class Sorted:
    """One tier in its order on disk: sort keys (zone and right ascension), angles as stored, first row number."""

    keys: Int
    ra: Float
    dec: Float
    rows: NDArray[Any]
    first: int
    zones: int


@dataclass(frozen=True, slots=True)
class Matches:
    """Nearest stars: `rows` (n,) catalogue row numbers, −1 where none is near, and their distances (n,), rad."""

    rows: Int
    distance: Float

    @property
    def found(self) -> Bool:
        """Which positions have a star."""
        return self.rows >= 0


@cache
def _tier(number: int) -> Sorted:
    tier = catalogue().tiers[number]
    zones = tier.starts.shape[0]
    dec = tier.rows["dec"].astype(np.float64) * TURN
    turns = tier.rows["ra"].astype(np.int64)
    # The zone of a row is where it lies on disk: rounding at a zone's edge cannot part the two.
    zone = np.repeat(np.arange(zones, dtype=np.int64), np.diff(np.append(tier.starts[:, 0], len(turns))))
    return Sorted((zone << 32) + turns, np.asarray(turns * TURN, dtype=np.float64), dec, tier.rows, tier.first, zones)


def nearest(vectors: Float, radius: float, vmag: float = 30.0, *, year: float = EPOCH) -> Matches:
    """Return the nearest star of each direction (n, 3), ICRS, at a Julian year.

    `radius` in radians, below a degree or so; stars with V < `vmag` only. Stars that move by more than 0.5″ a year are
    met at the catalogue's epoch only.
    """
    stars = catalogue()
    lon, lat = spherical(vectors)
    rows = np.full(len(lon), -1, dtype=np.int64)
    best = np.full(len(lon), np.inf)
    for number, tier in enumerate(stars.tiers):
        if vmag > tier.brightest:
            _search(_tier(number), lon, lat, radius, vmag * 1000.0, rows, best, year - EPOCH)
    return Matches(rows, np.where(rows >= 0, np.sqrt(best), np.inf))


def _search(
    tier: Sorted, lon: Float, lat: Float, radius: float, limit: float, rows: Int, best: Float, years: float
) -> None:
    """Improve `rows` and `best` (squared distances) with the stars of one tier."""
    query, low, high = _windows(tier, lon, lat, radius + SLOW * abs(years))
    begin = np.searchsorted(tier.keys, low, side="left")
    count = np.searchsorted(tier.keys, high, side="right") - begin
    some = count > 0
    query, begin, count = query[some], begin[some], count[some]
    if not len(query):
        return
    which = np.repeat(query, count)
    star = np.arange(len(which)) - np.repeat(np.cumsum(count) - count, count) + np.repeat(begin, count)
    ra, dec = tier.ra[star], tier.dec[star]
    if years:
        data = tier.rows[star]
        unit = np.where(data["flags"] & COARSE_MOTION, MAS, 0.1 * MAS) * years
        ra, dec = ra + data["pmra"] * unit / np.cos(dec), dec + data["pmdec"] * unit
    d_lat = dec - lat[which]
    d_lon = (ra - lon[which] + np.pi) % TWO_PI - np.pi
    # The haversine in squared chords: exact near the poles, too.
    square = 4.0 * (np.sin(d_lat / 2.0) ** 2 + np.cos(lat[which]) * np.cos(dec) * np.sin(d_lon / 2.0) ** 2)
    good = square <= min(radius, np.pi) ** 2
    if limit < 29000.0:
        good &= tier.rows["v"][star] < limit
    which, star, square = which[good], star[good], square[good]
    order = np.lexsort((square, which))
    which, star, square = which[order], star[order], square[order]
    first = np.ones(len(which), dtype=np.bool_)
    first[1:] = which[1:] != which[:-1]
    which, star, square = which[first], star[first], square[first]
    better = square < best[which]
    rows[which[better]] = star[better] + tier.first
    best[which[better]] = square[better]


def _windows(tier: Sorted, lon: Float, lat: Float, radius: float) -> tuple[Int, Int, Int]:
    """Return the stretches of sort keys to be read: query number, lowest and highest key of each."""
    height = np.pi / tier.zones
    reach = np.minimum(np.abs(lat) + radius, np.pi / 2)
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = np.sin(radius) / np.cos(lat)
        half = np.where(reach >= np.pi / 2 - 1e-9, np.pi, np.arcsin(np.minimum(ratio, 1.0)))
    every = np.arange(len(lon))
    parts: list[tuple[Int, Int]] = []
    for edge in (-radius, radius):
        zone = np.clip(np.floor((lat + edge + np.pi / 2) / height), 0, tier.zones - 1).astype(np.int64)
        use = every if edge < 0 else every[zone != parts[0][1]]
        parts.append((use, zone[use]))
    query = np.concatenate([part[0] for part in parts])
    zone = np.concatenate([part[1] for part in parts])
    a = (lon[query] - half[query]) / TURN
    b = (lon[query] + half[query]) / TURN
    turn = 2.0**32
    whole = half[query] >= np.pi - 1e-9
    a, b = np.where(whole, 0.0, a), np.where(whole, turn - 1.0, b)
    base = zone << 32
    low, high = np.clip(a, 0.0, turn - 1.0).astype(np.int64), np.clip(b, 0.0, turn - 1.0).astype(np.int64)
    left, right = a < 0.0, b >= turn
    return (
        np.concatenate([query, query[left], query[right]]),
        np.concatenate([base + low, base[left] + (a[left] + turn).astype(np.int64), base[right]]),
        np.concatenate([base + high, base[left] + (1 << 32) - 1, base[right] + (b[right] - turn).astype(np.int64)]),
    )

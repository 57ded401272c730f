"""The catalogue's stars near many positions at once, by declination zones that are sorted by right ascension."""

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from colure.arrays import TWO_PI, Float, Int, spherical
from colure.starfiles import EPOCH, SLOW, TURN
from colure.stars import Catalogue, catalogue

ZONES = 1800
"""Zones of declination over the sky: 0.1° each."""
_HEIGHT = np.pi / ZONES
MOST_PAIRS = 20_000_000
"""Pairs of a position and a star that are looked at in one call."""


class Index:
    """Stars sorted by zone and right ascension: `keys` (n,) ascending, `ids` (n,) their rows in the catalogue."""

    def __init__(self, ids: Int, ra: Float, dec: Float) -> None:
        keys = _zone(dec) * 8.0 + ra
        order = np.argsort(keys)
        self.keys = keys[order]
        self.ids = ids[order]

    def pairs(self, lon: Float, lat: Float, radius: float) -> tuple[Int, Int]:
        """Return which positions (P,) and which stars' rows (P,) lie in the same boxes of half-size `radius` (rad).

        Every star within the radius of a position (N,) is there, and some that are not. ValueError when the boxes hold
        more than MOST_PAIRS.
        """
        low, high = _zone(lat - radius), _zone(lat + radius)
        edge = np.minimum(np.abs(lat) + radius, np.pi / 2)
        # Half-width in right ascension of a small circle; whole zones about the poles.
        reach = np.where(edge >= np.pi / 2 - 1e-9, np.pi, 0.0)
        open_ = reach == 0.0
        ratio = np.sin(radius) / np.maximum(np.cos(lat[open_]), 1e-12)
        reach[open_] = np.arcsin(np.minimum(ratio, 1.0)) + 1e-12
        found: list[tuple[Int, Int]] = []
        count = 0
        for step in range(int((high - low).max(initial=0.0)) + 1):
            zone = low + step
            mine = np.flatnonzero(zone <= high)
            a, b = lon[mine] - reach[mine], lon[mine] + reach[mine]
            whole = b - a >= TWO_PI
            a, b = np.where(whole, 0.0, a), np.where(whole, 7.0, b)
            for shift in (0.0, TWO_PI, -TWO_PI):
                # Boxes that reach over the first point of right ascension go on at its other end.
                use = (a + shift < TWO_PI) & (b + shift >= 0.0) & (~whole | (shift == 0.0))
                at = mine[use]
                base = zone[at] * 8.0
                first = np.searchsorted(self.keys, base + np.maximum(a[use] + shift, 0.0))
                last = np.searchsorted(self.keys, base + np.minimum(b[use] + shift, 7.0), side="right")
                length = last - first
                count += int(length.sum())
                if count > MOST_PAIRS:
                    raise ValueError("too many stars near the positions")
                some = length > 0
                found.append(_expanded(at[some], first[some], length[some]))
        if not found:
            return np.empty(0, np.int64), np.empty(0, np.int64)
        return np.concatenate([p for p, _ in found]), self.ids[np.concatenate([s for _, s in found])]


def _zone(dec: Float) -> Float:
    return np.clip(np.floor((dec + np.pi / 2) / _HEIGHT), 0.0, ZONES - 1.0)


def _expanded(at: Int, first: Int, length: Int) -> tuple[Int, Int]:
    """Return each position as often as its range is long, and the places of the range."""
    owner = np.repeat(at, length)
    begin = np.repeat(first - (np.cumsum(length) - length), length)
    return owner, begin + np.arange(len(owner))


@lru_cache(maxsize=3)
def _whole(limit: float, source: Catalogue) -> Index:
    """Return the index of all stars brighter than a limit, at the catalogue's epoch."""
    ids, ra, dec = [], [], []
    for tier in source.tiers:
        if limit <= tier.brightest:
            continue
        mine = np.flatnonzero(tier.rows["v"] < limit * 1000.0)
        ids.append(mine + tier.first)
        ra.append(tier.rows["ra"][mine] * TURN)
        dec.append(tier.rows["dec"][mine] * TURN)
    return Index(np.concatenate(ids), np.concatenate(ra), np.concatenate(dec))


def nearest(
    vectors: Float, radius: float, year: float, limit: float = 99.0, source: Catalogue | None = None
) -> tuple[Int, Float, Float]:
    """Return for positions (N, 3), ICRS, the nearest star within `radius` (rad) at a Julian year.

    Rows of the catalogue (N,), −1 where there is none; the star's direction (N, 3) at that year, NaN where none; and
    the separation (N,) in radians, infinite where none. ValueError when the sky is too crowded for the radius.
    """
    source = source or catalogue()
    lon, lat = spherical(vectors)
    margin = SLOW * abs(year - EPOCH)
    who, star = _whole(limit, source).pairs(lon, lat, radius + margin)
    fast = source.rows(np.asarray(source.fast, dtype=np.int64))
    fast = fast.take(fast.vmag < limit)
    if len(fast):
        moved_lon, moved_lat = spherical(fast.directions(year))
        more_who, more_star = Index(fast.ids, moved_lon, moved_lat).pairs(lon, lat, radius)
        who, star = np.concatenate([who, more_who]), np.concatenate([star, more_star])
    rows = np.full(len(vectors), -1, dtype=np.int64)
    place = np.full((len(vectors), 3), np.nan)
    apart = np.full(len(vectors), np.inf)
    if not len(who):
        return rows, place, apart
    unique, back = np.unique(star, return_inverse=True)
    at = source.rows(unique).directions(year)
    chord = _chords(vectors, who, at, back)
    near = np.flatnonzero(chord <= (2.0 * np.sin(radius / 2.0)) ** 2)
    # Sorted by distance, the first of each position is the nearest; written backwards, the nearest stays.
    order = near[np.argsort(-chord[near], kind="stable")]
    rows[who[order]] = star[order]
    place[who[order]] = at[back[order]]
    apart[who[order]] = 2.0 * np.arcsin(np.minimum(np.sqrt(chord[order]) / 2.0, 1.0))
    return rows, place, apart


def _chords(vectors: Float, who: Int, at: Float, back: NDArray[np.intp]) -> Float:
    """Return the squared chords (P,) between positions and stars."""
    total = np.zeros(len(who))
    for axis in range(3):
        step = vectors[who, axis] - at[back, axis]
        total += step * step
    return total

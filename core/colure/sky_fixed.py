"""What does not move among the stars: constellations, Milky Way, deep sky, points and crossings of an ecliptic."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache, lru_cache

import numpy as np
from numpy.typing import NDArray

from colure import belt, constellations, deepsky, frames, milkyway
from colure.arrays import ARCSEC, DEG, Float
from colure.errors import SpanError
from colure.moment import Moment
from colure.reduction import Observer, apply_context, star_context
from colure.sky_layers import frame_named, widths_em
from colure.stars import EPOCH_JD

EDGE_STEPS = ((20.0, 1.0), (4.0, 0.25), (0.0, 0.05))
"""Spacing of the points of constellation edges (degrees) from each width on."""


@dataclass(frozen=True, slots=True, eq=False)
class LinesSky:
    """Polylines on ICRS axes: columns (3, N) float32 and starts."""

    columns: NDArray[np.float32]
    starts: NDArray[np.int32]


def edge_step(width_deg: float) -> float:
    """Return the spacing in degrees of the points of constellation edges at a width."""
    return next(step for width, step in EDGE_STEPS if width_deg >= width)


@lru_cache(maxsize=4)
def _edges(step_deg: float) -> LinesSky:
    found = constellations.edges(step_deg)
    return LinesSky(np.ascontiguousarray(found.points.T.astype(np.float32)), found.starts)


def moved(place: str) -> bool:
    """Return whether a place turns catalogue directions, so that lines drawn among the stars go with them."""
    return place in ("apparent", "observed")


def edges(step_deg: float, moment: Moment, observer: Observer, place: str) -> LinesSky:
    """Return the edges of the constellations at a place: a star stays on its side of them."""
    found = _edges(step_deg)
    if not moved(place):
        return found
    try:
        context = star_context(moment, observer=observer, place=place, epoch_jd=EPOCH_JD)
    except SpanError:
        return found
    return LinesSky(np.ascontiguousarray(apply_context(context, found.columns.T, None, None).T), found.starts)


@dataclass(frozen=True, slots=True, eq=False)
class NamesSky:
    """Texts at directions: columns (3, N), one text each, a rank (smaller first), and the texts' widths in em."""

    columns: Float
    texts: tuple[str, ...]
    rank: Float
    width_em: NDArray[np.float32]


@cache
def constellation_names() -> NamesSky:
    """Return the names of the constellations where they fit best, the roomiest first."""
    found = constellations.anchors()
    names = {entry.code: entry.name for entry in constellations.constellations()}
    order = np.argsort(-found.radius)
    texts = tuple(names[str(code)] for code in found.codes[order])
    return NamesSky(
        np.ascontiguousarray(found.points[order].T),
        texts,
        -found.radius[order],
        widths_em(texts, "label.constellation", italic=True),
    )


@dataclass(frozen=True, slots=True, eq=False)
class Outline:
    """One level of the Milky Way: rings, columns (3, N) with starts, and a direction (3,) that lies in none."""

    level: int
    columns: NDArray[np.float32]
    starts: NDArray[np.int32]
    outside: Float


@cache
def milky_way() -> tuple[Outline, ...]:
    """Return the levels of the Milky Way, the faintest and widest first."""
    return tuple(
        Outline(o.level, np.ascontiguousarray(o.points.T.astype(np.float32)), o.starts, o.outside)
        for o in milkyway.outlines()
    )


SYMBOLS = ("galaxy", "open_cluster", "globular", "nebula", "planetary", "dark")
_SYMBOL_OF = {
    "OCl": 1, "GCl": 2, "*Ass": 1, "Cl+N": 1, "Neb": 3, "HII": 3, "EmN": 3, "RfN": 3, "DrkN": 5, "PN": 4, "SNR": 3,
    "Nova": 4, "*": 1, "**": 1,
}  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class DeepSky:
    """Deep-sky objects, the brightest first.

    `ids` (N,) rows of the list, `columns` (3, N) and `axis` (3, N): the direction and the unit tangent along the major
    axis, ICRS; `half` (N, 2) half-axes in radians (0 where unknown), `symbol` (N,) places in SYMBOLS, `messier` (N,).
    """

    ids: NDArray[np.int64]
    columns: Float
    axis: Float
    half: Float
    symbol: NDArray[np.uint8]
    magnitude: NDArray[np.float32]
    messier: NDArray[np.int64]


@cache
def deep_sky() -> DeepSky:
    """Return the deep-sky objects that a chart may show, at their catalogue positions."""
    found = deepsky.catalogue()
    v = found.vectors
    pa = np.nan_to_num(found.position_angle, nan=0.0)
    flat = np.maximum(np.hypot(v[:, 0], v[:, 1]), 1e-12)
    east = np.stack([-v[:, 1] / flat, v[:, 0] / flat, np.zeros(len(v))])
    north = np.cross(v, east.T).T
    kinds = np.array([_SYMBOL_OF.get(code, 0) for code, _ in deepsky.TYPES], np.uint8)
    return DeepSky(
        ids=np.asarray(found.ids, np.int64),
        columns=np.ascontiguousarray(v.T),
        axis=north * np.cos(pa) + east * np.sin(pa),
        half=np.nan_to_num(found.size_arcmin, nan=0.0) * (0.5 * 60.0 * ARCSEC),
        symbol=kinds[found.kind],
        magnitude=np.nan_to_num(np.asarray(found.magnitude, np.float32), nan=99.0),
        messier=found.data["messier"].astype(np.int64),
    )


def points(ecliptic: str, axes_of: Callable[[str], Float | None]) -> NamesSky:
    """Return the equinoxes, solstices and poles of an ecliptic on the mean equator of date.

    `axes_of` gives the matrix (3, 3) from a frame, as the chart draws it, to ICRS axes.
    """
    plane = frame_named(ecliptic)
    onto = ecliptic if plane.is_rotation and plane.plane == "ecliptic" else "ecliptic/mean/date"
    plane_axes, equator = axes_of(onto), axes_of("equator/mean/date")
    assert plane_axes is not None  # both are rotations
    assert equator is not None
    marks = belt.cardinal_points(plane_axes.T, equator.T)
    rank = np.arange(len(marks.labels), dtype=np.float64)
    return NamesSky(np.ascontiguousarray(marks.points.T), marks.labels, rank, widths_em(marks.labels, "label.point"))


@lru_cache(maxsize=8)
def crossings(ecliptic: str, tenths_of_year: int) -> NamesSky:
    """Return where an ecliptic enters constellations, each with its abbreviation and longitude, at a tenth of a year.

    The ecliptic of date moves by 5″ of longitude in that time, which the figures do not show.
    """
    plane = frame_named(ecliptic)
    moment = Moment.from_julian_year(tenths_of_year / 10.0)
    found = belt.crossings(frames.rotation(plane, moment).matrix)
    rows = zip(found.entered.tolist(), (found.longitude / DEG).tolist(), strict=True)
    texts = tuple(f"{code} {lon:.1f}°" for code, lon in rows)
    rank = np.arange(len(texts), dtype=np.float64)
    return NamesSky(np.ascontiguousarray(found.points.T), texts, rank, widths_em(texts, "label.belt"))

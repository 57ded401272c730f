"""What each layer of the sky is made of: plain functions of moment, place and observer to directions on ICRS axes."""

from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from colure import appearance, names, phases
from colure.arrays import ARCSEC, DEG, TWO_PI, Float, unit
from colure.ephemeris import KM_PER_AU
from colure.errors import SpanError
from colure.fontmetrics import face_of, width_em
from colure.frames import Frame
from colure.moment import Moment
from colure.reduction import Observer, ObserverState, apply_context, context_of, reduce_bodies, star_context
from colure.session import View
from colure.stars import EPOCH_JD, Rows, catalogue

ALL_SKY_WIDTH = 60.0
"""From this width (degrees) on, the stars of the whole sky are kept ready; below it those of a cone."""

FINE_WIDTH = 12.0
"""Below this width directions are float64, with parallaxes: a float32 direction is good to 0.01″ only."""

FAINTEST = 13.0

_TINT_LIMITS = np.array([-0.12, 0.12, 0.42, 0.80, 1.10, 1.45], np.float32)
"""B−V between the seven tint classes, roughly between the spectral types O-B, A, F, G, K, K-M, M."""


def widths_em(texts: tuple[str, ...], role: str, *, italic: bool = False) -> NDArray[np.float32]:
    """Return the advance widths (N,) of texts in em, set as a role is."""
    face = face_of(role, italic=italic)
    return np.array([width_em(text, face) for text in texts], np.float32)


@lru_cache(maxsize=512)
def frame_named(name: str) -> Frame:
    """Return the frame of a canonical name, parsed once."""
    return Frame.parse(name)


# Stars


@dataclass(frozen=True, slots=True, eq=False)
class StarRows:
    """The stars that may be drawn, faintest first.

    `ids` (N,) rows of the catalogue, `vmag` (N,) descending, `tint` (N,) classes of B−V, `state` (6, N) positions and
    velocities at the catalogue's epoch, `parallax` (N,) rad or None where it would not show.
    """

    rows: Rows
    ids: NDArray[np.int64]
    vmag: NDArray[np.float32]
    tint: NDArray[np.uint8]
    state: NDArray[np.floating]
    parallax: Float | None

    def first_brighter(self, limit: float) -> int:
        """Return the place of the first star of the list that is not fainter than a limit."""
        return len(self.vmag) - int(np.searchsorted(self.vmag[::-1], np.float32(limit), side="right"))


@dataclass(frozen=True, slots=True, eq=False)
class StarsSky:
    """Directions (3, N) of the stars of `base` on ICRS axes, in its precision."""

    base: StarRows
    directions: NDArray[np.floating]
    note: str = ""


Cell = tuple[float, float, float] | None
"""Centre (rad) and radius (rad) of the cone of stars that is kept ready; None for the whole sky."""


def auto_limit(width_deg: float) -> float:
    """Return the magnitude limit that follows a width: about as many stars on the page at every width.

    Star counts grow by 10^0.45 a magnitude and the area by the square of the width; 7.2 at 110° is the design's chart.
    """
    return round(float(np.clip(7.2 - 2.0 / 0.45 * np.log10(width_deg / 110.0), 5.6, 12.5)), 1)


def limit_of(view: View) -> float:
    """Return the magnitude limit of a view: its own, or the one that follows its width."""
    return auto_limit(view.width_deg) if view.limit_mag is None else view.limit_mag


def star_cell(view: View, centre: Float) -> tuple[float, Cell]:
    """Return the magnitude down to which stars are kept ready, and the cone that they are taken from.

    Both go in steps, so that small changes of the view change neither: half a magnitude, √2 in radius, and half a
    radius in position.
    """
    limit = min(float(np.ceil(limit_of(view) * 2.0 - 1e-6) / 2.0), FAINTEST)
    if view.limit_mag is not None:
        limit = view.limit_mag
    if view.width_deg >= ALL_SKY_WIDTH:
        return limit, None
    # The corners of a page as high as 1.6 times its width are 0.95 of a width from its centre.
    reach = 0.95 * view.width_deg * DEG
    radius = float(2.0 ** (np.ceil(np.log2(reach) * 2.0) / 2.0))
    lat_step = 0.5 * radius
    lat = float(np.round(np.arctan2(centre[2], np.hypot(centre[0], centre[1])) / lat_step) * lat_step)
    lat = min(max(lat, -np.pi / 2), np.pi / 2)
    columns = max(int(TWO_PI * np.cos(lat) / lat_step), 1)
    lon = float(np.round(np.arctan2(centre[1], centre[0]) / TWO_PI * columns) * TWO_PI / columns)
    # Half a step in both directions is 0.36 radius away at worst.
    return limit, (lon, lat, min(radius * 1.4, np.pi))


def star_rows(limit: float, cell: Cell) -> StarRows:
    """Return the stars brighter than a limit, of the whole sky or of a cone, sorted faintest first."""
    found = catalogue().brighter(limit) if cell is None else catalogue().cone(*cell, vmag=limit)
    order = np.argsort(-found.vmag, kind="stable")
    rows = found.take(order)
    fine = cell is not None and cell[2] <= 1.4 * 1.42 * 0.95 * FINE_WIDTH * DEG
    dtype = np.float64 if fine else np.float32
    bv = np.nan_to_num(rows.bv, nan=0.6)
    return StarRows(
        rows=rows,
        ids=rows.ids,
        vmag=np.ascontiguousarray(rows.vmag),
        tint=np.searchsorted(_TINT_LIMITS, bv).astype(np.uint8),
        state=np.ascontiguousarray(rows.state(dtype)),
        parallax=rows.parallax_mas * (1e-3 * ARCSEC) if fine else None,
    )


def stars(
    base: StarRows, moment: Moment, observer: Observer, place: str, known: ObserverState | None = None
) -> StarsSky:
    """Return the directions of stars at a moment and place; `known` is the observer's state, if it has been found."""
    state = base.state
    try:
        context = (
            star_context(moment, observer=observer, place=place, epoch_jd=EPOCH_JD)
            if known is None
            else context_of(known, moment, observer, place, EPOCH_JD)
        )
    except SpanError as fault:
        years = (float(moment.jd_tt) - EPOCH_JD) / 365.25
        moved = state[:3] + state[3:] * state.dtype.type(years)
        moved /= np.sqrt((moved * moved).sum(axis=0))
        return StarsSky(base, moved, f"stars without the Earth's motion: {fault}")
    directions = apply_context(context, state[:3].T, state[3:].T, base.parallax)
    return StarsSky(base, np.ascontiguousarray(directions.T))


@dataclass(frozen=True, slots=True, eq=False)
class StarNames:
    """Names of stars, the brightest first: rows of the catalogue, places in StarRows, magnitudes and texts."""

    ids: NDArray[np.int64]
    at: NDArray[np.intp]
    vmag: NDArray[np.float32]
    texts: tuple[str, ...]
    width_em: NDArray[np.float32]


def names_wanted(width_deg: float) -> tuple[names.Kind, ...]:
    """Return the kinds of star names that a width has room for."""
    if width_deg >= 50.0:
        return ("proper",)
    return ("proper", "bayer") if width_deg >= 15.0 else ("proper", "bayer", "flamsteed")


def star_names(base: StarRows, kinds: tuple[names.Kind, ...]) -> StarNames:
    """Return the names of those stars that have one, each star by the first kind that it has."""
    order = np.argsort(base.ids)
    listed = base.ids[order]
    found: dict[int, str] = {}
    for kind in kinds:
        rows, texts = names.labels(kind)
        for row, text in zip(rows.tolist(), texts, strict=True):
            found.setdefault(row, text)
    ids = np.array(list(found), np.int64)
    if not len(listed) or not len(ids):
        none = np.empty(0, np.float32)
        return StarNames(np.empty(0, np.int64), np.empty(0, np.intp), none, (), none)
    place = np.minimum(np.searchsorted(listed, ids), len(listed) - 1)
    mine = np.flatnonzero(listed[place] == ids)
    at = order[place[mine]]
    # Rows are faintest first, so the largest place is the brightest.
    bright = np.argsort(-at)
    every = list(found.values())
    texts_of = tuple(every[i] for i in mine[bright].tolist())
    return StarNames(ids[mine[bright]], at[bright], base.vmag[at[bright]], texts_of, widths_em(texts_of, "label.star"))


# Bodies


@lru_cache(maxsize=16)
def _radii_au(names: tuple[str, ...]) -> Float:
    return np.array([appearance.RADIUS_KM.get(name, 0.0) for name in names]) / KM_PER_AU


@dataclass(frozen=True, eq=False)
class BodiesSky:
    """Sun, Moon and planets as the observer sees them.

    `vectors` (B, 3) on ICRS axes, `distance_au` (B,) when the light left, `sight_au` and `from_sun_au` (B, 3) the body
    from the observer and from the Sun then, `state` the observer's own. What follows is worked out when asked for.
    """

    names: tuple[str, ...]
    jd_tdb: float
    vectors: Float
    distance_au: Float
    sight_au: Float
    from_sun_au: Float
    state: ObserverState | None = None
    note: str = ""

    def vector(self, name: str) -> Float | None:
        """Return a body's direction (3,), or None."""
        return self.vectors[self.names.index(name)] if name in self.names else None

    @cached_property
    def radius(self) -> Float:
        """Angular radius (B,) in radians, 0 for a point that is no body."""
        return np.asarray(np.arcsin(np.minimum(_radii_au(self.names) / self.distance_au, 1.0)))

    @cached_property
    def lit(self) -> Float:
        """Illuminated fraction (B,) of the disc; 1 for the Sun."""
        lit = np.clip(phases.illuminated(phases.phase_angle(self.from_sun_au, self.sight_au)), 0.0, 1.0)
        if "sun" in self.names:
            lit[self.names.index("sun")] = 1.0
        return np.asarray(lit)

    @cached_property
    def towards_sun(self) -> Float:
        """Unit tangents (B, 3) from each body towards the Sun."""
        sun = self.vector("sun")
        away = self.sight_au - self.from_sun_au
        aim = unit(away) if sun is None else np.broadcast_to(sun, self.vectors.shape)
        tangent = aim - (aim * self.vectors).sum(axis=1)[:, None] * self.vectors
        length = np.sqrt((tangent * tangent).sum(axis=1))[:, None]
        return np.asarray(tangent / np.where(length > 1e-12, length, 1.0))

    @cached_property
    def magnitude(self) -> Float:
        """Apparent V magnitude (B,), NaN where no formula reaches."""
        rows = zip(self.names, self.from_sun_au, self.sight_au, strict=True)
        jd = np.asarray(self.jd_tdb)
        return np.array([float(appearance.magnitude(name, r, d, jd)) for name, r, d in rows])


def bodies(names: tuple[str, ...], moment: Moment, observer: Observer, place: str) -> BodiesSky:
    """Return the directions of bodies at a moment and place; none, and a note, outside the ephemeris."""
    jd = float(moment.tdb[0]) + float(moment.tdb[1])
    try:
        seen = reduce_bodies(names, moment, observer=observer, place=place)
    except SpanError as fault:
        none = np.empty((0, 3))
        return BodiesSky((), jd, none, np.empty(0), none, none, note=f"no bodies: {fault}")
    state = seen.observer
    # As in the reduction: from the observer to where the body was when its light left.
    sight = seen.heliocentric + (state.sun_pos - state.pos) - (seen.light_time_s / 86400.0)[:, None] * state.sun_vel
    return BodiesSky(names, jd, seen.vectors, seen.distance_au, sight, seen.heliocentric, state)

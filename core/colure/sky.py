"""The sky of a session: directions on ICRS axes at one place, in layers that are computed only when their key changes.

A layer is a pure function of a frozen key declared beside it: the part of the session that it reads. `compute` takes
the sky before and hands on every layer whose key is the same. Theme, selection and hover are in no key, and the view is
in none but the stars' (which sky cells) and the axes'.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from types import MappingProxyType
from typing import Any

import numpy as np

from colure import frames, sky_fixed, sky_layers
from colure.arrays import DEG, Float, cartesian
from colure.errors import FrameError, SpanError
from colure.frames import Frame
from colure.moment import Moment
from colure.reduction import Observer
from colure.session import Session
from colure.sites import Site
from colure.sky_layers import BodiesSky, StarsSky


@dataclass(frozen=True, slots=True, eq=False)
class SkyLayer:
    """One layer's value, and the key that it is a pure function of."""

    name: str
    key: object
    value: Any


@dataclass(frozen=True, slots=True, eq=False)
class Axes:
    """What the view needs of the sky: unit vectors (3,) on ICRS axes.

    `centre` is what the chart is centred on, `pole` what is up, `spare` the zero of longitude of that frame.
    """

    centre: Float
    pole: Float
    spare: Float


@dataclass(frozen=True, slots=True, eq=False)
class Sky:
    """Every layer of the sky of one session. `notes` say what could not be had, and why."""

    session: Session
    observer: Observer
    axes: Axes
    layers: MappingProxyType[str, SkyLayer]
    notes: tuple[str, ...] = ()

    def __getitem__(self, name: str) -> Any:
        """Return a layer's value."""
        return self.layers[name].value

    def key(self, name: str) -> object:
        """Return a layer's key."""
        return self.layers[name].key


@dataclass(frozen=True, slots=True, eq=False)
class FrameAxes:
    """A frame at one moment: `matrix` (3, 3) takes its axes to ICRS; None for FK4, which is no rotation."""

    frame: Frame
    moment: Moment
    site: Site | None
    matrix: Float | None

    @property
    def left_handed(self) -> bool:
        """Whether longitudes run the other way round the pole, as azimuths do."""
        return self.frame.plane == "horizon"

    def columns(self, lon: Float, lat: Float | float) -> Float:
        """Return directions (3, N) on ICRS axes for longitudes and latitudes (N,) in radians."""
        v = cartesian(lon, lat)
        if self.matrix is not None:
            return np.asarray(self.matrix @ v.reshape(-1, 3).T)
        return np.asarray(frames.to_icrs(v.reshape(-1, 3), self.frame, self.moment, self.site).T)

    def direction(self, lon: float, lat: float) -> Float:
        """Return the direction (3,) on ICRS axes of one longitude and latitude in radians."""
        if self.matrix is None:
            return self.columns(np.array([lon]), np.array([lat]))[:, 0]
        level = math.cos(lat)
        x, y, z = level * math.cos(lon), level * math.sin(lon), math.sin(lat)
        return np.asarray(x * self.matrix[:, 0] + y * self.matrix[:, 1] + z * self.matrix[:, 2])

    def spherical(self, vectors: Float) -> tuple[Float, Float]:
        """Return longitude (0…2π) and latitude (N,) of directions (N, 3) on ICRS axes."""
        if self.matrix is not None:
            v = vectors @ self.matrix
        else:
            v = frames.from_icrs(vectors, self.frame, self.moment, self.site)
        return np.arctan2(v[:, 1], v[:, 0]) % (2.0 * np.pi), np.arctan2(v[:, 2], np.hypot(v[:, 0], v[:, 1]))


def frame_axes(name: str, moment: Moment, site: Site | None, omitted: tuple[str, ...] = ()) -> FrameAxes:
    """Return the axes of a frame given by its name, reached without the steps that are left out."""
    frame = sky_layers.frame_named(name)
    if not frame.is_rotation:
        return FrameAxes(frame, moment, site, None)
    if omitted:
        from colure.ledger import turns  # a start with every step in place does without the ledger

        return FrameAxes(frame, moment, site, turns.reduced(frame, moment, site, omitted).T)
    if not frame.needs_moment:
        return FrameAxes(frame, moment, site, _fixed_axes(frame))
    return FrameAxes(frame, moment, site, frames.rotation(frame, moment, site).matrix.T)


@lru_cache(maxsize=64)
def _fixed_axes(frame: Frame) -> Float:
    """Return the matrix (3, 3) from the axes of a frame that no moment changes to ICRS."""
    return frames.rotation(frame).matrix.T


def _frame_key(name: str, session: Session) -> object:
    """Return what a frame's axes depend on: a fixed frame not on the moment, and only the horizon on the site."""
    frame = sky_layers.frame_named(name)
    return (
        name,
        session.moment if frame.needs_moment else None,
        session.site if frame.needs_site else None,
        session.omitted,
    )


def observer_of(session: Session) -> Observer:
    """Return where the session looks from: its site, or the centre of the Earth."""
    left_out = frozenset(session.omitted)
    if session.from_site:
        return Observer("site", session.site, omitted=left_out)
    return Observer("earth", omitted=left_out)


def place_key(session: Session) -> object:
    """Return what every direction depends on: moment, place and observer, and the steps that are left out."""
    return (session.moment, session.place, session.site if session.from_site else None, session.omitted)


def compute(session: Session, previous: Sky | None = None) -> Sky:
    """Return the sky of a session; layers of `previous` whose keys are the same are handed on as they are.

    A model that does not reach the moment leaves its layer empty and a note; an impossible view raises FrameError.
    """
    observer = observer_of(session)
    layers: dict[str, SkyLayer] = {}
    notes: list[str] = []

    def layer(name: str, key: object, make: Callable[[], Any]) -> Any:
        old = previous.layers.get(name) if previous is not None else None
        layers[name] = old if old is not None and old.key == key else SkyLayer(name, key, make())
        return layers[name].value

    # Circles, belt, grid, points and view are often in the same frame.
    known: dict[str, FrameAxes] = {}

    def axes_of(name: str) -> FrameAxes:
        if name not in known:
            known[name] = frame_axes(name, session.moment, session.site, session.omitted)
        return known[name]

    def body_names() -> tuple[str, ...]:
        centre = session.view.centre.body
        # The Sun is always known, for the caution; the centre of the chart must be.
        wanted = (*session.bodies, "sun", *((centre,) if centre else ()))
        seen_from = None if observer.origin == "site" else "earth"
        return tuple(dict.fromkeys(n for n in wanted if n not in (seen_from, "earth")))

    names = body_names()
    bodies: BodiesSky = layer(
        "bodies", (names, place_key(session)), lambda: sky_layers.bodies(names, session.moment, observer, session.place)
    )
    if bodies.note:
        notes.append(bodies.note)
    axes = _axes(session, bodies, axes_of)

    limit, cell = sky_layers.star_cell(session.view, axes.centre)
    base = layer("star rows", (limit, cell), lambda: sky_layers.star_rows(limit, cell))
    if session.layers.stars:
        stars: StarsSky = layer(
            "stars",
            (limit, cell, place_key(session)),
            lambda: sky_layers.stars(base, session.moment, observer, session.place, bodies.state),
        )
        if stars.note:
            notes.append(stars.note)
        kinds = sky_layers.names_wanted(session.view.width_deg)
        if session.layers.star_names:
            layer("star names", (limit, cell, kinds), lambda: sky_layers.star_names(base, kinds))
    if session.layers.milky_way:
        layer("milky way", (), sky_fixed.milky_way)
    if session.layers.deep_sky:
        layer("deep sky", (), sky_fixed.deep_sky)
    step = sky_fixed.edge_step(session.view.width_deg)
    if session.layers.edges:
        at_place = place_key(session) if sky_fixed.moved(session.place) else None
        layer(
            "edges",
            (step, at_place),
            lambda: sky_fixed.edges(step, session.moment, observer, session.place),
        )
    if session.layers.constellation_names:
        layer("constellations", (), sky_fixed.constellation_names)
    if session.layers.grid is not None:
        grid = session.layers.grid
        layer("grid", _frame_key(grid, session), lambda: axes_of(grid))
    if session.belt.visible:
        belt = session.belt
        layer("belt", _frame_key(belt.frame, session), lambda: axes_of(belt.frame))
        if belt.crossings and sky_layers.frame_named(belt.frame).is_rotation:
            follows = sky_layers.frame_named(belt.frame).needs_moment
            tenths = round(float(session.moment.julian_year) * 10.0) if follows else 20000
            layer("crossings", (belt.frame, tenths), lambda: sky_fixed.crossings(belt.frame, tenths))
    shown = tuple(circle for circle in session.circles if circle.visible)
    layer(
        "circles",
        tuple((_frame_key(circle.frame, session), circle) for circle in shown),
        lambda: _circles(shown, axes_of, notes),
    )
    if session.layers.points:
        ecliptic = session.belt.frame
        layer(
            "points",
            (session.moment, ecliptic, session.omitted),
            lambda: sky_fixed.points(ecliptic, lambda name: axes_of(name).matrix),
        )
    if session.overlays:
        from colure.overlays import skylayer  # a start without overlays loads no reader of files

        overlays = layer("overlays", skylayer.key(session), lambda: skylayer.compute(session, observer))
        notes += skylayer.remarks(overlays)
    return Sky(session, observer, axes, MappingProxyType(layers), tuple(notes))


def _circles(
    shown: tuple[Any, ...], axes_of: Callable[[str], FrameAxes], notes: list[str]
) -> tuple[tuple[Any, FrameAxes], ...]:
    """Return the circles that can be drawn with their axes; the others become notes."""
    out = []
    for circle in shown:
        try:
            out.append((circle, axes_of(circle.frame)))
        except (FrameError, SpanError) as fault:
            notes.append(f"circle {circle.frame}: {fault}")
    return tuple(out)


def _axes(session: Session, bodies: BodiesSky, axes_of: Callable[[str], FrameAxes]) -> Axes:
    """Return the centre and the pole of the view on ICRS axes."""
    view = session.view
    centre = view.centre
    if centre.body is not None:
        if centre.body not in bodies.names:
            raise FrameError(
                f"view.centre: body '{centre.body}' has no direction here; {bodies.note or 'choose another'}"
            )
        middle = bodies.vectors[bodies.names.index(centre.body)]
    else:
        middle = axes_of(centre.frame).direction(centre.lon_deg * DEG, centre.lat_deg * DEG)
    up = axes_of("horizon" if view.up == "zenith" else view.up)
    pole = up.direction(0.0, np.pi / 2)
    # Where the centre is the pole itself, its own longitude says which way is up: the limit of approaching along it.
    lon = centre.lon_deg * DEG if centre.body is None and abs(centre.lat_deg) == 90.0 else 0.0
    spare = up.direction(lon, 0.0)
    return Axes(middle, pole, spare)

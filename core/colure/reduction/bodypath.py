"""The path of bodies: from barycentric positions to the place asked for, for many bodies and moments at once."""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from colure.arrays import Float, norm
from colure.ephemeris import Ephemeris, default
from colure.errors import BodyError, FrameError, near_names
from colure.moment import Moment
from colure.reduction.observer import C_AU_DAY, Observer, ObserverState, eye, is_centre, place_observer
from colure.reduction.optics import dot3
from colure.reduction.steps import PLACES, State, Step, check_omitted, path
from colure.reduction.steps import names as names_on_the_way

BLOCK = 1024
"""Moments worked on at a time: with ten bodies every array of the steps then stays in the processor's cache."""

GEOCENTRE = Observer("earth")


class Directions(NamedTuple):
    """Reduced directions of bodies.

    `vectors` (bodies, *shape, 3) are unit vectors on ICRS axes; `distance_au` and `light_time_s` (bodies, *shape) from
    the observer (light time 0 for the geometric place); `heliocentric` (bodies, *shape, 3) the body from the Sun when
    the light left it, au; `observer` the observer's state.
    """

    bodies: tuple[str, ...]
    place: str
    vectors: Float
    distance_au: Float
    light_time_s: Float
    heliocentric: Float
    observer: ObserverState

    @property
    def sight(self) -> Float:
        """Vectors (bodies, *shape, 3), au, from the observer to where each body was when its light left it."""
        state = self.observer
        # The heliocentric vector starts where the Sun was when it lit the body.
        ago = self.light_time_s / 86400.0
        ago = ago + np.where(ago > 0.0, norm(self.heliocentric) / C_AU_DAY, 0.0)
        return np.asarray(self.heliocentric + (state.sun_pos - state.pos) - ago[..., None] * state.sun_vel)


class TraceEntry(NamedTuple):
    """A step of a trace: its name and the vectors (bodies, *shape, 3) after it, au in the geometric steps."""

    name: str
    vectors: Float


def check_place(place: str, observer: Observer) -> None:
    """Raise FrameError for an unknown place, or one that this observer cannot have."""
    if place not in PLACES:
        raise FrameError(f"place '{place}'{near_names(place, PLACES)}; expected one of {', '.join(PLACES)}")
    if place == "observed" and observer.origin != "site":
        raise FrameError("place 'observed': refraction needs a site, none was given")


def _rows(vectors: Float, start: int, stop: int) -> Float:
    """Return (bodies, n, 3) as components (3, bodies, stop − start), contiguous unless there is one moment."""
    if vectors.shape[1] == 1:
        return vectors.transpose(2, 0, 1)  # a copy would cost more than it saves
    return vectors[:, start:stop].transpose(2, 0, 1).copy()


def reduce_bodies(
    bodies: Sequence[str],
    moment: Moment,
    *,
    observer: Observer = GEOCENTRE,
    place: str = "apparent",
    ephemeris: Ephemeris | None = None,
    omit: Sequence[str] = (),
    trace: list[TraceEntry] | None = None,
) -> Directions:
    """Return the directions of bodies at moments of any shape.

    `place`: "geometric" (where the body is now), "astrometric" (where its light left it), "apparent" (bent by the Sun
    and turned by aberration) or "observed" (lifted by the air, needs a site). `omit` names steps to leave out, or the
    annual or diurnal part of one, besides those that the observer does without; `trace`, a list, receives the direction
    after every step and part of a step.
    """
    check_place(place, observer)
    source = ephemeris if ephemeris is not None else default()
    bodies = tuple(bodies)
    if not bodies:
        raise BodyError("bodies: none was named")
    for body in bodies:
        if is_centre(observer, body):
            raise BodyError(
                f"body '{body}' has no direction from origin '{observer.origin}': it is where the observer is"
            )
    geometry, optics = path(place)
    known = names_on_the_way(place)
    check_omitted(omit, known, place)
    omit = (*omit, *observer.omitted.intersection(known))

    shape = moment.shape
    centre = "earth" if observer.origin == "site" else observer.origin
    extra = tuple(name for name in ("sun", centre) if name not in bodies and name != "ssb")
    names = bodies + tuple(dict.fromkeys(extra))
    pos, vel = source.posvel(names, *moment.tdb)
    sun = (pos[names.index("sun")], vel[names.index("sun")])
    if centre == "ssb":
        middle = (np.zeros_like(sun[0]), np.zeros_like(sun[1]))
    else:
        middle = (pos[names.index(centre)], vel[names.index(centre)])
    observed_from = place_observer(observer, moment, middle, sun)
    eye_pos, eye_vel = eye(observed_from, omit)

    count = math.prod(shape)
    nb = len(bodies)
    flat = {
        "body_pos": pos[:nb].reshape(nb, count, 3),
        "body_vel": vel[:nb].reshape(nb, count, 3),
        "sun_pos": observed_from.sun_pos.reshape(1, count, 3),
        "sun_vel": observed_from.sun_vel.reshape(1, count, 3),
        "centre_pos": observed_from.centre_pos.reshape(1, count, 3),
        "centre_vel": observed_from.centre_vel.reshape(1, count, 3),
        "observer_pos": observed_from.pos.reshape(1, count, 3),
        "eye_pos": eye_pos.reshape(1, count, 3),
        "eye_vel": eye_vel.reshape(1, count, 3),
    }
    zenith = None if observed_from.zenith is None else observed_from.zenith.reshape(1, count, 3)
    is_sun = tuple(body == "sun" for body in bodies)
    has_site = observer.origin == "site"
    air = observer.atmosphere if place == "observed" else None

    out = np.empty((3, nb, count))
    distance, light = np.empty((nb, count)), np.zeros((nb, count))
    from_sun = np.empty((3, nb, count))
    block = count if trace is not None else BLOCK
    for start in range(0, count, max(block, 1)):
        stop = min(start + block, count)
        rows = {name: _rows(array, start, stop) for name, array in flat.items()}
        state = State(
            **rows,
            is_sun=is_sun,
            has_site=has_site,
            zenith=None if zenith is None else _rows(zenith, start, stop),
            air=air,
            vector=rows["body_pos"],
        )
        _run(geometry, state, omit, trace, shape)
        length = np.sqrt(dot3(state.vector, state.vector))
        state.vector = state.vector * (1.0 / length)
        _run(optics, state, omit, trace, shape)
        out[:, :, start:stop] = state.vector
        distance[:, start:stop] = length
        if place != "geometric" and "light time" not in omit:
            light[:, start:stop] = length * (86400.0 / C_AU_DAY)
        from_sun[:, :, start:stop] = state.from_sun if state.from_sun is not None else rows["body_pos"]
    return Directions(
        bodies,
        place,
        _vectors_last(out, shape),
        distance.reshape(nb, *shape),
        light.reshape(nb, *shape),
        _vectors_last(from_sun, shape),
        observed_from,
    )


def _vectors_last(rows: Float, shape: tuple[int, ...]) -> Float:
    """Return (3, bodies, n) as a (bodies, *shape, 3) view: the components stay contiguous in memory."""
    # transpose, not moveaxis: ten times less to pay where there is one moment.
    return rows.reshape(3, rows.shape[1], *shape).transpose(*range(1, len(shape) + 2), 0)


def _run(
    steps: tuple[Step, ...], state: State, omit: Sequence[str], trace: list[TraceEntry] | None, shape: tuple[int, ...]
) -> None:
    for step in steps:
        if step.name in omit:
            continue
        name = step.name
        if trace is not None and step.parts is not None:
            *before, (name, _) = step.parts(state)  # the last part is what the step itself is about to do
            trace.extend(TraceEntry(part, _vectors_last(vector, shape)) for part, vector in before)
        step.apply(state)
        if trace is not None:
            trace.append(TraceEntry(name, _vectors_last(state.vector, shape)))

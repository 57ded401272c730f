"""The steps of a reduction, in their order: small functions that each turn a state into the next.

The one path of `reduce_bodies` runs these and nothing else; a trace of it is the list of states between them. Vectors
are component first, (3, bodies, moments).
"""

from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass
from functools import cache
from typing import NamedTuple

import numpy as np

from colure.arrays import Float
from colure.errors import ColureError
from colure.reduction.observer import C_AU_DAY
from colure.reduction.optics import aberrated, deflected, dot3, refracted
from colure.refraction import Atmosphere

GM_SUN = 2.9591220828559093e-4
"""Heliocentric gravitational constant, au³/day² (the Gaussian constant squared)."""


@dataclass(slots=True)
class State:
    """What the steps work on. All vectors (3, bodies, moments) or (3, 1, moments), ICRS axes, au and au/day.

    `vector` is the direction so far: from the observer to the body, in au during the geometric steps and of unit
    length during the optical ones. Steps replace it, never change it in place. `eye_pos` and `eye_vel` are the
    observer's own place and motion as parallax and aberration take them, less what is left out.
    """

    body_pos: Float
    body_vel: Float
    sun_pos: Float
    sun_vel: Float
    centre_pos: Float
    centre_vel: Float
    observer_pos: Float
    eye_pos: Float
    eye_vel: Float
    is_sun: tuple[bool, ...]
    has_site: bool
    zenith: Float | None
    air: Atmosphere | None
    vector: Float
    light_days: Float | float = 0.0
    from_sun: Float | None = None


class Step(NamedTuple):
    """One step: its name, what it does, and the names and directions of what it is made of (for a trace)."""

    name: str
    apply: Callable[[State], None]
    parts: Callable[[State], tuple[tuple[str, Float], ...]] | None = None


def barycentric(state: State) -> None:
    """Set the direction from the solar system's barycentre."""
    state.vector = state.body_pos
    state.from_sun = state.body_pos - state.sun_pos


def parallax(state: State) -> None:
    """Move the origin to the observer: annual and diurnal parallax in one."""
    state.vector = state.body_pos - state.eye_pos


def parallax_parts(state: State) -> tuple[tuple[str, Float], ...]:
    """Return the direction from the centre of the Earth, then from the site."""
    centre = state.body_pos - state.centre_pos
    if not state.has_site:
        return (("parallax", centre),)
    return (("annual parallax", centre), ("diurnal parallax", state.body_pos - state.eye_pos))


def light_time(state: State) -> None:
    """Move the body back to where the light left it.

    The body's path over the light time is its tangent plus the Sun's pull on it, which leaves an error below
    0.01 mas for every body of the ephemeris (the third order of Mercury's motion over 12 minutes is 0.003 mas); the
    equation |d − v τ| = c τ is solved in closed form.
    """
    d, v = state.vector, state.body_vel
    from_sun = state.body_pos - state.sun_pos
    r2 = dot3(from_sun, from_sun)
    r = np.sqrt(r2)
    pull = -GM_SUN / np.where(r2 > 1e-6, r2 * r, np.inf)  # nothing for the Sun itself
    dv = dot3(d, v)
    slow = C_AU_DAY**2 - dot3(v, v)
    tau = (np.sqrt(dv * dv + slow * dot3(d, d)) - dv) / slow
    bend = 0.5 * tau * tau * pull
    state.vector = d - tau * v + bend * from_sun
    # The light that the body sends on left the Sun r/c earlier still, which shifts the Sun by some 1e-8 au.
    state.from_sun = from_sun * (1.0 + bend) - tau * v + (tau + r * (1.0 / C_AU_DAY)) * state.sun_vel
    state.light_days = tau


def deflection(state: State) -> None:
    """Bend the light by the Sun's gravity, for the source's finite distance; the Sun's own light is not bent."""
    if state.from_sun is None or all(state.is_sun):
        return
    bent = deflected(state.vector, state.from_sun, state.observer_pos - state.sun_pos)
    for row, is_sun in enumerate(state.is_sun):
        if is_sun:
            bent[:, row] = state.vector[:, row]
    state.vector = bent


def _sun_distance(state: State) -> Float:
    away = state.observer_pos - state.sun_pos
    return np.asarray(np.sqrt(dot3(away, away)))


def aberration(state: State) -> None:
    """Turn the direction towards the observer's barycentric motion: annual and diurnal aberration in one."""
    state.vector = aberrated(state.vector, state.eye_vel, _sun_distance(state))


def aberration_parts(state: State) -> tuple[tuple[str, Float], ...]:
    """Return the direction with the motion of the Earth's centre alone, then with the site's."""
    if not state.has_site:
        return (("aberration", aberrated(state.vector, state.eye_vel, _sun_distance(state))),)
    return (
        ("annual aberration", aberrated(state.vector, state.centre_vel, _sun_distance(state))),
        ("diurnal aberration", aberrated(state.vector, state.eye_vel, _sun_distance(state))),
    )


def refraction(state: State) -> None:
    """Lift the direction towards the zenith by the air."""
    if state.zenith is not None and state.air is not None:
        state.vector = refracted(state.vector, state.zenith, state.air)


GEOMETRY = (
    Step("barycentric", barycentric),
    Step("parallax", parallax, parallax_parts),
    Step("light time", light_time),
)
"""Steps on vectors in au; the last leaves the vector from observer to body whose length is the distance."""

OPTICS = (
    Step("deflection", deflection),
    Step("aberration", aberration, aberration_parts),
    Step("refraction", refraction),
)
"""Steps on unit directions."""

PLACES = ("geometric", "astrometric", "apparent", "observed")
PARTED = ("parallax", "aberration")
"""Steps with an annual and a diurnal part, each of which can be left out alone."""
_LAST = {"geometric": "parallax", "astrometric": "light time", "apparent": "aberration", "observed": "refraction"}


@cache
def path(place: str) -> tuple[tuple[Step, ...], tuple[Step, ...]]:
    """Return the geometric and the optical steps that lead to a place."""
    steps = GEOMETRY + OPTICS
    names = [step.name for step in steps]
    used = steps[: names.index(_LAST[place]) + 1]
    return tuple(s for s in used if s in GEOMETRY), tuple(s for s in used if s in OPTICS)


@cache
def names(place: str) -> tuple[str, ...]:
    """Return every name that `omit` may hold on the way to a place: the steps and their parts."""
    steps = [step.name for group in path(place) for step in group]
    return (*steps, *(f"{part} {name}" for name in steps if name in PARTED for part in ("annual", "diurnal")))


def check_omitted(omit: Collection[str], known: Sequence[str], place: str) -> None:
    """Raise ColureError for a name in `omit` that no step has on the way to a place."""
    unknown = sorted(set(omit) - set(known))
    if unknown:
        raise ColureError(
            f"reduction: no step '{unknown[0]}' on the way to the {place} place; known: {', '.join(known)}"
        )

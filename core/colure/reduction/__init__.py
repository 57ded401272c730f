"""One reduction path for bodies and stars: geometric, astrometric, apparent and observed places on ICRS axes."""

from colure.reduction.bodypath import GEOCENTRE, Directions, TraceEntry, reduce_bodies
from colure.reduction.observer import (
    C_AU_DAY,
    ORIGINS,
    Observer,
    ObserverState,
    observer_state,
)
from colure.reduction.starpath import (
    STAR_STEPS,
    StarContext,
    apply_context,
    context_of,
    reduce_stars,
    space_motion,
    space_velocity,
    star_context,
    unapply,
    unreduce,
)
from colure.reduction.steps import GEOMETRY, OPTICS, PLACES

__all__ = [
    "C_AU_DAY",
    "GEOCENTRE",
    "GEOMETRY",
    "OPTICS",
    "ORIGINS",
    "PLACES",
    "STAR_STEPS",
    "Directions",
    "Observer",
    "ObserverState",
    "StarContext",
    "TraceEntry",
    "apply_context",
    "context_of",
    "observer_state",
    "reduce_bodies",
    "reduce_stars",
    "space_motion",
    "space_velocity",
    "star_context",
    "unapply",
    "unreduce",
]

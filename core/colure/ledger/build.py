"""Build a ledger: run the one reduction path with its trace, then the turns to the frame, and measure every step.

A body is traced by `reduce_bodies` itself. A star's path is one fused function; it is traced by leaving out all steps
but the first few, so that the last of these calls is the answer itself and the others differ in what is missing.
"""

import math
from collections.abc import Collection, Sequence
from dataclasses import replace
from functools import lru_cache
from typing import Any

import numpy as np

from colure import frames
from colure.arrays import Float, unit
from colure.bodies import defaults
from colure.ephemeris import Ephemeris, default
from colure.errors import ColureError
from colure.frames import Frame
from colure.ledger import covariance, doubt, turns
from colure.ledger.doubt import Doubt
from colure.ledger.entries import Entry, Ledger, Stage, entry, measured
from colure.ledger.given import Source, input_turn, jd_tdb, rate_arcsec_s
from colure.moment import Moment
from colure.reduction import (
    GEOCENTRE,
    STAR_STEPS,
    Observer,
    StarContext,
    apply_context,
    context_of,
    observer_state,
    reduce_bodies,
)
from colure.reduction.bodypath import TraceEntry, check_place
from colure.stepnames import checked

_ON_THE_WAY = {
    "geometric": STAR_STEPS[:3],
    "astrometric": STAR_STEPS[:4],
    "apparent": STAR_STEPS[:7],
    "observed": STAR_STEPS,
}
_DIURNAL = ("diurnal parallax", "diurnal aberration")
_ICRS = Frame("icrs")


def _prepared(
    moment: Moment, observer: Observer, place: str | None, frame: Frame | str, omitted: Collection[str]
) -> tuple[Observer, str, Frame, frozenset[str]]:
    """Check what was asked and fill in the place; polar motion left out is left out of the observer as well."""
    if moment.shape != ():
        raise ColureError(f"ledger: {moment.size} moments were given; a ledger is of one")
    left_out = checked(omitted) | observer.omitted
    frame = frames.parsed(frame)
    if place is None:
        place, _ = defaults(frame, observer.site, None, observer.origin)
    check_place(place, observer)
    if left_out != observer.omitted:
        observer = replace(observer, omitted=left_out)
    return observer, place, frame, left_out


# Bodies


def body(
    name: str,
    moment: Moment,
    *,
    observer: Observer = GEOCENTRE,
    place: str | None = None,
    frame: Frame | str = "icrs",
    omitted: Collection[str] = (),
    ephemeris: Ephemeris | None = None,
) -> Ledger:
    """Return the ledger of a body of the ephemeris at one moment.

    `place` is by default that which the frame implies; `omitted` names steps (of `colure.stepnames`) to leave out.
    """
    observer, place, frame, left_out = _prepared(moment, observer, place, frame, omitted)
    source = ephemeris if ephemeris is not None else default()
    way = [step for step in _ON_THE_WAY[place] if step != "space motion"]
    if place == "geometric":
        way = [step for step in way if step != "light time"]
    trace: list[TraceEntry] = []
    seen = reduce_bodies((name,), moment, observer=observer, place=place, ephemeris=source, trace=trace)
    found = {_full(one.name): unit(one.vectors[0]) for one in trace}
    stages = [_sky_stage("barycentric", None, found["barycentric"], source.source(jd_tdb(moment)))]
    for step in _seen_from(way, observer):
        before = stages[-1].after
        stages.append(
            _sky_stage(step, before, found.get(step, before), _model(step, source, moment, observer), step in left_out)
        )
    end = seen.vectors[0]
    stages, vector = _to_frame(stages, end, frame, moment, observer, left_out)
    pos, vel = source.posvel((name,), *moment.tdb)
    line, motion = pos[0] - seen.observer.pos, vel[0] - seen.observer.vel
    distance = float(seen.distance_au[0])
    bound = float(np.ravel(source.uncertainty_arcsec((name,), *moment.tdb, distance))[0])
    first = doubt.body_position(bound, rate_arcsec_s(line, motion), moment)
    entries = _entries(stages, first, moment, observer, frame, None)
    echo = {"distance_au": distance, "light_time_s": float(seen.light_time_s[0])}
    return Ledger(name, "body", moment, observer, place, str(frame), entries, end, vector, left_out, echo)


def _full(name: str) -> str:
    return f"annual {name}" if name in ("parallax", "aberration") else name


def _seen_from(way: Sequence[str], observer: Observer) -> list[str]:
    """Return the steps that an observer has: only a site is carried round the Earth's centre."""
    return [step for step in way if step not in _DIURNAL or observer.origin == "site"]


def _model(step: str, ephemeris: Ephemeris, moment: Moment, observer: Observer) -> str:
    centre = {"sun": "the Sun", "ssb": "itself", "emb": "the Earth–Moon barycentre"}.get(observer.origin, "the Earth")
    match step:
        case "annual parallax" | "annual aberration":
            what = f"from the barycentre to {centre}" if "parallax" in step else f"relativistic; velocity of {centre}"
            return f"{what}, {ephemeris.source(jd_tdb(moment))}"
        case "diurnal parallax":
            return "WGS84 site"
        case "diurnal aberration":
            return "relativistic; the site's turn with the Earth"
        case "light time":
            return "from the observer, closed form"
        case "deflection":
            return "the Sun's, finite distance (ERFA ld)"
        case "refraction":
            return "A tan z + B tan³ z (ERFA refco); Bennett below 15°"
    return "straight line at constant speed"


# Stars, positions and directions


@lru_cache(maxsize=16)
def contexts(
    moment: Moment,
    observer: Observer,
    place: str,
    epoch_jd: float,
    steps: tuple[str, ...],
    ephemeris: Any,
) -> tuple[StarContext, ...]:
    """Return one context for every step: each leaves out the steps after it, and the last none on the way.

    What the observer does without is left out of all.
    """
    if not steps:
        return ()
    state = observer_state(observer, moment, ephemeris)
    found = []
    for last in range(len(steps)):
        left = {*STAR_STEPS} - {*steps[: last + 1]}
        found.append(context_of(state, moment, observer, place, epoch_jd, None, left))
    return tuple(found)


def star_steps(source: Source, place: str, observer: Observer) -> tuple[str, ...]:
    """Return the steps that a source has on its way: what does not move has no space motion, what is at no distance
    no parallax."""
    way = [STAR_STEPS[0]] if place == "geometric" else _seen_from(_ON_THE_WAY[place], observer)
    if source.velocity is None:
        way = [step for step in way if step not in ("space motion", "light time")]
    if source.parallax is None:
        way = [step for step in way if not step.endswith("parallax")]
    return tuple(way)


def source(
    given: Source,
    moment: Moment,
    *,
    observer: Observer = GEOCENTRE,
    place: str | None = None,
    frame: Frame | str = "icrs",
    omitted: Collection[str] = (),
    ephemeris: Ephemeris | None = None,
) -> Ledger:
    """Return the ledger of a star, a position or a direction (see `colure.ledger.given`) at one moment."""
    observer, place, frame, left_out = _prepared(moment, observer, place, frame, omitted)
    steps = star_steps(given, place, observer)
    kernel: Any = ephemeris
    states = contexts(moment, observer, place, given.epoch_jd, steps, kernel)
    position, velocity = given.position[None, :], None if given.velocity is None else given.velocity[None, :]
    parallax = None if given.parallax is None else np.array([given.parallax])
    stages = _start(given, moment, observer.site)
    shown = ephemeris if ephemeris is not None else default()
    ends = covariance.spreads(given, states)
    for number, (step, context) in enumerate(zip(steps, states, strict=True)):
        after = np.asarray(apply_context(context, position, velocity, parallax))[0]
        model = "Rømer: across the Earth's orbit" if step == "light time" else _model(step, shown, moment, observer)
        carried = None if ends is None else covariance.carried(given, after, ends[number])
        stages.append(_sky_stage(step, stages[-1].after, after, model, step in left_out, carried))
    end = stages[-1].after
    spread = None if ends is None or given.spread is None else (ends[-1] if ends else given.spread[0])
    stages, vector = _to_frame(stages, end, frame, moment, observer, left_out, given, spread)
    years = (jd_tdb(moment) - given.epoch_jd) / 365.25
    entries = _entries(stages, doubt.start(given), moment, observer, frame, given, years)
    return Ledger(
        given.name, given.kind, moment, observer, place, str(frame), entries, end, vector, left_out, given.echo
    )


def _start(given: Source, moment: Moment, site: Any) -> list[Stage]:
    """Return the line of the position as it was given, and the one of its turn to ICRS axes."""
    start = "catalogue position" if given.kind == "star" else "position"
    carried = None if given.spread is None else covariance.carried(given, given.position, given.spread[0])
    icrs = given.position if given.seen_as is None else given.seen_as
    where = np.stack([icrs, icrs])
    if given.frame == _ICRS:
        stages = [Stage(start, "icrs", True, None, icrs, where, "as given", covariance=carried)]
    else:
        frame, matrix = given.frame, input_turn(given, moment, site)
        model = "turned back" if frame.is_rotation else "FK4 to FK5 (Explanatory Supplement 1992)"
        arrow = np.stack([given.typed, icrs])
        stages = [
            Stage(start, str(frame), frame.is_equatorial, None, given.typed, where, "as given"),
            Stage(f"{frame} to ICRS", "icrs", True, given.typed, icrs, arrow, model, matrix=matrix, covariance=carried),
        ]
    if given.seen_as is not None:
        step = f"back from the {given.seen} place"
        stages.append(_sky_stage(step, icrs, given.position, "inverse of the steps that follow"))
    return stages


# Common to all


def _sky_stage(
    step: str, before: Float | None, after: Float, model: str, omitted: bool = False, carried: Float | None = None
) -> Stage:
    arrow = np.stack([after if before is None else before, after])
    return Stage(step, "icrs", True, before, after, arrow, model, omitted, None, carried)


def _to_frame(
    stages: list[Stage],
    end: Float,
    frame: Frame,
    moment: Moment,
    observer: Observer,
    left_out: frozenset[str],
    given: Source | None = None,
    spread: Float | None = None,
) -> tuple[list[Stage], Float]:
    """Return the stages with the turns to the frame, refraction last and in the frame, and the end's components."""
    lifted = stages.pop() if stages[-1].step == "refraction" else None
    epoch = None
    if not frame.is_rotation and given is not None and not given.frame.is_rotation:
        epoch = float(given.echo["epoch"].lstrip("B"))
    chain = turns.chain(frame, moment, observer.site, polar_motion=observer.has_pole, epoch=epoch)
    here = stages[-1].after
    matrix: Float | None = np.eye(3)
    applied = []
    # The covariance of the last step on the sky is turned with the axes; refraction has its own.
    unlifted = stages[-1].covariance
    for turn in chain:
        skipped = turn.name in left_out
        after = here if skipped else turn.apply(here)
        if not skipped:
            applied.append(turn)
        matrix = None if matrix is None or turn.matrix is None else matrix if skipped else turn.matrix @ matrix
        back = end if matrix is None else matrix.T @ here
        if matrix is None:
            back = frames.to_icrs(here, turn.axes if "/" in turn.axes else frame, epoch=epoch)
        carried = None
        if unlifted is not None and given is not None and spread is not None and lifted is None:
            carried = covariance.carried(given, after, covariance.turned(spread, applied))
        stages.append(
            Stage(
                turn.name, turn.axes, turn.equatorial, here, after,
                np.stack([back, stages[-1].arrow[1] if matrix is None else matrix.T @ after]),
                turn.model, skipped, np.eye(3) if skipped and turn.matrix is not None else turn.matrix, carried,
                on_axes=True,
            )
        )  # fmt: skip
        here = after
    if lifted is not None:
        vector = end
        for turn in applied:
            vector = turn.apply(vector)
        carried = None
        if given is not None and spread is not None:
            carried = covariance.carried(given, vector, covariance.turned(spread, applied))
        last = stages[-1]
        stages.append(
            Stage(
                lifted.step, last.frame, last.equatorial, here, vector, lifted.arrow, lifted.model, lifted.omitted,
                None, carried,
            )
        )  # fmt: skip
        here = vector
    return stages, here


def _entries(
    stages: list[Stage],
    start: Doubt,
    moment: Moment,
    observer: Observer,
    frame: Frame,
    given: Source | None,
    years: float = 0.0,
) -> tuple[Entry, ...]:
    size, angle, lon, lat = measured(stages)
    since = _turn_years(frame, moment)
    entries = []
    major = covariance.first(stages)
    parallax = None if given is None else given.parallax
    for number, stage in enumerate(stages):
        if stage.omitted:
            known = (0.0, "left out")
        elif number == 0:
            known = start if major is None else (major, "covariance as given")
        elif stage.on_axes:
            known = doubt.turn(stage.step, stage.model, since, float(lat[number]), moment)
        elif major is not None and stage.covariance is not None and stage.step in ("space motion", "annual parallax"):
            wider = covariance.major(stage.covariance)
            known = (math.sqrt(max(wider**2 - major**2, 0.0)), "covariance as given")
            major = max(wider, major)
        else:
            flags = None if given is None else given.flags
            known = doubt.sky(stage.step, float(size[number]), moment, observer, given is None, flags, parallax, years)
        entries.append(entry(stage, (size[number], angle[number], lon[number], lat[number]), known))
    return tuple(entries)


def _turn_years(frame: Frame, moment: Moment) -> float:
    if frame.needs_moment or not frame.is_rotation:
        return float(moment.julian_year) - 2000.0
    return (sum(frame.equinox_tt()) - 2451545.0) / 365.25

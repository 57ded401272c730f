"""A position whose star is not known: every frame is tried, and the catalogue asked what stands there."""

from dataclasses import dataclass

import numpy as np

from colure import frames, names
from colure.arrays import ARCSEC, DEG, TWO_PI, Float, cartesian
from colure.audit.answer import Audit, ask
from colure.audit.axes import AXES, Axes
from colure.audit.hypotheses import plan
from colure.audit.matching import nearest
from colure.audit.numbers import Numbers
from colure.audit.readings import AS_READ, READINGS, Read
from colure.audit.reference import Question, Stars
from colure.audit.verdict import WITHIN
from colure.errors import AngleError, TargetError
from colure.moment import Moment
from colure.sites import Site

LIMITS = (12.0, 11.0, 10.0, 9.0, 8.0, 7.0, 6.5, 5.5, 4.5, 3.5, 2.5)
STARS_BRIGHTER = {
    12.0: 2_074_790, 11.0: 940_753, 10.0: 358_607, 9.0: 130_733, 8.0: 46_099, 7.0: 15_744, 6.5: 8_949,
    5.5: 2_900, 4.5: 950, 3.5: 300, 2.5: 95,
}  # fmt: skip
"""Stars of the whole sky brighter than a V magnitude, from the catalogue's own counts (below 6: rounded)."""
MOST_CHANCE = 0.05
SLACK_ARCSEC = 25.0
"""Aberration and some proper motion: how far a true star may lie from the trial place before it is reduced."""


@dataclass(frozen=True, slots=True)
class Found:
    """One star that explains a position: its catalogue row and name, and the audit against it."""

    row: int
    name: str
    audit: Audit


def audit_unknown(
    numbers: Numbers,
    moment: Moment | None = None,
    *,
    site: Site | None = None,
    claim: str | None = None,
    place: str | None = None,
    most: int = 5,
) -> tuple[Found, ...]:
    """Return the stars that explain one position under some hypothesis, the best first; none is an empty tuple.

    Stars are taken down to the magnitude at which an accidental meeting is still unlikely. Raises TargetError where
    the rounding is too coarse for any star.
    """
    if len(numbers) != 1:
        raise AngleError(f"audit against the catalogue: {len(numbers)} positions; expected one, or a table")
    if np.isnan(numbers.x[0]) or np.isnan(numbers.y[0]):
        raise AngleError("audit against the catalogue: both coordinates are needed")
    dummy = Question(Stars.point(0.0, 0.0), moment, site, claim, place)
    sigma = float(np.hypot(numbers.half_x[0] * np.cos(min(abs(numbers.y[0]), 90.0) * DEG), numbers.half_y[0]))
    area = np.pi * (WITHIN * sigma) ** 2
    trials = len(plan(dummy))
    chances = {limit: trials * area * STARS_BRIGHTER[limit] / 41252.96 for limit in LIMITS}
    limit = next((limit for limit in LIMITS if chances[limit] < MOST_CHANCE), None)
    if limit is None:
        raise TargetError(
            f"audit against the catalogue: a rounding of {sigma * 3600.0:.0f}″ meets some bright star under one of "
            f"{trials} hypotheses by chance alone; name the star or the body"
        )
    vectors = _trial_places(numbers, dummy)
    year = 2000.0 if moment is None else float(np.ravel(moment.julian_year)[0])
    met = nearest(vectors, (WITHIN * sigma * 3600.0 + SLACK_ARCSEC) * ARCSEC, limit, year=year)
    found = []
    for row in np.unique(met.rows[met.found]):
        name = names.identify(int(row)).best
        question = Question(Stars.of_ids([int(row)], name), moment, site, claim, place)
        answer = ask(numbers, question, chance=chances[limit], deep=False)
        if answer.members:
            found.append(Found(int(row), name, answer))
    found.sort(key=lambda one: (one.audit.simplest.hypothesis.steps, one.audit.best.n_sigma))
    return tuple(found[:most])


def _trial_places(numbers: Numbers, question: Question) -> Float:
    """Return ICRS directions (k, 3) of a position in every reading and every frame that has a name."""
    found = []
    readings = (AS_READ, *READINGS)
    for reading in readings:
        read = reading.apply(numbers)
        if not read.fits[0]:
            continue
        for lon in _branches(read):
            vector = cartesian(np.array([lon]), read.lat)
            found += [_icrs(vector, axes, question) for axes in AXES if axes.frame is not None]
    usable = [vector for vector in found if vector is not None]
    return np.concatenate(usable)


def _branches(read: Read) -> list[float]:
    count = round(TWO_PI / read.period)
    return [float(read.lon[0]) + k * read.period for k in range(count)]


def _icrs(vector: Float, axes: Axes, question: Question) -> Float | None:
    if axes.of_date and question.moment is None:
        return None
    assert axes.frame is not None
    return frames.to_icrs(vector, axes.frame, question.moment if axes.of_date else None)

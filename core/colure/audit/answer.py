"""The audit of one position, or of several of one kind: prediction, judgement, fits and mending brought together."""

from dataclasses import dataclass

import numpy as np

from colure.audit.axes import AXES
from colure.audit.fits import Fit, fits
from colure.audit.hypotheses import Predictions, predict
from colure.audit.mending import Mending, mend
from colure.audit.numbers import Numbers, read
from colure.audit.reference import Question, Stars
from colure.audit.verdict import (
    BEYOND,
    WITHIN,
    Candidate,
    Judged,
    Separation,
    joint,
    judge,
    ranked,
    separating,
    settled,
)
from colure.errors import AngleError
from colure.frames import Frame
from colure.moment import Moment
from colure.sites import Site

STATUSES = ("certain", "likely", "class", "fitted", "none")
ORDER = {axes.key: rank + (1000 if axes.kind == "slip" else 0) for rank, axes in enumerate(AXES)}
CHANCE = 0.01
"""Chance of a meeting by accident above which nothing found in the catalogue is called certain."""


@dataclass(frozen=True, slots=True)
class Audit:
    """The answer on one question.

    `status`: "certain" (one hypothesis within 3σ, the next beyond 5σ), "likely" (one within 3σ, the next between),
    "class" (several within 3σ), "fitted" (none, but one with an unknown fitted to it), "none". `candidates` are all
    hypotheses by distance, `members` those within 3σ; `chance` is that of an accidental meeting where the reference
    was looked for in the catalogue.
    """

    numbers: Numbers
    question: Question
    status: str
    candidates: tuple[Candidate, ...]
    members: tuple[Candidate, ...]
    fits: tuple[Fit, ...]
    settled: dict[str, str]
    separation: Separation | None
    mending: Mending
    chance: float = 0.0

    @property
    def best(self) -> Candidate:
        """The nearest hypothesis."""
        return self.candidates[0]

    @property
    def simplest(self) -> Candidate:
        """The member of the class with the fewest mistakes, the nearest among equals; the nearest where none fits."""
        return min(self.members, key=_plainness) if self.members else self.best

    @property
    def verdict(self) -> str:
        """The verdict in one sentence."""
        lead, size = self.simplest, f"{self.simplest.residual_arcsec:.3g}″, {self.simplest.n_sigma:.1f} σ"
        words = f"{lead.hypothesis.words} [{lead.hypothesis.code}]"
        if self.status == "certain":
            claimed = " (as claimed)" if lead.hypothesis.steps == 0 and self.question.claim else ""
            return f"{words}{claimed}: residual {size}; nothing else within {BEYOND:.0f} σ"
        if self.status == "likely":
            after = next(one for one in self.candidates if one not in self.members)
            return f"probably {words}: residual {size}; but the next is at {after.n_sigma:.1f} σ"
        if self.status == "class":
            count = len(self.members)
            if self.chance > CHANCE and count == 1:
                return f"perhaps {words}: residual {size}; the chance of an accidental meeting is {self.chance:.0%}"
            return f"one of {count} that this rounding cannot tell apart, the simplest: {words}, residual {size}"
        if self.status == "fitted":
            fit = self.fits[0]
            return f"none as it stands; with one unknown fitted: {fit.words} [{fit.code}], {fit.n_sigma:.1f} σ"
        return f"none of these: the nearest is {words} at {self.best.n_sigma:.3g} σ ({self.best.residual_arcsec:.3g}″)"


def _plainness(one: Candidate) -> tuple[int, int, float]:
    """Order by the number of mistakes, then by how common the axes are (the order of AXES), then by distance."""
    key = one.hypothesis.axes.key
    return one.hypothesis.steps, ORDER.get(key, -1), one.n_sigma


def ask(numbers: Numbers, question: Question, *, chance: float = 0.0, deep: bool = True) -> Audit:
    """Return the audit of numbers (n,) that all have the same explanation.

    `deep` also fits the hypotheses with an unknown and looks for the observation that would decide.
    """
    found = predict(numbers, question)
    order = ranked(found)
    if not order:
        raise AngleError("audit: no hypothesis can be applied to these numbers")
    members = tuple(one for one in order if one.n_sigma <= WITHIN)
    fitted = fits(numbers, question) if deep and not members else ()
    status = _status(order, members, fitted)
    if status == "certain" and chance > CHANCE:
        status = "class"
    first = min(members, key=_plainness) if members else None
    sorted_members = tuple(sorted(members, key=lambda one: (one is not first, one.n_sigma)))
    return Audit(
        numbers,
        question,
        status,
        order,
        members,
        fitted,
        settled(members),
        separating(sorted_members, numbers.take(slice(0, 1)), question) if deep and len(numbers) == 1 else None,
        _mending(first, fitted, numbers, question),
        chance,
    )


def _status(order: tuple[Candidate, ...], members: tuple[Candidate, ...], fitted: tuple[Fit, ...]) -> str:
    if len(members) > 1:
        return "class"
    if len(members) == 1:
        ahead = order[1].n_sigma if len(order) > 1 else np.inf
        return "certain" if ahead > BEYOND else "likely"
    return "fitted" if fitted else "none"


def _mending(first: Candidate | None, fitted: tuple[Fit, ...], numbers: Numbers, question: Question) -> Mending:
    if first is not None:
        if first.hypothesis.steps == 0 and question.claim is not None:
            return Mending((), "nothing is to be mended: the numbers can be what is claimed")
        return mend(first.hypothesis, numbers, question)
    for fit in fitted:
        if fit.frame is not None:
            target = question.claim or "icrs"
            moves = question.moment is not None and Frame.parse(target).needs_moment
            at = f" --at '{question.moment[0]}'" if moves and question.moment is not None else ""
            line = f'colure convert "{numbers.x[0]:.7f} {numbers.y[0]:+.7f}" --from {fit.frame} --to {target}{at}'
            return Mending((line,), "the equinox was fitted")
    return Mending((), "")


def audit(
    numbers: Numbers | str,
    reference: str | Stars,
    moment: Moment | None = None,
    *,
    site: Site | None = None,
    claim: str | None = None,
    place: str | None = None,
    origin: str | None = None,
    exposure_s: float | None = None,
    rounding_arcsec: float | None = None,
) -> Audit:
    """Return which frame, place, origin or time explains a position: "which frame is this coordinate in?".

    `numbers` is a text `LON LAT`, whose last digits give the rounding, or Numbers; `reference` the name of a body, or
    Stars. `claim`, `place` and `origin` are what the numbers are said to be (see Question). `rounding_arcsec` replaces
    the half unit of the last digit. Several positions at as many moments are taken to have one explanation.
    """
    question = Question(reference, moment, site, claim, place, origin, exposure_s)
    if isinstance(numbers, str):
        numbers = read(numbers, equatorial=claim is None or Frame.parse(claim).is_equatorial)
    if rounding_arcsec is not None:
        numbers = numbers.rounded_to(rounding_arcsec)
    return ask(numbers, question)


def audit_each(numbers: Numbers, question: Question) -> tuple[Predictions, Judged]:
    """Return predictions and verdicts for positions (n,) that may each have an explanation of their own."""
    found = predict(numbers, question)
    return found, judge(found.n_sigma)


def audit_joint(numbers: Numbers, question: Question) -> tuple[Predictions, Judged]:
    """Return the same for positions taken together: 90 % of them must fit."""
    found = predict(numbers, question)
    return found, judge(joint(found.n_sigma)[:, None])

"""From distances in σ to a verdict: what is settled, what cannot be told apart, and what observation would tell it."""

import math
from dataclasses import dataclass

import numpy as np

from colure.arrays import ARCSEC, DEG, Bool, Float, Int, cartesian, separation
from colure.audit.axes import BY_KEY
from colure.audit.hypotheses import Hypothesis, Predictions, plan, predict
from colure.audit.numbers import Numbers
from colure.audit.reference import Question, Stars
from colure.audit.sights import SIGHTS
from colure.errors import MomentError, SpanError

WITHIN = 3.0
"""σ within which a prediction belongs to the class."""
BEYOND = 5.0
"""σ beyond which the next prediction must lie for a verdict to be certain."""
JOINT_PERCENTILE = 90.0
"""Of many positions this share must fit: the rest may be misidentified."""
SAME_ARCSEC = 1e-4
"""Explanations that are nearer than this to each other give the same numbers."""
YEARS_AHEAD = 2.0
SAMPLES = 48


@dataclass(frozen=True, slots=True)
class Judged:
    """Verdicts on n positions by h hypotheses: `inside` (h, n) is the class, `best` (n,) the nearest hypothesis.

    `certain` (n,) where exactly one lies within WITHIN and the next beyond BEYOND; `none` (n,) where none is within.
    """

    inside: Bool
    best: Int
    certain: Bool
    none: Bool


def judge(n_sigma: Float) -> Judged:
    """Judge distances (h, n) in σ: the one rule by which anything is called certain."""
    inside = n_sigma <= WITHIN
    count = inside.sum(axis=0)
    ahead = np.partition(n_sigma, 1, axis=0)[1] if len(n_sigma) > 1 else np.full(n_sigma.shape[1], np.inf)
    return Judged(inside, np.argmin(n_sigma, axis=0), (count == 1) & (ahead > BEYOND), count == 0)


def joint(n_sigma: Float) -> Float:
    """Return the distances (h,) of many positions (h, n) taken together."""
    if n_sigma.shape[1] == 1:
        return n_sigma[:, 0]
    rank = min(int(np.ceil(JOINT_PERCENTILE / 100.0 * n_sigma.shape[1])) - 1, n_sigma.shape[1] - 1)
    return np.asarray(np.partition(n_sigma, rank, axis=1)[:, rank])


@dataclass(frozen=True, slots=True)
class Candidate:
    """A hypothesis with how well it fits: distance in σ, and residuals in arcsec (longitude's times cos latitude)."""

    hypothesis: Hypothesis
    n_sigma: float
    off_lon_arcsec: float
    off_lat_arcsec: float

    @property
    def residual_arcsec(self) -> float:
        """The whole residual on the sky, of the coordinates that are known."""
        parts = [part for part in (self.off_lon_arcsec, self.off_lat_arcsec) if np.isfinite(part)]
        return math.hypot(*parts)


def ranked(found: Predictions) -> tuple[Candidate, ...]:
    """Return every hypothesis that the digits allow, by distance; among equals the one with fewer mistakes first."""
    distance = joint(found.n_sigma)
    steps = np.array([hypothesis.steps for hypothesis in found.hypotheses])
    order = [at for at in np.lexsort((steps, distance)) if np.isfinite(distance[at])]
    cos_lat = np.cos(found.lat)
    with np.errstate(invalid="ignore"):
        lon = np.median(found.off_lon * cos_lat, axis=1) / ARCSEC
        lat = np.median(found.off_lat, axis=1) / ARCSEC
    return tuple(Candidate(found.hypotheses[at], float(distance[at]), float(lon[at]), float(lat[at])) for at in order)


def settled(members: tuple[Candidate, ...]) -> dict[str, str]:
    """Return what all members of a class agree in: reading, axes, place, moment."""
    if not members:
        return {}
    found = {}
    views = {
        "digits": {one.hypothesis.reading.words for one in members},
        "axes": {_axes(one.hypothesis) for one in members},
        "place": {SIGHTS[one.hypothesis.sight].words for one in members},
        "moment": {one.hypothesis.shift.words if one.hypothesis.shift else "as given" for one in members},
    }
    for name, values in views.items():
        if len(values) == 1:
            found[name] = next(iter(values))
    return found


def _axes(hypothesis: Hypothesis) -> str:
    """Return the words for axes, whatever the model of precession: no rounding tells the models apart for long."""
    plain = BY_KEY.get(hypothesis.axes.key.partition("@")[0])
    return plain.words if plain is not None else hypothesis.axes.words


@dataclass(frozen=True, slots=True)
class Separation:
    """What would tell a class apart.

    `now_arcsec` is the least distance between the best member and another that can be told from it at all (0: none
    can); `rounding_arcsec` the last digit that would do; `text` the observation in words.
    """

    now_arcsec: float
    rounding_arcsec: float
    text: str


def separating(members: tuple[Candidate, ...], numbers: Numbers, question: Question) -> Separation | None:
    """Return the observation that would tell the members of a class apart, or None where there is nothing to tell."""
    if len(members) < 2:
        return None
    hypotheses = [one.hypothesis for one in members]
    now = predict(numbers, question, hypotheses)
    apart = _apart(now)[:, 0] / ARCSEC
    different = apart[apart > SAME_ARCSEC]
    nearest = float(different.min()) if len(different) else 0.0
    sigma = float(numbers.half_y[0]) * 3600.0
    rounding = max(2.0 * nearest / BEYOND, 0.0)
    parts = []
    if question.is_body or (question.moment is not None):
        text, gap = _another_date(hypotheses, numbers, question)
    else:
        text, gap = "", 0.0
    if gap > BEYOND * sigma:
        parts.append(text)
    elif not question.is_body:
        text, gap = _another_star(hypotheses, numbers, question)
        if gap > BEYOND * sigma:
            parts.append(text)
    if nearest > 0.0:
        same = len(apart) - len(different)
        rest = f" ({same} of the explanations give the same numbers)" if same else ""
        parts.append(f"a position with its last digit at {_figure(rounding)} or finer, at the same moment{rest}")
    if not parts:
        parts.append("no position of this object: the explanations give the same numbers")
    return Separation(nearest, rounding, "; or ".join(parts))


def _figure(arcsec: float) -> str:
    return f"{arcsec:.1g}″" if arcsec < 1.0 else f"{arcsec:.0f}″"


def _apart(found: Predictions) -> Float:
    """Return angles (h − 1, n), rad, between the first prediction and the others, in the numbers' own space."""
    vectors = cartesian(found.lon, found.lat)
    return separation(vectors[1:], vectors[:1])


def _least(apart: Float) -> Float:
    """Return the least distance (n,) from the first to any explanation that can be told from it at all."""
    ever = apart[apart.max(axis=1) > SAME_ARCSEC]
    return np.asarray(ever.min(axis=0)) if len(ever) else np.zeros(apart.shape[1])


def _same(hypotheses: list[Hypothesis], question: Question) -> list[Hypothesis]:
    """Return the hypotheses of another question that have the same keys."""
    other = {one.key: one for one in plan(question)}
    return [other[one.key] for one in hypotheses if one.key in other]


def _another_date(hypotheses: list[Hypothesis], numbers: Numbers, question: Question) -> tuple[str, float]:
    assert question.moment is not None
    first = question.moment[0]
    days = np.linspace(10.0, YEARS_AHEAD * 365.25, SAMPLES)
    reference = question.reference
    if isinstance(reference, Stars) and len(reference.place) > 1:
        return "", 0.0
    try:
        later = question.at(first.shifted(days))
        same = _same(hypotheses, later)
    except (SpanError, MomentError):
        return "", 0.0
    if len(same) < len(hypotheses):
        return "", 0.0
    many = Numbers.of(np.zeros(SAMPLES), 0.0, 1.0, 1.0)
    try:
        gap = _least(_apart(predict(many, later, same)) / ARCSEC)
    except SpanError:
        return "", 0.0
    at = int(np.argmax(gap))
    when = str(later.moment[at].text()) if later.moment is not None else ""
    return f"the same rounding on {when[:10]} ({gap[at]:.3g}″ apart)", float(gap[at])


def _another_star(hypotheses: list[Hypothesis], numbers: Numbers, question: Question) -> tuple[str, float]:
    lon = np.linspace(0.0, 345.0, 24)
    grid_lon, grid_lat = (part.ravel() for part in np.meshgrid(lon, np.array([-60.0, -30.0, 0.0, 30.0, 60.0])))
    points = Stars.point(grid_lon, grid_lat)
    other = Question(points, None if question.moment is None else question.moment[0], question.site, question.claim)
    same = _same(hypotheses, other)
    if len(same) < len(hypotheses):
        return "", 0.0
    many = Numbers.of(np.zeros(len(grid_lon)), 0.0, 1.0, 1.0)
    gap = _least(_apart(predict(many, other, same)) / ARCSEC)
    at = int(np.argmax(gap))
    text = f"a star near {grid_lon[at] / 15.0:.0f}h {grid_lat[at]:+.0f}° at the same rounding ({gap[at]:.3g}″ apart)"
    return text.replace("-", "−"), float(gap[at])


def position_of(hypothesis: Hypothesis, numbers: Numbers, at: int = 0) -> tuple[float, float]:
    """Return longitude and latitude in degrees that the digits mean under a hypothesis, on its own axes."""
    read = hypothesis.reading.apply(numbers)
    return float(read.lon[at] / DEG % 360.0), float(read.lat[at] / DEG)

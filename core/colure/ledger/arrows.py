"""Arrows on a chart, one for each step of a ledger: all from the direction itself, enlarged by one stated factor."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colure.angles import format_number
from colure.arrays import ARCSEC, Float, dot, norm
from colure.ledger.entries import Entry, Ledger
from colure.marks import Scene

GOAL_PX, MOST_PX, LEAST_PX = 150.0, 320.0, 2.0
"""Length of the step that sets the factor; beyond and below the others an arrow is not laid. Less on a small map."""
TINY = 10.0 * ARCSEC
"""Angle by which directions on the page and the scale there are found."""
MOST_FACTOR = 1e8


@dataclass(frozen=True, slots=True)
class Arrow:
    """One arrow, logical pixels from the foot; `number` is its step's in the ledger, from 1."""

    number: int
    step: str
    dx: float
    dy: float
    is_turn: bool


@dataclass(frozen=True, slots=True)
class Arrows:
    """The arrows of a ledger on a scene: their foot, the factor, and the numbers of steps too long and too short."""

    x: float
    y: float
    factor: float
    drawn: tuple[Arrow, ...] = ()
    long: tuple[int, ...] = ()
    short: tuple[int, ...] = ()

    @property
    def text(self) -> str:
        """The factor, as it stands on the chart."""
        return f"steps × {format_number(self.factor, 0)}"


def nice(factor: float) -> float:
    """Return the largest of 1, 2, 5, 10, 20 … that is not above a factor; 1 at least, MOST_FACTOR at most."""
    if not factor > 1.0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(factor) + 1e-9)
    part = next(part for part in (5.0, 2.0, 1.0) if part * power <= factor * (1.0 + 1e-6) or part == 1.0)
    return float(min(part * power, MOST_FACTOR))


def lay(
    found: Ledger, direction: Float, scene: Scene, *, chosen: str | None = None, factor: float | None = None
) -> Arrows | None:
    """Return the arrows of a ledger about a direction (3,), ICRS axes, on a scene; None where that is off the map.

    Without a factor the chosen step is given a good length; with none chosen, the factor shows as many steps as it can.
    """
    x, y = (float(v) for v in scene.projector.project(direction))
    left, top, right, bottom = scene.frame
    if not (math.isfinite(x) and math.isfinite(y) and left <= x <= right and top <= y <= bottom):
        return None
    rows = [(number, one) for number, one in enumerate(found.entries, 1) if one.size_arcsec > 0.0 and not one.omitted]
    if not rows:
        return Arrows(x, y, 1.0 if factor is None else factor)
    size = np.array([one.size_arcsec for _, one in rows]) * ARCSEC
    tangent = carried(np.array([one.arrow for _, one in rows]), direction)
    ends = np.asarray(scene.projector.project(direction * math.cos(TINY) + tangent * math.sin(TINY)), dtype=np.float64)
    # A straight arrow on the page, as long as the map's scale at the foot makes the step.
    moves = (ends - np.array([x, y])) / TINY * size[:, None]
    pixels = np.hypot(moves[:, 0], moves[:, 1])
    room = min(right - left, bottom - top)
    most, goal = min(MOST_PX, 0.4 * room), min(GOAL_PX, 0.25 * room)
    if factor is None:
        factor = _factor([one for _, one in rows], pixels, chosen, goal, most)
    drawn, long, short = [], [], []
    for (number, one), move, length in zip(rows, moves * factor, pixels * factor, strict=True):
        if not length >= LEAST_PX:
            short.append(number)
        elif length > most:
            long.append(number)
        else:
            drawn.append(Arrow(number, one.step, float(move[0]), float(move[1]), one.is_turn))
    return Arrows(x, y, factor, tuple(drawn), tuple(long), tuple(short))


def _factor(entries: Sequence[Entry], pixels: Float, chosen: str | None, goal: float, most: float) -> float:
    """Return the factor that gives the chosen step a good length, or else the one with which most steps are seen."""
    mine = [at for at, one in enumerate(entries) if one.step == chosen]
    longest = [float(pixels[at]) for at in mine or range(len(entries)) if pixels[at] > 0.0]
    if not longest:
        return 1.0

    def seen(length: float) -> int:
        factor = nice(goal / length)
        return int(((pixels * factor >= LEAST_PX) & (pixels * factor <= most)).sum())

    return nice(goal / max(sorted(longest, reverse=True), key=seen))


def carried(arrows: Float, direction: Float) -> Float:
    """Return unit tangents (n, 3) at a direction (3,) that bear as arrows (n, 2, 3) do at their own feet.

    Each is carried along the great circle from its foot; zero where an arrow has no length.
    """
    foot, tip = arrows[:, 0], arrows[:, 1]
    along = (tip - foot) - dot(tip - foot, foot)[:, None] * foot
    axis = np.cross(foot, direction)
    cosine = dot(foot, direction)
    moved = along * cosine[:, None] + np.cross(axis, along)
    moved += axis * (dot(axis, along) / np.maximum(1.0 + cosine, 1e-9))[:, None]
    length = norm(moved)
    return np.asarray(moved / np.where(length > 0.0, length, 1.0)[:, None])

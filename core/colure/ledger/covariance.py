"""Carry a covariance given with a position through the steps, by the path's own answer to small changes."""

import math
from collections.abc import Sequence

import numpy as np

from colure.arrays import ARCSEC, Float
from colure.ledger.entries import Stage
from colure.ledger.given import Source
from colure.ledger.turns import Turn
from colure.reduction import StarContext, apply_context


def spreads(given: Source, contexts: Sequence[StarContext]) -> list[Float] | None:
    """Return where the changed positions (2n, 3) are after every context; None without a covariance."""
    if given.spread is None:
        return None
    pos, vel, parallax = given.spread
    moves = None if given.velocity is None else vel
    far = None if given.parallax is None else parallax
    return [np.asarray(apply_context(context, pos, moves, far)) for context in contexts]


def turned(vectors: Float, chain: Sequence[Turn]) -> Float:
    """Return vectors (n, 3) after several turns."""
    for turn in chain:
        vectors = turn.apply(vectors)
    return vectors


def carried(given: Source, centre: Float, ends: Float) -> Float | None:
    """Return the covariance (2, 2), arcsec², of Δlon cos lat and Δlat at a direction (3,).

    `ends` (2n, 3) are where the position goes when each of its n quantities is a step more and a step less.
    """
    if given.covariance is None or given.steps is None:
        return None
    x, y = float(centre[0]), float(centre[1])
    flat = math.hypot(x, y)
    east = np.array([-y / flat, x / flat, 0.0]) if flat > 0.0 else np.array([0.0, 1.0, 0.0])
    north = np.cross(centre, east)
    change = (ends[0::2] - ends[1::2]) / (2.0 * given.steps[:, None])
    slope = np.stack([change @ east, change @ north])
    return np.asarray(slope @ given.covariance @ slope.T / ARCSEC**2)


def major(covariance: Float) -> float:
    """Return the longer semi-axis of the 1σ ellipse, arcsec."""
    return math.sqrt(max(float(np.linalg.eigvalsh(covariance).max()), 0.0))


def first(stages: Sequence[Stage]) -> float | None:
    """Return the longer semi-axis of the first covariance on the way, arcsec; None where none was given."""
    return next((major(stage.covariance) for stage in stages if stage.covariance is not None), None)

"""A table of nutation over 1550 to 2650: quintic spline coefficients, one a day, read row by row from a mapped file."""

from functools import cache

import erfa
import numpy as np
from numpy.typing import NDArray

from colure import resources
from colure.arrays import MAS, Float
from colure.errors import ResourceError

FIRST_JD = 2287184.5
"""TT of the first day that the table serves (1549-12-21)."""
DAYS = 401798
"""Rows: those of the span up to JD 2688976.5 and the neighbours that a spline of degree five needs."""
UNIT = 1e-3 * MAS


@cache
def _table() -> NDArray[np.int32]:
    table: NDArray[np.int32] = resources.load_array("nutation/nutation.npy")
    if table.shape != (DAYS, 2) or table.dtype != np.dtype("<i4"):
        raise ResourceError(f"data file 'nutation/nutation.npy': shape {table.shape}, expected ({DAYS}, 2)")
    return table


def interpolate(jd1: Float | float, jd2: Float | float) -> tuple[Float, Float]:
    """Return Δψ and Δε (*shape), rad, for a two-part TT; to 0.005 mas, and by the series itself outside the table."""
    days = np.asarray((np.asarray(jd1, dtype=np.float64) - FIRST_JD) + np.asarray(jd2, dtype=np.float64))
    inside = (days >= 0.0) & (days < DAYS - 6)
    if inside.all():
        return evaluate(_table(), days)
    dpsi, deps = np.empty(days.shape), np.empty(days.shape)
    if inside.any():
        dpsi[inside], deps[inside] = evaluate(_table(), days[inside])
    dpsi[~inside], deps[~inside] = erfa.nut06a(FIRST_JD, days[~inside])
    return dpsi, deps


def evaluate(table: NDArray[np.int32], days: Float) -> tuple[Float, Float]:
    """Return Δψ and Δε (*shape), rad, from coefficients (rows, 2); `days` counts from FIRST_JD.

    Row k belongs to day k − 2, so the six rows that shape day d begin at row d.
    """
    shape = days.shape
    days = days.reshape(-1)
    first = days.astype(np.int64)
    u = days - first
    # Both angles of a row in one 8-byte word: one gather instead of two.
    words = table.view(np.int64)[:, 0]
    dpsi, deps = np.zeros(days.shape), np.zeros(days.shape)
    for k, weight in enumerate(_weights(u)):
        pair = words[first + k].view(np.int32)
        dpsi += weight * pair[0::2]
        deps += weight * pair[1::2]
    return (dpsi * UNIT).reshape(shape), (deps * UNIT).reshape(shape)


def _weights(u: Float) -> tuple[Float, ...]:
    """Return the six values of the quintic cardinal B-spline at fraction `u` of a step."""
    v = 1.0 - u
    u2, v2 = u * u, v * v
    a, b = u2 * u2 * u, v2 * v2 * v
    # The inner pieces in powers of the distance from their own end, as the pieces mirror one another.
    return (
        b / 120.0,
        (26.0 - u * (50.0 - u * (20.0 + u * (20.0 - u * (20.0 - 5.0 * u))))) / 120.0,
        (66.0 - u2 * (60.0 - u2 * (30.0 - 10.0 * u))) / 120.0,
        (66.0 - v2 * (60.0 - v2 * (30.0 - 10.0 * v))) / 120.0,
        (26.0 - v * (50.0 - v * (20.0 + v * (20.0 - v * (20.0 - 5.0 * v))))) / 120.0,
        a / 120.0,
    )

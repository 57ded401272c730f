"""A table of nutation: quintic spline coefficients in whole tenths of a microarcsecond, read by row."""

import erfa
import numpy as np

from colure.arrays import Float


def interpolate(jd1: Float | float, jd2: Float | float) -> tuple[Float, Float]:
    """Return Δψ and Δε (*shape), rad."""
    dpsi, deps = erfa.nut06a(jd1, jd2)
    return np.asarray(dpsi), np.asarray(deps)

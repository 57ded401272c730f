"""How far a geocentric direction of a body may be wrong: fit, knowledge of the orbit, and centre of the system."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from colure.arrays import ARCSEC, Float

J2000 = 2451545.0
DE440_YEARS = 450.0
"""Years from J2000 to the nearer end of DE440, where the two ephemerides are compared."""

SEAM_ARCSEC = {
    "sun": 0.01,
    "mercury": 0.02,
    "venus": 0.02,
    "emb": 0.01,
    "earth": 0.0,
    "mars": 0.02,
    "jupiter": 0.2,
    "saturn": 0.2,
    "uranus": 3.1,
    "neptune": 0.5,
    "pluto": 0.6,
    "moon": 2.2,
}
CENTRE_AU = {"jupiter": 0.08 * 4.2 * ARCSEC, "saturn": 0.05 * 8.5 * ARCSEC, "pluto": 0.1 * 30.0 * ARCSEC}


def bound(bodies: Sequence[str], jd: ArrayLike, distance: ArrayLike, fit: ArrayLike = 0.0) -> Float:
    """Return bounds (bodies, *shape) in arcsec on the error of a geocentric direction."""
    jd = np.asarray(jd, dtype=np.float64)
    far = np.abs(jd - J2000) / 365.25 / DE440_YEARS
    out = np.empty((len(bodies), *jd.shape))
    distance = np.broadcast_to(np.asarray(distance, dtype=np.float64), out.shape)
    for row, body in enumerate(bodies):
        growth = far * far if body == "moon" else far
        out[row] = SEAM_ARCSEC[body] * growth + CENTRE_AU.get(body, 0.0) / distance[row] / ARCSEC
    return np.asarray(out + fit)

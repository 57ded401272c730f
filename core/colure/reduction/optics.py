"""What bends a direction on its way: the Sun's gravity, the observer's motion, the air.

Vectors here are stored component first, `(3, ...)`: each component is one run of memory, which is what makes these
few operations cheap for a hundred thousand directions. Formulas are those of the IAU's ERFA library (ld, ab), held to
it in the tests; the deflection takes the finite distance of the source into account.
"""

import numpy as np

from colure import refraction
from colure.arrays import Float
from colure.reduction.observer import C_AU_DAY

SCHWARZSCHILD_AU = 1.97412574336e-8
"""Schwarzschild radius of the Sun, au."""
DEFLECTION_LIMIT = 1e-6
"""Least 1 + q·e that is used (times 1/em² beyond 1 au), as in ERFA: 290″ from the Sun's centre, well behind its disc.
A direction that close is hidden, and is bent no more than there."""
FAR_AU = 1e-3
"""Observers nearer to the Sun's centre than this (its own, or the barycentre's at times) see no deflection."""


def dot3(a: Float, b: Float) -> Float:
    """Return the scalar product over the first dimension."""
    return np.asarray(np.einsum("i...,i...->...", a, b))


def deflected(direction: Float, source_from_sun: Float, observer_from_sun: Float) -> Float:
    """Return unit directions (3, ...) bent by the Sun.

    `direction` is the unit vector from the observer to the source, the others are vectors in au from the Sun. The
    bend is (2GM/c²) / em × [e (p·q) − q (e·p)] / (1 + q·e), with e, q towards observer and source.
    """
    em2 = dot3(observer_from_sun, observer_from_sun)
    em = np.sqrt(em2)
    q2 = dot3(source_from_sun, source_from_sun)
    # Work with q·|q| to save the division of three components.
    q = np.sqrt(q2)
    usable = (em > FAR_AU) & (q > 0.0)
    inv_em = 1.0 / np.where(usable, em, 1.0)
    inv_q = 1.0 / np.where(usable, q, 1.0)
    qe = dot3(source_from_sun, observer_from_sun) * (inv_q * inv_em)
    limit = DEFLECTION_LIMIT / np.maximum(em2, 1.0)
    weight = np.where(usable, SCHWARZSCHILD_AU * inv_em / np.maximum(1.0 + qe, limit), 0.0)
    along_e = weight * dot3(direction, source_from_sun) * (inv_q * inv_em)
    along_q = weight * dot3(direction, observer_from_sun) * (inv_q * inv_em)
    bent = direction + along_e * observer_from_sun - along_q * source_from_sun
    return np.asarray(bent)


def aberrated(direction: Float, velocity: Float, sun_distance: Float) -> Float:
    """Return unit directions (3, ...) as seen by an observer moving at `velocity` (3, ...) in au/day.

    Special relativity, with the Sun's potential at the observer (sun_distance in au) as in ERFA.
    """
    v = velocity / C_AU_DAY
    v2 = dot3(v, v)
    inverse_gamma = np.sqrt(1.0 - v2)
    along = dot3(direction, v)
    potential = np.where(sun_distance > FAR_AU, SCHWARZSCHILD_AU / np.maximum(sun_distance, FAR_AU), 0.0)
    w1 = 1.0 + along / (1.0 + inverse_gamma)
    scale = 1.0 / (1.0 + along)
    return np.asarray(((inverse_gamma - potential * along) * scale) * direction + ((w1 + potential) * scale) * v)


def refracted(direction: Float, zenith: Float, air: refraction.Atmosphere, *, exact: bool = True) -> Float:
    """Return unit directions (3, ...) lifted towards `zenith` (3, ...) by the standard refraction."""
    sine = np.clip(dot3(direction, zenith), -1.0, 1.0)
    flat = direction - sine * zenith
    cosine = np.sqrt(dot3(flat, flat))
    true = np.arctan2(sine, cosine)
    apparent = refraction.apparent_altitude(true, air, exact=exact)
    stretch = np.cos(apparent) / np.where(cosine > 0.0, cosine, 1.0)
    return np.asarray(flat * stretch + np.sin(apparent) * zenith)


def normalised(vectors: Float) -> Float:
    """Return vectors (3, ...) divided by their lengths."""
    return np.asarray(vectors / np.sqrt(dot3(vectors, vectors)))

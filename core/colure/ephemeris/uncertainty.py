"""How far a geocentric direction may be wrong: error of the fit, knowledge of the orbit, centre of the system.

- Fit: the largest error in position found against the source when the tables were built, of the body and of the
  Earth, over the distance.
- Knowledge: DE440 and DE422 differ by an angle that grows from the present. Its size at present and its growth are
  the least that cover their difference at every date that both have (1550 to 2650), and the growth is taken to hold
  on. It goes with the square of the time where that is what the two show (Sun, Mercury, Venus, Moon), otherwise with
  the time.
- Centre: Mars to Pluto are the barycentres of their systems. The planet is off it by Σ mass ratio × distance of its
  satellites at most.

ΔT is not in it: it belongs to the conversion of time, not to the ephemeris.
"""

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from colure.arrays import ARCSEC, Float
from colure.ephemeris.protocol import KM_PER_AU
from colure.ephemeris.tables import index

J2000 = 2451545.0
CENTURY = 36525.0

# Mass ratios and distances of the satellites from memory, rounded up: Jupiter's four 20 + 17 + 84 + 108 km;
# Titan 290, Iapetus 12, Rhea 3; Titania 18, Oberon 20, Ariel and Umbriel 7; Triton 75; Charon 2140.
CENTRE_KM = {"mars": 0.01, "jupiter": 232.0, "saturn": 308.0, "uranus": 48.0, "neptune": 76.0, "pluto": 2145.0}
"""Greatest distance of a planet from the barycentre of its system in km: 0.08″ at Jupiter, 0.05″ at Saturn, 0.1″ at
Pluto when nearest."""

NEAREST_AU = {
    "sun": 0.983,
    "mercury": 0.53,
    "venus": 0.26,
    "emb": 0.98,
    "earth": 0.98,
    "mars": 0.37,
    "jupiter": 3.9,
    "saturn": 7.9,
    "uranus": 17.2,
    "neptune": 28.7,
    "pluto": 28.5,
    "moon": 0.00238,
}
"""Least distance from the Earth within the span; for the Earth itself and the Earth-Moon barycentre from the Sun."""


def knowledge_arcsec(body: str, jd: Float) -> Float:
    """Return how far two good ephemerides may differ in the direction of a body at a Julian date, in arcsec.

    The Earth and the Earth-Moon barycentre are judged by the direction of the Sun.
    """
    entry = index()["knowledge"]["sun" if body in ("earth", "emb") else body]
    centuries = np.abs(jd - J2000) / CENTURY
    return np.asarray(entry["arcsec"] + entry["growth"] * centuries ** entry["power"])


def fit_au(body: str, jd: Float) -> Float:
    """Return the error of the tables in the position of a body from the Earth, in au."""
    known = index()
    (first, _), (_, last) = known["blend"]
    modern = (jd > first) & (jd < last)
    names = {"moon": ("moon",), "earth": ("emb",), "emb": ("emb",)}.get(body, (body, "emb"))
    errors = [sum(float(known["bodies"][name]["error_au"][era]) for name in names) for era in (0, 1)]
    return np.where(modern, errors[0], errors[1])


def bound(bodies: Sequence[str], jd: ArrayLike, distance: ArrayLike | None = None, *, fitted: bool = False) -> Float:
    """Return bounds (bodies, *shape) in arcsec on the error of a geocentric direction.

    `distance` in au is a scalar or (bodies, *shape); None takes the least that each body can have. `fitted` adds
    the error of the embedded tables.
    """
    jd = np.asarray(jd, dtype=np.float64)
    out = np.empty((len(bodies), *jd.shape))
    given = None if distance is None else np.broadcast_to(np.asarray(distance, dtype=np.float64), out.shape)
    for row, body in enumerate(bodies):
        far = NEAREST_AU[body] if given is None else given[row]
        offset = CENTRE_KM.get(body, 0.0) / KM_PER_AU + (fit_au(body, jd) if fitted else 0.0)
        out[row] = knowledge_arcsec(body, jd) + offset / far / ARCSEC
    return out

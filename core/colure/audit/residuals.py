"""How far numbers lie from what is claimed: on the equator, on the ecliptic, and along a body's motion."""

from dataclasses import dataclass

import numpy as np

from colure import frames
from colure.arrays import ARCSEC, DEG, Float, cartesian, norm, separation, unit
from colure.audit.hypotheses import bases
from colure.audit.numbers import Numbers
from colure.audit.reference import Question
from colure.audit.sights import Sky

FARTHEST = 10.0 * DEG
"""Beyond this an offset has no useful components."""
STEP_DAYS = 0.01


@dataclass(frozen=True, slots=True)
class Residual:
    """The first position minus what is claimed, arcsec: the distance, and components where it is below 10°, else NaN.

    `ra`, `dec`: ICRS, the first times cos δ; `lon`, `lat`: mean ecliptic J2000, the first times cos β; `along`,
    `across`: the body's motion and 90° left of it, seen from inside; NaN for a star.
    """

    frame: str
    place: str
    distance: float
    ra: float
    dec: float
    lon: float
    lat: float
    along: float
    across: float


def from_claim(numbers: Numbers, question: Question) -> Residual | None:
    """Return the residual of the first position from the claim (ICRS astrometric where none is made).

    None where a coordinate is not known, or the latitude is none.
    """
    lon, lat = float(numbers.x[0]), float(numbers.y[0])
    if not (np.isfinite(lon) and abs(lat) <= 90.0):
        return None
    axes, place = bases(question)[0]
    moment = None if question.moment is None else question.moment[:1]
    given = cartesian(np.array([lon * DEG]), np.array([lat * DEG]))
    assert axes.frame is not None  # a claim is always a frame with a name
    seen = frames.to_icrs(given, axes.frame, moment if axes.of_date else None)
    asked = question if moment is None else question.at(moment)
    true = Sky(asked)["refracted" if place == "observed" else place][:1]
    distance = float(separation(seen, true)[0])
    nothing = np.full(2, np.nan)
    equator = ecliptic = motion = nothing
    if distance < FARTHEST:
        equator = _components(seen - true, true)
        matrix = frames.rotation("ecliptic/mean/J2000").matrix
        ecliptic = _components((seen - true) @ matrix.T, true @ matrix.T)
        if question.is_body and moment is not None:
            ahead = Sky(question.at(moment.shifted(np.array([STEP_DAYS]))))["astrometric"]
            behind = Sky(question.at(moment.shifted(np.array([-STEP_DAYS]))))["astrometric"]
            towards = unit(ahead - behind)
            left = np.cross(true, towards)
            off = seen - true
            motion = np.array([float((off * towards).sum()), float((off * left).sum() / norm(left)[0])]) / ARCSEC
    return Residual(axes.frame, place, distance / ARCSEC, *map(float, (*equator, *ecliptic, *motion)))


def _components(off: Float, place: Float) -> Float:
    """Return the components east and north (2,), arcsec, of a small vector (1, 3) at a place (1, 3)."""
    x, y, z = place[0]
    rho = float(np.hypot(x, y))
    east = np.array([-y, x, 0.0]) / rho
    north = np.array([-x * z, -y * z, rho * rho]) / rho
    return np.array([float(off[0] @ east), float(off[0] @ north)]) / ARCSEC

"""The names of the steps of a reduction that can be left out, as sessions and the ledger spell them."""

from collections.abc import Iterable

from colure.errors import ColureError, near_names

SKY_STEPS = (
    "space motion",
    "annual parallax",
    "diurnal parallax",
    "light time",
    "deflection",
    "annual aberration",
    "diurnal aberration",
    "refraction",
)
"""What happens to a direction on its way to the observer, in order."""

BIAS, EQUATOR, ECLIPTIC, NUTATION = (
    "frame bias",
    "precession of the equator",
    "precession of the ecliptic",
    "nutation",
)
EARTH_ROTATION, POLAR_MOTION, E_TERMS, FK4_PRECESSION = "Earth rotation", "polar motion", "E-terms", "precession"
TURN_STEPS = (BIAS, EQUATOR, ECLIPTIC, FK4_PRECESSION, NUTATION, E_TERMS, EARTH_ROTATION, POLAR_MOTION)
"""The turns of the axes that can be left out; a change of plane or of origin cannot."""

STEPS = (*SKY_STEPS, *TURN_STEPS)


def checked(names: Iterable[str]) -> frozenset[str]:
    """Return the steps to leave out as a set; raise ColureError for a name that is none."""
    found = tuple(names)
    for name in found:
        if name not in STEPS:
            raise ColureError(f"step '{name}': cannot be left out{near_names(name, STEPS)}; known: {', '.join(STEPS)}")
    return frozenset(found)

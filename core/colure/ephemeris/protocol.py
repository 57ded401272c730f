"""What an ephemeris is: the bodies it knows, the calls it answers and how it refuses a moment outside its span."""

from collections.abc import Sequence
from typing import Protocol, TypeAlias

import numpy as np
from numpy.typing import ArrayLike

from colure.arrays import Bool, Float
from colure.errors import BodyError, EphemerisSpanError, near_names

BODIES = (
    "sun",
    "mercury",
    "venus",
    "emb",
    "mars",
    "jupiter",
    "saturn",
    "uranus",
    "neptune",
    "pluto",
    "moon",
    "earth",
)
"""Every body an ephemeris may be asked for. `mars` to `pluto` are the barycentres of their systems of satellites,
which is what the fundamental ephemerides integrate; the planet itself is at most 0.1″ away (Jupiter 0.08″)."""

SYSTEM_BARYCENTRES = ("mars", "jupiter", "saturn", "uranus", "neptune", "pluto")
"""The bodies whose position is that of the whole planetary system's barycentre."""

KM_PER_AU = 149597870.700
"""IAU 2012 resolution B2: exact."""

Days: TypeAlias = Float | float


class Ephemeris(Protocol):
    """Barycentric positions and velocities of `BODIES` on ICRS axes, at TDB."""

    @property
    def name(self) -> str:
        """What to call it in an answer."""
        ...

    @property
    def span(self) -> tuple[float, float]:
        """First and last Julian date (TDB) that is covered."""
        ...

    def posvel(self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, *, each: bool = False) -> tuple[Float, Float]:
        """Return positions in au and velocities in au/day, both (bodies, *shape, 3), barycentric, ICRS axes.

        `tdb1 + tdb2` is the Julian date in TDB, of any shape. With `each` the first dimension of the dates runs over
        the bodies (every body at a moment of its own, as for light time) and `shape` is what is left.
        """
        ...

    def position(self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, *, each: bool = False) -> Float:
        """Return the positions of `posvel` alone, in less time."""
        ...

    def source(self, tdb: float) -> str:
        """Return the name of what the answer at this Julian date rests on."""
        ...

    def uncertainty_arcsec(
        self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, distance: ArrayLike | None = None
    ) -> Float:
        """Return bounds (bodies, *shape) on the error of a geocentric direction in seconds of arc.

        `distance` is that of the body in au, (bodies, *shape) or a scalar; None takes the least it can be.
        """
        ...


def check_bodies(bodies: Sequence[str], known: Sequence[str], name: str) -> None:
    """Raise BodyError for the first body that `known` lacks."""
    for body in bodies:
        if body in known:
            continue
        if body in BODIES:
            raise BodyError(f"ephemeris {name}: body '{body}' is not in it; it holds {', '.join(known)}")
        raise BodyError(f"body '{body}': not known{near_names(body, BODIES)}; expected one of {', '.join(BODIES)}")


def check_each(shape: tuple[int, ...], bodies: Sequence[str]) -> None:
    """Raise BodyError unless the first dimension of dates given for each body runs over the bodies."""
    if not shape or shape[0] != len(bodies):
        raise BodyError(f"dates for each of {len(bodies)} bodies: their shape is {shape}, expected ({len(bodies)}, …)")


def years(span: tuple[float, float]) -> str:
    """Return a span of Julian dates as plain years of astronomical numbering, such as `"-2999.0 to 3000.1"`."""
    # Rounded inwards, so that every year printed is covered.
    first = np.ceil((2000.0 + (span[0] - 2451545.0) / 365.25) * 10.0) / 10.0
    last = np.floor((2000.0 + (span[1] - 2451545.0) / 365.25) * 10.0) / 10.0
    return f"{first:.1f} to {last:.1f}".replace("-", "−")


def check_span(jd: Float, span: tuple[float, float], name: str) -> None:
    """Raise EphemerisSpanError, with the mask of the offenders, unless every Julian date lies in `span`."""
    # Written so that NaN counts as outside; the two reductions cost less than a mask in the usual case.
    if jd.size == 0 or (jd.min() >= span[0] and jd.max() <= span[1]):
        return
    mask: Bool = ~((jd >= span[0]) & (jd <= span[1]))
    first = float(np.asarray(jd)[mask].flat[0])
    if np.isfinite(first):
        year = f"{2000.0 + (first - 2451545.0) / 365.25:.1f}".replace("-", "−")
        which = f"JD {first:.1f} TDB (year {year})"
    else:
        which = f"JD {first}"
    many = "" if mask.size == 1 else f" and {int(mask.sum()) - 1} more of {mask.size} moments"
    raise EphemerisSpanError(
        f"ephemeris {name}: {which}{many} outside its span; it covers the years {years(span)}", mask
    )

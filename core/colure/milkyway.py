"""The Milky Way as lines of equal density of stars, traced from the shipped catalogue's own counts."""

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from colure import resources
from colure.arrays import DEG, Float, cartesian
from colure.errors import ResourceError

OUTSIDE = cartesian(192.85948 * DEG, 27.12825 * DEG)
"""The north galactic pole on ICRS axes (ESA SP-1200, vol. 1, eq. 1.5.10): outside every line."""


@dataclass(frozen=True, slots=True, eq=False)
class Outline:
    """One level: all its rings, which together bound one area under the even-odd rule.

    `level` runs from 1, the faintest. `points` (N, 3) are unit vectors on ICRS axes; ring k is
    `points[starts[k]:starts[k + 1]]`, its first point not repeated. Seen from outside the sphere, the denser side lies
    to the left of the way along a ring: p × q points into it. Each level lies within the one before, but for the small
    islands and holes that are left out. `outside` (3,) is a direction that lies in none.
    """

    level: int
    points: Float
    starts: NDArray[np.int32]
    outside: Float


@cache
def outlines() -> tuple[Outline, ...]:
    """Return the levels, the faintest and widest first; the arrays are read-only."""
    points = np.asarray(resources.load_array("milkyway/points.npy"), dtype=np.float64)
    rings = np.asarray(resources.load_array("milkyway/rings.npy"))
    if points.ndim != 2 or points.shape[1] != 3 or rings.ndim != 2 or rings.shape[1] != 2 or not len(rings):
        raise ResourceError(
            f"data file 'milkyway/rings.npy': shapes {points.shape} and {rings.shape}, expected (n, 3) and (m, 2); "
            "run 'colure selfcheck'"
        )
    bounds = np.append(rings[:, 0], len(points))
    if bounds[0] != 0 or np.any(np.diff(bounds) < 3):
        raise ResourceError("data file 'milkyway/rings.npy': a ring has fewer than 3 points; run 'colure selfcheck'")
    found = []
    for level in sorted(set(rings[:, 1].tolist())):
        mine = np.flatnonzero(rings[:, 1] == level)
        first, last = bounds[mine[0]], bounds[mine[-1] + 1]
        starts = (np.append(bounds[mine], last) - first).astype(np.int32)
        part = points[first:last]
        part.flags.writeable = starts.flags.writeable = False
        found.append(Outline(level, part, starts, OUTSIDE))
    return tuple(found)

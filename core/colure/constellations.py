"""The 88 IAU constellations: which one holds a direction, their edges for drawing, names, areas and label points.

The boundaries are whole seconds of right ascension and whole minutes of declination at the mean equator and equinox
of B1875.0 (Delporte 1930), taken from Roman's table of zones (1987, PASP 99, 695, CDS VI/42), whose four decimals are
rounded back. Between ICRS and B1875 stands the IAU 1976 precession without E-terms, as in the boundary files that the
IAU publishes for J2000 (Davenhall & Leggett 1989, CDS VI/49): seven of their vertices come back to the round figures
within 0.25″, and within 0.07″ of the five-decimal hours that those files started from, against 0.6″ for
Newcomb's and for the IAU 2006 precession. The 0.02″ between ICRS and FK5 axes is neglected.
"""

from functools import cache
from typing import NamedTuple

import erfa
import numpy as np
from numpy.typing import NDArray

from colure import resources
from colure.arrays import DEG, TWO_PI, Float, cartesian
from colure.errors import TargetError, near_names

B1875_JD = 2405889.25855
"""TT Julian date of the Besselian epoch 1875.0, the equinox of the boundaries."""
_DAY_S = 86400
_POLE_MIN = 5400
_PER_SECOND = TWO_PI / _DAY_S
_PER_MINUTE = np.pi / 10800.0
_NOWHERE = 88
_ALL_SKY_STEP_DEG = 1.0


@cache
def b1875_matrix() -> Float:
    """Return the read-only matrix (3, 3) from ICRS axes to the mean equator and equinox of B1875.0."""
    matrix = np.array(erfa.pmat76(B1875_JD, 0.0))
    matrix.flags.writeable = False
    return matrix


class Constellation(NamedTuple):
    """One of the 88: the abbreviation of the IAU, its Latin name and genitive, and its area in square degrees."""

    code: str
    name: str
    genitive: str
    area_deg2: float


class Edges(NamedTuple):
    """Boundary arcs, each between two constellations.

    `points` (n, 3) are unit vectors on ICRS axes, read-only; arc i is `points[starts[i]:starts[i + 1]]`, with
    `starts` (m + 1,); `pairs` (m, 2) are the abbreviations on its two sides: south and north of an arc of parallel,
    smaller and greater right ascension beside an arc of meridian; `parallel` (m,) tells the two kinds apart.
    """

    points: Float
    starts: NDArray[np.int32]
    pairs: NDArray[np.str_]
    parallel: NDArray[np.bool_]


class Anchors(NamedTuple):
    """Where a constellation's name fits best: the point farthest from the border, once for each of the 89 regions.

    `codes` (89,), `points` (89, 3) unit vectors on ICRS axes and `radius` (89,), the distance to the border in
    radians. Serpens has two, the larger first.
    """

    codes: NDArray[np.str_]
    points: Float
    radius: Float


class _Grid(NamedTuple):
    column_of: NDArray[np.intp]  # by whole second of right ascension
    row_start: NDArray[np.intp]  # by whole minute of declination above −90°: where its row begins in `cells`
    cells: NDArray[np.uint8]  # flat, row by row
    codes: NDArray[np.str_]  # 88 and an empty one


@cache
def _grid() -> _Grid:
    columns = resources.load_array("constellations/columns.npy", mmap=False)
    rows = resources.load_array("constellations/rows.npy", mmap=False)
    cells = resources.load_array("constellations/cells.npy", mmap=False)
    # Every boundary is a whole second or a whole minute, so those two whole numbers decide the cell by one look-up
    # each. The last minute is that of the pole itself.
    column_of = np.searchsorted(columns, np.arange(_DAY_S), side="right") - 1
    row_of = np.searchsorted(rows[1:-1], np.arange(-_POLE_MIN, _POLE_MIN + 1), side="right")
    return _Grid(
        column_of=column_of,
        row_start=row_of * cells.shape[1],
        cells=cells.ravel(),
        codes=np.array([*(entry.code for entry in constellations()), ""]),
    )


def indices(vectors_icrs: Float) -> NDArray[np.intp]:
    """Return the places (...) in `constellations()` of directions (..., 3) on ICRS axes, 88 where there is none."""
    grid = _grid()
    v = np.asarray(vectors_icrs, dtype=np.float64) @ b1875_matrix().T
    x, y, z = v[..., 0], v[..., 1], v[..., 2]
    across = np.hypot(x, y)
    size = across + np.abs(z)
    lost = ~((size > 0.0) & (size < np.inf))
    any_lost = bool(lost.any())
    ra, dec = np.arctan2(y, x), np.arctan2(z, across)
    if any_lost:
        ra, dec = np.where(lost, 0.0, ra), np.where(lost, 0.0, dec)
    second = np.floor(ra * (1.0 / _PER_SECOND)).astype(np.intp)
    second += (second < 0) * _DAY_S
    # Counted from the south pole before it is cut to a whole number, so that −90° minus a rounding error stays 0.
    minute = (dec * (1.0 / _PER_MINUTE) + _POLE_MIN).astype(np.intp)
    found = grid.cells[grid.row_start[minute] + grid.column_of[second]].astype(np.intp)
    return np.asarray(np.where(lost, _NOWHERE, found)) if any_lost else np.asarray(found)


def of(vectors_icrs: Float) -> NDArray[np.str_]:
    """Return the three-letter abbreviations (...) of the constellations that hold directions (..., 3) on ICRS axes.

    Vectors may have any length; one that is zero or not finite gives an empty string. Borders are right to 0.3″.
    """
    return np.asarray(_grid().codes[indices(vectors_icrs)])


@cache
def constellations() -> tuple[Constellation, ...]:
    """Return the 88 constellations in the order of their abbreviations."""
    lines = resources.path("constellations/names.tsv").read_text(encoding="utf-8").splitlines()[1:]
    fields = [line.split("\t") for line in lines]
    return tuple(Constellation(f[0], f[1], f[2], float(area)) for f, area in zip(fields, _areas(), strict=True))


def _areas() -> Float:
    """Return the exact solid angles (88,) of the cells of each constellation in square degrees."""
    columns = resources.load_array("constellations/columns.npy", mmap=False)
    rows = resources.load_array("constellations/rows.npy", mmap=False)
    cells = resources.load_array("constellations/cells.npy", mmap=False)
    size = np.outer(np.diff(np.sin(rows * _PER_MINUTE)), np.diff(columns) * _PER_SECOND)
    return np.bincount(cells.ravel(), weights=size.ravel(), minlength=_NOWHERE) / DEG**2


def find(name: str) -> Constellation:
    """Return the constellation with this abbreviation, Latin name or genitive, in any case; raise TargetError."""
    wanted = name.strip().casefold()
    for entry in constellations():
        if wanted in (entry.code.casefold(), entry.name.casefold(), entry.genitive.casefold()):
            return entry
    known = [text for entry in constellations() for text in (entry.name, entry.genitive, entry.code)]
    raise TargetError(
        f"constellation: {name!r} is none of the 88; expected a Latin name or the three-letter abbreviation"
        + near_names(name, known)
    )


@cache
def neighbours(code: str) -> tuple[str, ...]:
    """Return the abbreviations of the constellations that share a border with this one; raise TargetError."""
    wanted = find(code).code
    pairs = edges().pairs
    beside = {str(b if a == wanted else a) for a, b in pairs[(pairs == wanted).any(axis=1)]}
    return tuple(sorted(beside))


@cache
def arcs() -> NDArray[np.int32]:
    """Return the boundary arcs (m, 6) in whole units of B1875: kind, fixed coordinate, start, end, two places.

    Kind 0 is an arc of parallel: a declination in minutes of arc, right ascensions in seconds (an end past 86400 has
    gone through 0h), and the places in `constellations()` of those south and north of it. Kind 1 is an arc of meridian:
    a right ascension in seconds, declinations in minutes, and those at the smaller and the greater right ascension.
    """
    array = resources.load_array("constellations/edges.npy", mmap=False)
    array.flags.writeable = False
    return array


@cache
def edges(step_deg: float = _ALL_SKY_STEP_DEG) -> Edges:
    """Return every boundary arc, sampled at most `step_deg` apart along its own parallel or meridian of B1875.

    At 1° (all-sky charts) a chord leaves an arc of parallel by at most 8″ × tan of its declination, at 0.25° by 0.5″;
    beyond 76° of declination the samples are as far apart in right ascension as there, which keeps it below 32″ and 2″.
    """
    table = arcs()
    kind, fixed, start, end = (table[:, i].astype(np.float64) for i in range(4))
    parallel = kind == 0
    cos_dec = np.maximum(np.cos(fixed * _PER_MINUTE), 0.25)
    length = (end - start) * np.where(parallel, _PER_SECOND * cos_dec, _PER_MINUTE)
    # Rounding must not add a point to an arc that is a whole number of steps long.
    count = np.ceil(length / (step_deg * DEG) - 1e-9).astype(np.int64) + 1
    starts = np.concatenate([[0], np.cumsum(count)])
    arc = np.repeat(np.arange(len(table)), count)
    part = (np.arange(starts[-1]) - starts[arc]) / (count[arc] - 1)
    along = start[arc] + (end - start)[arc] * part
    on_parallel = parallel[arc]
    ra = np.where(on_parallel, along, fixed[arc]) * _PER_SECOND
    dec = np.where(on_parallel, fixed[arc], along) * _PER_MINUTE
    points = cartesian(ra, dec) @ b1875_matrix()
    points.flags.writeable = False
    return Edges(points, starts.astype(np.int32), _grid().codes[table[:, 4:]], parallel)


@cache
def anchors() -> Anchors:
    """Return the label points of the 89 regions, good to about 0.02°."""
    lines = resources.path("constellations/anchors.tsv").read_text(encoding="utf-8").splitlines()[1:]
    fields = [line.split("\t") for line in lines]
    ra, dec, radius = (np.array([float(f[i]) for f in fields]) * DEG for i in (1, 2, 3))
    return Anchors(np.array([f[0] for f in fields]), cartesian(ra, dec) @ b1875_matrix(), radius)

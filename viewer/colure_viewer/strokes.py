"""Turns polylines and symbols into what a fast painter can draw: parallels for weight, dashes, straight strokes."""

from functools import lru_cache
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

F64 = NDArray[np.float64]
C128 = NDArray[np.complex128]

THICKNESS = {1: 0.8, 2: 1.3, 3: 1.8}
"""Thickness of the three weights in logical pixels."""

DASH, DOT = (5.0, 3.5), (1.2, 2.6)
"""Stroke and gap in logical pixels."""

MAX_PIXEL = 1e6
"""Farther points are pulled in: Qt's rasteriser works in 26.6 fixed point and must not overflow."""


@lru_cache(maxsize=64)
def offsets(weight: int, ratio: float) -> tuple[float, ...]:
    """Return where, across the line and in device pixels, lines one pixel wide make up a weight."""
    thickness = max(1.0, THICKNESS[weight] * ratio)
    # Two lines no more than 0.8 pixel apart leave no seam between them.
    count = 1 + int(np.ceil((thickness - 1.0) / 0.8 - 1e-9))
    if count == 1:
        return (0.0,)
    reach = (thickness - 1.0) / 2.0
    return tuple(np.linspace(-reach, reach, count).tolist())


def _plane(points: F64) -> C128:
    """Return points (N, 2) as complex numbers x + iy (N,): their lengths take a seventh of the time of a hypot."""
    return np.ascontiguousarray(points).view(np.complex128)[:, 0]


def normals(points: F64, starts: NDArray[np.int32]) -> F64:
    """Return unit normals (N, 2) at the points of polylines laid out as in colure.marks.Lines."""
    plane = _plane(points)
    step = np.zeros_like(plane)
    np.subtract(plane[1:], plane[:-1], out=step[:-1])
    # The step from the end of one polyline to the start of the next belongs to neither.
    ends = starts[1:][starts[1:] > starts[:-1]] - 1
    step[ends] = 0.0
    along = step.copy()
    along[1:] += step[:-1]
    length = np.abs(along)
    length[length == 0.0] = 1.0
    along *= 1j / length
    return along.view(np.float64).reshape(-1, 2)


def is_level(points: F64, starts: NDArray[np.int32]) -> bool:
    """Return whether every piece of some polylines runs along a row or a column of pixels."""
    step = points[1:] - points[:-1]
    along = (step == 0.0).any(axis=1)
    along[starts[1:-1] - 1] = True
    return bool(along.all())


def boxes(points: F64, starts: NDArray[np.int32], thick: int) -> NDArray[np.int64]:
    """Return the pieces of level polylines as whole boxes of pixels (K, 4): left, top, width, height."""
    whole = np.floor(points).astype(np.int64) - (thick - 1) // 2
    own = np.ones(len(points) - 1, dtype=bool)
    own[starts[1:-1] - 1] = False
    low, high = np.minimum(whole[1:], whole[:-1]), np.maximum(whole[1:], whole[:-1])
    return np.concatenate([low, high - low + thick], axis=1)[own]


def across(xy: F64) -> F64:
    """Return the unit normal of each stroke (N, 4), at both of its ends (N, 4)."""
    plane = np.ascontiguousarray(xy).view(np.complex128)
    along = plane[:, 1] - plane[:, 0]
    along *= 1j / np.maximum(np.abs(along), 1e-9)
    return np.repeat(along, 2).view(np.float64).reshape(-1, 4)


def bridged(points: NDArray[np.floating], starts: NDArray[np.int32]) -> NDArray[np.floating]:
    """Return rings laid out as in colure.marks.Areas as one ring (N, 2) that fills alike under the odd-even rule.

    Each ring is closed and joined to the first point of all, and the joins are run over once more on the way back.
    """
    if len(starts) <= 2:
        return points
    parts = [part for a, b in pairwise(starts.tolist()) for part in (points[a:b], points[a : a + 1])]
    return np.concatenate([*parts, points[starts[-3:0:-1]]])


def dashes(points: F64, starts: NDArray[np.int32], stroke: float, gap: float) -> F64:
    """Return straight strokes (K, 4) of length `stroke` every `stroke + gap` along polylines, measured along each."""
    if len(points) < 2:
        return np.empty((0, 4))
    plane = _plane(points)
    first, last = starts[:-1], starts[1:] - 1
    travelled = np.zeros(len(plane))
    np.abs(plane[1:] - plane[:-1], out=travelled[1:])
    travelled[starts[1:-1][starts[1:-1] < len(plane)]] = 0.0
    np.cumsum(travelled, out=travelled)
    keep = last > first
    begin, end = travelled[first[keep]], travelled[last[keep]]
    period = stroke + gap
    counts = np.maximum(np.ceil((end - begin) / period), 0).astype(np.intp)
    if not counts.sum():
        return np.empty((0, 4))
    which = np.repeat(np.arange(len(counts)), counts)
    order = np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)
    start = begin[which] + order * period
    stop = np.minimum(start + stroke, end[which])
    # Where two polylines meet in `travelled` the position is ambiguous: look just inside each stroke's own line.
    grow = 1e-9 * (1.0 + travelled[-1])
    increasing = travelled + np.arange(len(travelled)) * grow / max(len(travelled), 1)
    ends = np.empty((len(start), 2))
    ends[:, 0] = start + grow
    ends[:, 1] = np.maximum(stop - grow, ends[:, 0])
    # A point as one complex number is found by one search for both of its coordinates.
    return np.interp(ends.ravel(), increasing, plane).view(np.float64).reshape(-1, 4)


def _ring(count: int, radius: float = 1.0) -> F64:
    angle = np.linspace(0.0, 2.0 * np.pi, count + 1)
    xy = radius * np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    return np.concatenate([xy[:-1], xy[1:]], axis=-1)


def _shape(*strokes: tuple[float, float, float, float]) -> F64:
    return np.array(strokes)


def _rays(near: float, far: float) -> F64:
    return _shape((near, 0, far, 0), (-near, 0, -far, 0), (0, near, 0, far), (0, -near, 0, -far))


_CROSS = _shape((-1, 0, 1, 0), (0, -1, 0, 1))
_THIRD = np.kron([[2 / 3, 1 / 3], [1 / 3, 2 / 3]], np.eye(2))
"""Keeps the middle third of a stroke."""

_SQUARE = _shape((-1, -1, 1, -1), (1, -1, 1, 1), (1, 1, -1, 1), (-1, 1, -1, -1))
SHAPES: dict[str, F64] = {
    "open_cluster": _ring(32)[::2],
    "globular": np.concatenate([_ring(24), _CROSS]),
    "galaxy": _ring(24),
    "nebula": _SQUARE,
    "planetary": np.concatenate([_ring(20, 0.62), _rays(0.62, 1.25)]),
    "dark": _SQUARE @ _THIRD,
    "cross": _CROSS,
    "ring": _ring(24),
    "square": _SQUARE,
    "diamond": _shape((0, -1, 1, 0), (1, 0, 0, 1), (0, 1, -1, 0), (-1, 0, 0, -1)),
    "triangle": _shape((0, -1, 0.87, 0.5), (0.87, 0.5, -0.87, 0.5), (-0.87, 0.5, 0, -1)),
    "point": np.concatenate([_ring(16, 0.45), _rays(0.45, 1.0)]),
}
"""Each map symbol as strokes x1 y1 x2 y2 within the unit square, first axis along +x."""
ROUND = ("open_cluster", "galaxy", "ring")
LARGE, ARC = 24.0, 4.0
"""Half an axis in pixels from which on a ring is drawn in strokes of ARC pixels instead of a fixed number."""


def symbols(kind: str, xy: F64, size: F64, angle: F64) -> F64:
    """Return the strokes (K, 4) of one kind of symbol at `xy` (N, 2), with half-axes (N, 2), turned clockwise."""
    large = size.max(axis=1, initial=0.0) > LARGE
    if kind in ROUND and large.any():
        # A ring of a field of its own needs more strokes to be round, and dots as fine as on a small one.
        rings = [
            _placed(
                _large_ring(kind, float(size[row].max())), xy[row : row + 1], size[row : row + 1], angle[row : row + 1]
            )
            for row in np.flatnonzero(large)
        ]
        return np.concatenate([symbols(kind, xy[~large], size[~large], angle[~large]), *rings])
    return _placed(SHAPES.get(kind, SHAPES["ring"]), xy, size, angle)


def _large_ring(kind: str, half_axis: float) -> F64:
    count = 2 * int(np.ceil(np.pi * half_axis / ARC))
    return _ring(count)[::2] if kind == "open_cluster" else _ring(count)


def _placed(shape: F64, xy: F64, size: F64, angle: NDArray[np.floating]) -> F64:
    out = np.empty((len(xy), len(shape), 2), dtype=np.complex128)
    np.multiply(shape[:, 0::2], size[:, :1, None], out=out.real)
    np.multiply(shape[:, 1::2], size[:, 1:, None], out=out.imag)
    out *= np.exp(1j * angle)[:, None, None]
    out += _plane(xy)[:, None, None]
    return out.view(np.float64).reshape(-1, 4)

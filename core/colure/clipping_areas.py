"""Cut filled areas on the sphere, at the edge and at the seam of a projection, and lay them on a page as closed rings.

Rings come as camera directions, columns (3, N), with `starts` as in `marks.Areas`; all rings are one area under the
even-odd rule. They are cut by parity: the rim of what the projection shows is divided by the crossings of the outline
into stretches that lie in turn inside and outside the area, and every inside stretch closes two open ends. One point
that is known to lie outside the area decides which stretches those are. So an area may contain the centre, a pole or
the whole rim, cross the seam, or be a belt round the sky with two outlines: there is no special case.
"""

from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

import numpy as np

from colure.arrays import Bool, Float, Int, cross
from colure.clipping import FAR, SWING, Rect, Window, cut_segments
from colure.marks import F32, I32

RIM_STEP = np.radians(1.0)
"""Widest spacing of the points put along the rim of an area that is cut there."""
_FINEST = 6
"""How often that spacing is halved at most, for small fields."""


def areas(window: Window, camera: Float, starts: I32, outside: Float) -> tuple[F32, I32]:
    """Return page rings (points (M, 2), starts) of an area whose outlines are rings on the sphere.

    `outside` is a camera direction (3,) that is known not to lie in the area. Edges of rings are great-circle arcs.
    """
    # What was float32 is a unit vector to 1e-7 only, and cut ends are told from whole ones to 1e-13.
    camera = _unit(np.asarray(camera, dtype=np.float64))
    # A point exactly on the seam or on the rim would be on both sides of it: 1e-12 rad off is far below any pixel.
    if window.projector.projection.unrolled:
        close = np.abs(camera[0]) < 1e-12
        if close.any():
            camera[0] = np.where(close, np.copysign(1e-12, camera[0]), camera[0])
    else:
        level = float(np.cos(window.cap))
        camera[2][np.abs(camera[2] - level) < 1e-12] = level - 2e-12
    camera, starts = _refined(window, camera, starts)
    rim = _Rim(window)
    rings, stretches = _trace(rim, camera, starts)
    rings += _close(rim, stretches, camera, starts, np.asarray(outside, dtype=np.float64))
    if not rings:
        return np.empty((0, 2), np.float32), np.zeros(1, np.int32)
    x, y = window.projector.to_page(np.concatenate(rings, axis=1))
    points = np.empty((len(x), 2))
    points[:, 0], points[:, 1] = x, y
    ends = np.cumsum([0, *(ring.shape[1] for ring in rings)])
    left, top, right, bottom = window.rect
    if points.min() < min(left, top) - FAR or points.max() > max(right, bottom) + FAR:
        points, ends = _boxed(points, ends, window.rect)
    return points.astype(np.float32), ends.astype(np.int32)


def rim_ring(window: Window) -> F32 | None:
    """Return the outline of the projection on the page (N, 2), or None where the map lies wholly within it."""
    projection = window.projector.projection
    if not projection.unrolled and window.cap < projection.edge:
        return None
    rim = _Rim(window)
    x, y = window.projector.to_page(rim.between(-1.0, rim.length))
    left, top, right, bottom = window.rect
    points = np.stack([x, y], axis=1)
    if max(np.abs(points[:, 0]).max(), np.abs(points[:, 1]).max()) > FAR + max(right, bottom):
        points, ends = _boxed(points, np.array([0, len(points)]), window.rect)
        if not len(points):
            return None
        points = points[: ends[1]]
    whole = points[:, 0].min() <= left and points[:, 0].max() >= right
    if whole and points[:, 1].min() <= top and points[:, 1].max() >= bottom and projection.name == "mercator":
        return None
    return points.astype(np.float32)


def following(n: int, starts: I32) -> Int:
    """Return the index of the next point of the same ring for each of n points."""
    after = np.arange(1, n + 1)
    after[starts[1:] - 1] = starts[:-1]
    return after


def _refined(window: Window, camera: Float, starts: I32) -> tuple[Float, I32]:
    """Divide the edges that swing about the projection's axis, where a straight piece of page is no arc of sky."""
    unrolled = window.projector.projection.unrolled
    if not unrolled and window.cap < 2.7:
        return camera, starts
    u, v = (camera[0], camera[2]) if unrolled else (camera[0], camera[1])
    suspect = np.abs(camera[1]) > 0.95 if unrolled else camera[2] < -0.9
    if not suspect.any():
        return camera, starts
    after = following(camera.shape[1], starts)
    swing = suspect | suspect[after]
    a = np.flatnonzero(swing)
    b = after[a]
    swing[a] = np.abs(u[a] * v[b] - v[a] * u[b]) > SWING * (u[a] * u[b] + v[a] * v[b])
    if not swing.any():
        return camera, starts
    parts = np.where(swing, 48, 1)
    owner = np.repeat(np.arange(len(parts)), parts)
    first = np.zeros(len(parts) + 1, np.intp)
    np.cumsum(parts, out=first[1:])
    t = (np.arange(len(owner)) - first.take(owner)) / parts.take(owner)
    begin = camera.take(owner, axis=1)
    way = camera.take(after.take(owner), axis=1)
    way -= begin
    way *= t
    begin += way
    return _unit(begin), first[starts].astype(np.int32)


def _unit(columns: Float) -> Float:
    """Return unit vectors along columns (3, N)."""
    x, y, z = columns
    return np.asarray(columns / np.sqrt(x * x + y * y + z * z))


class _Rim:
    """The boundary of what a window shows, as a closed curve with a parameter that grows along it.

    About a centre the parameter is the angle on the page. Round an unrolled sheet it is the way along its sides: up the
    right side, leftwards along the top, down the left side, rightwards along the bottom.
    """

    def __init__(self, window: Window) -> None:
        self.window = window
        self.unrolled = window.projector.projection.unrolled
        self.cap = window.cap
        # About 16 pixels at the centre's scale. A cap's rim is out of sight when the field is small.
        fine = np.log2(max(RIM_STEP * window.projector.scale / 16.0, 1.0)) if self.unrolled else 0.0
        self.halvings = min(int(np.ceil(fine)), _FINEST)
        self.side = 2.0 * window.cap if self.unrolled else 0.0
        self.length = 2.0 * self.side + 4.0 * np.pi if self.unrolled else 2.0 * np.pi

    def shown(self, camera: Float) -> Bool:
        """Return which directions (3, N) are within the rim."""
        if not self.unrolled:
            return np.asarray(camera[2] >= np.cos(self.cap))
        return np.asarray(np.abs(camera[1]) <= np.sin(self.cap))

    def crossed(self, a: Float, b: Float) -> Bool:
        """Return which arcs (3, N) may cross the rim; `cut_segments` finds out."""
        inside_a, inside_b = self.shown(a), self.shown(b)
        if self.unrolled:
            return np.asarray((np.signbit(a[0]) != np.signbit(b[0])) & (a[2] + b[2] < 1.0) | (inside_a != inside_b))
        if self.cap >= 1.5:
            return np.asarray(inside_a != inside_b)
        # A small cap may be crossed by an arc with both ends outside: all that come near are looked at.
        reach = np.arccos(np.clip((a * b).sum(axis=0), -1.0, 1.0))
        near = np.maximum(a[2], b[2]) >= np.cos(np.minimum(self.cap + reach, np.pi))
        return np.asarray((inside_a != inside_b) | (~inside_a & ~inside_b & near))

    def parameter(self, point: Float) -> float:
        """Return the parameter of a direction (3,) that lies on the rim."""
        x, y, z = point.tolist()
        if not self.unrolled:
            return float(np.arctan2(y, x) % (2.0 * np.pi))
        lat = float(np.arctan2(y, np.hypot(x, z)))
        if x == 0.0 and z < 0.0:
            if np.signbit(x):
                return self.side + 2.0 * np.pi + self.cap - lat
            return lat + self.cap
        lon = float(np.arctan2(x, z))
        return self.side + np.pi - lon if lat > 0.0 else 2.0 * self.side + 3.0 * np.pi + lon

    def between(self, first: float, last: float) -> Float:
        """Return directions (3, K) strictly between two parameters, going forwards, the corners of a sheet included."""
        parameters, points = _lattice(self.unrolled, self.cap, self.halvings)
        a, b = np.searchsorted(parameters, (first, last))
        return points[:, a + (parameters[a] <= first) : b] if a < len(parameters) else points[:, :0]

    def at(self, parameter: float) -> Float:
        """Return the direction (3,) at a parameter."""
        return np.asarray(_on_rim(np.array([parameter % self.length]), self.unrolled, self.cap)[:, 0])


@lru_cache(maxsize=16)
def _lattice(unrolled: bool, cap: float, halvings: int) -> tuple[Float, Float]:
    """Return evenly spaced points along a rim, twice round it: parameters (N,) and directions (3, N)."""
    step = RIM_STEP / 2.0**halvings
    sides = (2.0 * cap, 2.0 * np.pi, 2.0 * cap, 2.0 * np.pi) if unrolled else (2.0 * np.pi,)
    starts = np.concatenate([[0.0], np.cumsum(sides)])
    once = np.concatenate(
        [np.linspace(a, b, max(int(np.ceil((b - a) / step)), 1), endpoint=False) for a, b in pairwise(starts)]
    )
    points = _on_rim(once, unrolled, cap)
    return np.concatenate([once, once + starts[-1]]), np.concatenate([points, points], axis=1)


def _on_rim(s: Float, unrolled: bool, cap: float) -> Float:
    """Return directions (3, N) at parameters (N,) within one turn of a rim."""
    if not unrolled:
        sine = np.sin(cap)
        return np.stack([sine * np.cos(s), sine * np.sin(s), np.full(len(s), np.cos(cap))])
    ends = np.array([0.0, 2.0 * cap, 2.0 * cap + 2.0 * np.pi, 4.0 * cap + 2.0 * np.pi])
    which = np.searchsorted(ends, s, side="right") - 1
    way = s - ends[which]
    # The right side and the left side are the same meridian: π just short of the seam, on either hand.
    lon = np.choose(which, [np.full(len(s), np.pi), np.pi - way, np.full(len(s), -np.pi), way - np.pi])
    lat = np.choose(which, [way - cap, np.full(len(s), cap), cap - way, np.full(len(s), -cap)])
    return np.stack([np.cos(lat) * np.sin(lon), np.sin(lat), np.cos(lat) * np.cos(lon)])


@dataclass(frozen=True, slots=True)
class _Stretch:
    """A shown piece of outline between two points of the rim: directions (3, K) and the parameters of its ends."""

    points: Float
    first: float
    last: float


def _trace(rim: _Rim, camera: Float, starts: I32) -> tuple[list[Float], list[_Stretch]]:
    """Return the rings (3, K) that are shown whole, and the shown stretches of those that are cut."""
    shown = rim.shown(camera)
    if not rim.unrolled and shown.all():
        return [camera[:, first:last] for first, last in pairwise(starts.tolist())], []
    after = following(camera.shape[1], starts)
    suspects = np.flatnonzero(rim.crossed(camera, camera[:, after]))
    rings: list[Float] = []
    stretches: list[_Stretch] = []
    pieces = _pieces(rim.window, camera, suspects, after)
    at = 0
    for first, last in zip(starts[:-1].tolist(), starts[1:].tolist(), strict=True):
        begin = at
        while at < len(pieces) and pieces[at][0] < last:
            at += 1
        if at > begin:
            stretches += _walk(rim, camera, first, last, pieces[begin:at])
        elif shown[first]:
            rings.append(camera[:, first:last])
    return rings, stretches


_Piece = tuple[int, Float, Float, bool, bool]
"""An edge's number, the two ends of a shown part of it, and whether each end lies on the rim."""


def _pieces(window: Window, camera: Float, edges: Int, after: Int) -> list[_Piece]:
    """Return the shown parts of those edges that are really cut, in the order of travel."""
    if not len(edges):
        return []
    a, b = camera[:, edges], camera[:, after[edges]]
    firsts, lasts, which = cut_segments(window, a, b)
    begin, way = a[:, which], (b - a)[:, which]
    cut_first = np.abs(firsts - begin).max(axis=0) > 1e-13
    cut_last = np.abs(lasts - b[:, which]).max(axis=0) > 1e-13
    # Along the ring, and where an edge has two parts, along the edge.
    order = np.lexsort((((firsts - begin) * way).sum(axis=0), which))
    kept = order[(cut_first | cut_last)[order]]
    return [
        (int(edges[which[j]]), firsts[:, j], lasts[:, j], bool(cut_first[j]), bool(cut_last[j])) for j in kept.tolist()
    ]


def _walk(rim: _Rim, camera: Float, first: int, last: int, pieces: list[_Piece]) -> list[_Stretch]:
    """Return the stretches of the ring of points first … last − 1 whose cut edges have the given shown pieces."""
    n = last - first
    begin = next((i for i, piece in enumerate(pieces) if piece[3]), None)
    if begin is None:
        return []
    ordered = pieces[begin:] + pieces[:begin]
    stretches: list[_Stretch] = []
    run: list[Float] = []
    for i, (edge, p, q, enters, leaves) in enumerate(ordered):
        if enters:
            run = [p[:, None]]
        if leaves:
            run.append(q[:, None])
            points = np.concatenate(run, axis=1)
            stretches.append(_Stretch(points, rim.parameter(points[:, 0]), rim.parameter(points[:, -1])))
            run = []
            continue
        # Inside up to the next cut edge: take the ring's own points from the end of this edge to the start of that.
        upto = ordered[(i + 1) % len(ordered)][0]
        count = (upto - edge) % n or n
        run.append(camera[:, first + (edge + 1 - first + np.arange(count)) % n])
    return stretches


def _close(rim: _Rim, stretches: list[_Stretch], camera: Float, starts: I32, outside: Float) -> list[Float]:
    """Return rings (3, K) made of the stretches and of the parts of the rim that lie inside the area."""
    ends = sorted(
        [(s.first, i, 0) for i, s in enumerate(stretches)] + [(s.last, i, 1) for i, s in enumerate(stretches)]
    )
    if not ends:
        whole = rim.between(-1.0, rim.length)
        return [whole] if inside(whole[:, 1], camera, starts, outside) else []
    parameters = np.array([end[0] for end in ends])
    gaps = np.diff(np.append(parameters, parameters[0] + rim.length))
    widest = int(np.argmax(gaps))
    filled = inside(rim.at(float(parameters[widest] + 0.382 * gaps[widest])), camera, starts, outside)
    first = widest if filled else widest + 1
    partner: dict[tuple[int, int], tuple[tuple[int, int], Float]] = {}
    for j in range(first, first + len(ends), 2):
        here, there = j % len(ends), (j + 1) % len(ends)
        path = rim.between(float(parameters[here]), float(parameters[here] + gaps[here]))
        a, b = (ends[here][1], ends[here][2]), (ends[there][1], ends[there][2])
        partner[a], partner[b] = (b, path), (a, path[:, ::-1])
    rings: list[Float] = []
    left = set(range(len(stretches)))
    while left:
        start = min(left)
        run: list[Float] = []
        which, end = start, 0
        while which in left:
            left.discard(which)
            points = stretches[which].points
            run.append(points if end == 0 else points[:, ::-1])
            (which, end), path = partner[which, 1 - end]
            run.append(path)
        rings.append(np.concatenate(run, axis=1))
    return rings


def inside(point: Float, camera: Float, starts: I32, outside: Float) -> bool:
    """Return whether a direction lies in the area, by counting the edges between it and one that does not."""
    both = point + outside
    if both @ both < 1e-18:
        # Opposite points have no one arc between them: go by way of a third.
        third = np.roll(point, 1) + 0.3 * point
        third = np.cross(third, point)
        third /= np.linalg.norm(third)
        return _odd(point, third, camera, starts) != _odd(third, outside, camera, starts)
    return _odd(point, outside, camera, starts)


def _odd(p: Float, q: Float, camera: Float, starts: I32) -> bool:
    normal = cross(p, q)
    side = normal @ camera >= 0.0
    after = following(camera.shape[1], starts)
    at = np.flatnonzero(side != side[after])
    if not len(at):
        return False
    a, b = camera[:, at], camera[:, after[at]]
    edge = _cross(a, b)
    between = (p @ edge >= 0.0) != (q @ edge >= 0.0)
    # Both great circles meet in two opposite points; the arcs must share the same one.
    meet = _cross(normal[:, None], edge)
    same = ((p + q) @ meet > 0.0) == (((a + b) * meet).sum(axis=0) > 0.0)
    return bool(np.count_nonzero(between & same) % 2)


def _cross(a: Float, b: Float) -> Float:
    """Return the vector product of columns (3, N)."""
    return np.stack([a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]])


def _boxed(points: Float, ends: Int, rect: Rect) -> tuple[Float, Int]:
    """Return rings cut at a rectangle of the page; stretches along it may be run over twice, which fills alike."""
    out: list[Float] = []
    for k in range(len(ends) - 1):
        ring = points[ends[k] : ends[k + 1]]
        for axis, sign, limit in ((0, 1.0, rect[0]), (0, -1.0, -rect[2]), (1, 1.0, rect[1]), (1, -1.0, -rect[3])):
            if len(ring) < 3:
                break
            ring = _half_plane(ring, sign * ring[:, axis] - limit)
        if len(ring) >= 3:
            out.append(ring)
    if not out:
        return np.empty((0, 2)), np.zeros(1, np.int64)
    return np.concatenate(out), np.concatenate([[0], np.cumsum([len(r) for r in out])])


def _half_plane(ring: Float, d: Float) -> Float:
    """Return the part of a ring where the signed distance d (N,) of its points is not negative."""
    kept = d >= 0.0
    if kept.all():
        return ring
    after, d2 = np.roll(ring, -1, axis=0), np.roll(d, -1)
    crossing = kept != np.roll(kept, -1)
    t = np.where(crossing, d / np.where(crossing, d - d2, 1.0), 0.0)
    both = np.empty((2 * len(ring), 2))
    both[0::2], both[1::2] = ring, ring + t[:, None] * (after - ring)
    keep = np.empty(2 * len(ring), dtype=bool)
    keep[0::2], keep[1::2] = kept, crossing
    return np.asarray(both[keep])

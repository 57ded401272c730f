"""Cut lines on the sphere, exactly at the edge and at the seam of a projection, and lay them on a page.

Polylines come as camera directions, columns (3, N), with `starts` as in `marks.Lines`. Cutting happens on the sphere,
before the projection, because only there is a great-circle arc a straight thing; what lies outside the map rectangle
is then dropped on the page. Filled areas are cut in `clipping_areas`.
"""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from colure.arrays import Bool, Float
from colure.marks import F32, I32
from colure.projections import Projector, Real

Rect = tuple[float, float, float, float]
FAR = 4096.0
"""Pixels outside the map beyond which lines and areas are cut on the page too, because painters lose large numbers."""
_PARTS = 24
"""Pieces that an arc is divided into where it swings over the page."""
SWING = float(np.tan(0.17))
"""Tangent of the turn about the projection's axis, 10°, above which an arc swings."""
_ALONG = np.linspace(0.0, 1.0, _PARTS + 1)


@dataclass(frozen=True, eq=False)
class Window:
    """What of the sky is to be laid on the page: a projector, the map rectangle, and the cap that just covers it.

    `cap` is the angle from the centre within which an azimuthal projection is drawn, in radians: its edge, or what the
    corners of the rectangle reach if that is less.
    """

    projector: Projector
    rect: Rect
    cap: float

    @classmethod
    def of(cls, projector: Projector, frame: Rect, margin: float = 24.0) -> "Window":
        """Return the window of a map rectangle, with a margin in pixels so that cut ends stay out of sight."""
        left, top, right, bottom = frame
        rect = (left - margin, top - margin, right + margin, bottom + margin)
        edge = projector.projection.edge
        if projector.projection.unrolled:
            return cls(projector, rect, edge)
        corners = np.array([[rect[0], rect[1]], [rect[2], rect[1]], [rect[0], rect[3]], [rect[2], rect[3]]])
        plane = projector.to_plane(corners)
        camera = projector.projection.inverse(plane[:, 0], plane[:, 1])
        reach = np.arccos(np.clip(camera[2], -1.0, 1.0))
        return cls(projector, rect, edge if np.isnan(reach).any() else float(min(edge, reach.max())))

    @cached_property
    def radius(self) -> float:
        """Angle from the centre of the page that covers the map, in radians; π where it may be anywhere."""
        if not self.projector.projection.unrolled:
            return self.cap
        xs = np.linspace(self.rect[0], self.rect[2], 13)
        ys = np.linspace(self.rect[1], self.rect[3], 13)
        sky = self.projector.unproject(np.stack(np.meshgrid(xs, ys), axis=-1).reshape(-1, 2))
        on = np.isfinite(sky[:, 0])
        if not on.any():
            return float(np.pi)
        chord = float(np.linalg.norm(sky[on] - self.centre, axis=1).max())
        # The farthest point may lie between the samples, and where the sky ends on the page, well between.
        margin = 1.05 if on.all() else 1.4
        return min(2.0 * float(np.arcsin(min(0.5 * chord, 1.0))) * margin, float(np.pi))

    @cached_property
    def centre(self) -> Float:
        """The direction at the middle of the page, (3,) on ICRS axes; the projection's own centre if that is no sky."""
        middle = np.array([0.5 * (self.rect[0] + self.rect[2]), 0.5 * (self.rect[1] + self.rect[3])])
        sky = self.projector.unproject(middle)
        return sky if np.isfinite(sky).all() else self.projector.camera[2].copy()


@dataclass(frozen=True, slots=True, eq=False)
class Trace:
    """Polylines on the page before they are put together.

    `xy` (N, 2) are the page positions of the points, `whole` (N − 1) which segments are drawn as they are, `cut_xy`
    (2k, 2) the ends, in pairs, of the pieces of segments that are cut, and `cut_of` (k,) the number of the first point
    of the segment that each is a piece of.
    """

    xy: F32
    whole: Bool
    cut_xy: F32
    cut_of: NDArray[np.intp]

    @classmethod
    def nothing(cls) -> "Trace":
        """Return the trace of no points."""
        none = np.empty((0, 2), np.float32)
        return cls(none, np.empty(0, dtype=bool), none, np.empty(0, np.intp))

    def part(self, first: int, last: int) -> "Trace":
        """Return the trace of the points first … last − 1, which no segment joins to others."""
        if first >= last:
            return Trace.nothing()
        xy, whole = self.xy[first:last], self.whole[first : last - 1]
        if not len(self.cut_of):
            return Trace(xy, whole, self.cut_xy, self.cut_of)
        mine = ((self.cut_of >= first) & (self.cut_of < last)).nonzero()[0]
        cut_xy = self.cut_xy.reshape(-1, 4).take(mine, axis=0).reshape(-1, 2)
        return Trace(xy, whole, cut_xy, self.cut_of.take(mine) - first)

    def polylines(self, bounds: I32) -> list[tuple[F32, I32]]:
        """Return page polylines (points (M, 2), starts), in groups: group k is of the points bounds[k] … bounds[k + 1].

        No segment joins two groups.
        """
        before = np.zeros(len(self.xy), dtype=bool)
        before[1:] = self.whole
        keep = before.copy()
        keep[:-1] |= self.whole
        kept = keep.nonzero()[0]
        points = self.xy.take(kept, axis=0)
        firsts = (~before.take(kept)).nonzero()[0]
        if len(bounds) == 2 and not len(self.cut_of):
            return [(points, np.append(firsts, len(points)).astype(np.int32))]
        point_at = np.searchsorted(kept, bounds)
        first_at = np.searchsorted(firsts, point_at)
        group = np.searchsorted(bounds, self.cut_of, side="right") - 1
        cut = set(group.tolist())
        out = []
        for k, (begin, end, low, high) in enumerate(
            zip(*(v.tolist() for v in (point_at[:-1], point_at[1:], first_at[:-1], first_at[1:])), strict=True)
        ):
            own = points[begin:end]
            begins = firsts[low:high]
            if begin:
                begins = begins - begin
            if k in cut:
                extra, first = _chained(self.cut_xy.reshape(-1, 4)[group == k].reshape(-1, 2))
                begins = np.concatenate([begins, len(own) + first])
                own = np.concatenate([own, extra])
            starts = np.empty(len(begins) + 1, np.int32)
            starts[:-1], starts[-1] = begins, len(own)
            out.append((own, starts))
        return out


def _chained(ends: F32) -> tuple[F32, NDArray[np.intp]]:
    """Return pieces, given by their ends in pairs (2k, 2), as polylines: points, and the first point of each.

    Pieces that meet become one polyline: a painter has far fewer to draw, and no joints show.
    """
    kept = np.ones(len(ends), dtype=bool)
    point = ends.view(np.complex64)[:, 0]
    np.not_equal(point[2::2], point[1:-1:2], out=kept[2::2])
    at = kept.nonzero()[0]
    # The first ends are those with even numbers.
    return ends.take(at, axis=0), (at % 2 == 0).nonzero()[0]


def trace(window: Window, camera: Real, starts: I32) -> Trace:
    """Return polylines on the sphere, laid on the page and cut at edge, seam and rectangle.

    The segments are great-circle arcs, each shorter than half a turn.
    """
    joined = np.ones(camera.shape[1] - 1, dtype=bool)
    joined[starts[1:-1] - 1] = False
    whole, pieces, owner = _segments(window, camera, joined)
    x, y = window.projector.to_page(camera)
    left, top, right, bottom = window.rect
    x_min, x_max, y_min, y_max = float(x.min()), float(x.max()), float(y.min()), float(y.max())
    if not (x_min >= left and x_max <= right and y_min >= top and y_max <= bottom):  # nor if one is nan
        whole &= _seen(window.rect, x[:-1], y[:-1], x[1:], y[1:])
    ends = np.empty((0, 4))
    if len(owner):
        cx, cy = window.projector.to_page(pieces)
        seen = _seen(window.rect, cx[::2], cy[::2], cx[1::2], cy[1::2])
        ends = np.empty((2 * len(owner), 2))
        ends[:, 0], ends[:, 1] = cx, cy
        ends = ends.reshape(-1, 4)
        if not seen.all():
            ends, owner = ends[seen], owner[seen]
    # Painters lose large coordinates: the few segments that reach far out are cut at the rectangle.
    reach = max(left - x_min, x_max - right, top - y_min, y_max - bottom)
    if not reach <= FAR:  # nor is nan
        far = np.flatnonzero(whole)
        far = far[_far(window.rect, x[far], y[far]) | _far(window.rect, x[far + 1], y[far + 1])]
        whole[far] = False
        more = np.stack([x[far], y[far], x[far + 1], y[far + 1]], axis=1).astype(np.float64)
        ends, owner = np.concatenate([ends, more]), np.concatenate([owner, far])
    if len(owner) and np.abs(ends).max() > FAR:
        ends, kept = _boxed(ends, window.rect)
        owner = owner[kept]
    xy = np.empty((len(x), 2), np.float32)
    xy[:, 0], xy[:, 1] = x, y
    return Trace(xy, whole, ends.reshape(-1, 2).astype(np.float32), owner)


def _far(rect: Rect, x: Real, y: Real) -> Bool:
    left, top, right, bottom = rect
    return np.asarray((x < left - FAR) | (x > right + FAR) | (y < top - FAR) | (y > bottom + FAR))


def _boxed(ends: Float, rect: Rect) -> tuple[Float, NDArray[np.intp]]:
    """Return the parts of page segments (N, 4) within a rectangle, and the numbers of those that have one."""
    start, way = ends[:, :2], ends[:, 2:] - ends[:, :2]
    with np.errstate(divide="ignore", invalid="ignore"):
        near = (np.array(rect[:2]) - start) / way
        beyond = (np.array(rect[2:]) - start) / way
    # A segment along an axis stays on one side of the other's two limits; it has been seen, so it is within them.
    still = way == 0.0
    enter = np.where(still, 0.0, np.minimum(near, beyond)).max(axis=1)
    leave = np.where(still, 1.0, np.maximum(near, beyond)).min(axis=1)
    t0, t1 = np.maximum(enter, 0.0), np.minimum(leave, 1.0)
    kept = np.flatnonzero(t1 > t0)
    start, way = start[kept], way[kept]
    return np.concatenate([start + t0[kept, None] * way, start + t1[kept, None] * way], axis=1), kept


def lines(window: Window, camera: Real, starts: I32) -> tuple[F32, I32]:
    """Return page polylines (points (M, 2), starts) of polylines on the sphere; see `trace`."""
    if camera.shape[1] < 2:
        return np.empty((0, 2), np.float32), np.zeros(1, np.int32)
    return trace(window, camera, starts).polylines(np.array([0, camera.shape[1]], np.int32))[0]


def _seen(rect: Rect, x1: Real, y1: Real, x2: Real, y2: Real) -> Bool:
    """Return which segments have a bounding box that meets the rectangle."""
    left, top, right, bottom = rect
    return np.asarray(
        (np.maximum(x1, x2) >= left)
        & (np.minimum(x1, x2) <= right)
        & (np.maximum(y1, y2) >= top)
        & (np.minimum(y1, y2) <= bottom)
    )


def _segments(window: Window, camera: Real, joined: Bool) -> tuple[Bool, Float, NDArray[np.intp]]:
    """Return which segments are drawn whole (N − 1), the shown pieces (3, 2k) of those that are cut, and whose (k,)."""
    projection = window.projector.projection
    if projection.unrolled:
        x, z = camera[0], camera[2]
        # On the far side, a change of the sign of x is a step over the seam.
        side = np.signbit(x)
        across = joined & (side[:-1] != side[1:])
        if across.any():
            at = np.flatnonzero(across)
            t = x[at] / (x[at] - x[at + 1] + np.where(x[at] == x[at + 1], 1e-30, 0.0))
            over = z[at] + t * (z[at + 1] - z[at]) < 0.0
            across[at[~over]] = False
        wild = joined & ~across & _wild(camera[0], camera[2], np.abs(camera[1]) > 0.95)
        outside = np.abs(camera[1]) > np.sin(projection.edge) if projection.edge < 1.57 else None
        whole = joined & ~across & ~wild
        special = across | wild
    else:
        # A straight piece of page is far from an arc of sky only round the point opposite the centre.
        suspect = camera[2] < -0.9 if window.cap > 2.7 else None
        wild = _wild(camera[0], camera[1], suspect) & joined if suspect is not None else np.zeros(len(joined), bool)
        whole = joined & ~wild
        special = wild
        level = np.cos(window.cap)
        outside = camera[2] < level if not camera[2].min() >= level else None
    if outside is not None:
        near = ~outside
        whole &= near[:-1] & near[1:]
        special = special | joined & (near[:-1] != near[1:])
        if not projection.unrolled and window.cap < 1.5:
            special |= joined & outside[:-1] & outside[1:] & _through(camera, np.cos(window.cap))
    at = np.flatnonzero(special)
    if not len(at):
        return whole, np.empty((3, 0)), at
    a, b = camera[:, at].astype(np.float64), camera[:, at + 1].astype(np.float64)
    swung = wild[at]
    if swung.all():
        a, b = _divide(a, b)
        at = np.repeat(at, _PARTS)
    elif swung.any():
        fa, fb = _divide(a[:, swung], b[:, swung])
        a, b = np.concatenate([a[:, ~swung], fa], axis=1), np.concatenate([b[:, ~swung], fb], axis=1)
        at = np.concatenate([at[~swung], np.repeat(at[swung], _PARTS)])
    a, b, kept = cut_segments(window, a, b)
    pieces = np.empty((3, 2 * a.shape[1]))
    pieces[:, ::2], pieces[:, 1::2] = a, b
    return whole, pieces, at[kept]


def _wild(u: Real, v: Real, suspect: Bool) -> Bool:
    """Return which segments turn by more than 10° about the projection's axis where that swings them over the page."""
    if not suspect.any():
        return np.zeros(len(u) - 1, dtype=bool)
    wild = suspect[:-1] | suspect[1:]
    at = np.flatnonzero(wild)
    cross = u[at] * v[at + 1] - v[at] * u[at + 1]
    along = u[at] * u[at + 1] + v[at] * v[at + 1]
    wild[at] = np.abs(cross) > SWING * along
    return wild


def _divide(a: Float, b: Float) -> tuple[Float, Float]:
    """Return the ends of _PARTS pieces of each arc (3, N), in order along each arc."""
    points = a[:, :, None] * (1.0 - _ALONG) + b[:, :, None] * _ALONG
    x, y, z = points
    points /= np.sqrt(x * x + y * y + z * z)
    return points[:, :, :-1].reshape(3, -1), points[:, :, 1:].reshape(3, -1)


def _through(camera: Real, z_cap: float) -> Bool:
    """Return which arcs (N − 1) come within a small cap although both ends may be outside it."""
    a, b = camera[:, :-1], camera[:, 1:]
    normal = np.cross(a, b, axis=0)
    length = np.sqrt((normal * normal).sum(axis=0))
    sine = np.abs(normal[2])
    # The nearest point of the whole great circle, and that it lies between the ends: both ends look back at it.
    near = sine <= np.sqrt(max(1.0 - z_cap * z_cap, 0.0)) * length
    towards_a = normal[0] * a[1] - normal[1] * a[0]
    towards_b = normal[0] * b[1] - normal[1] * b[0]
    between = (towards_a <= 0.0) != (towards_b <= 0.0)
    return np.asarray(near & between & (a[2] + b[2] > 0.0))


def cut_segments(window: Window, a: Float, b: Float) -> tuple[Float, Float, NDArray[np.intp]]:
    """Return the pieces of arcs (3, N), (3, N) that the projection shows, cut at its edge and seam.

    Answers the ends (3, M), (3, M) and for each piece the number of its arc (M,).
    """
    projection = window.projector.projection
    which = np.arange(a.shape[1])
    if not projection.unrolled:
        return _cut_cap(a, b, which, 2, np.cos(window.cap))
    if projection.edge < 1.57:
        level = -np.sin(projection.edge)
        turned = np.array([[1.0], [-1.0], [1.0]])
        a, b, which = _cut_cap(a, b, which, 1, level)
        a, b, which = _cut_cap(a * turned, b * turned, which, 1, level)
        a, b = a * turned, b * turned
    across = np.signbit(a[0]) != np.signbit(b[0])
    span = np.where(across, a[0] - b[0], 1.0)
    t = a[0] / np.where(span == 0.0, 1.0, span)
    cross = a + t * (b - a)
    cross /= np.sqrt((cross * cross).sum(axis=0))
    across &= cross[2] < 0.0
    if not across.any():
        return a, b, which
    on_a, on_b = cross[:, across].copy(), cross[:, across].copy()
    on_a[0] = np.copysign(0.0, a[0, across])
    on_b[0] = np.copysign(0.0, b[0, across])
    firsts = np.concatenate([a[:, ~across], a[:, across], on_b], axis=1)
    lasts = np.concatenate([b[:, ~across], on_a, b[:, across]], axis=1)
    return firsts, lasts, np.concatenate([which[~across], which[across], which[across]])


def _cut_cap(
    a: Float, b: Float, which: NDArray[np.intp], axis: int, level: float
) -> tuple[Float, Float, NDArray[np.intp]]:
    """Return the parts of arcs where the component `axis` of the direction is at least `level`."""
    if min(a[axis].min(initial=1.0), b[axis].min(initial=1.0)) >= level:
        return a, b, which
    t0, t1 = cap_interval(a, b, axis, level)
    shown = t1 > t0
    a, b, t0, t1 = a[:, shown], b[:, shown], t0[shown], t1[shown]
    first, last = a + t0 * (b - a), a + t1 * (b - a)
    first /= np.sqrt((first * first).sum(axis=0))
    last /= np.sqrt((last * last).sum(axis=0))
    return first, last, which[shown]


def cap_interval(a: Float, b: Float, axis: int, level: float) -> tuple[Float, Float]:
    """Return, for chords a + t(b − a), the part t0 ≤ t ≤ t1 of [0, 1] whose direction reaches `level` along an axis.

    Where no part does, t1 < t0. A chord that leaves a large cap and comes back keeps its two ends (it is shorter than
    the points that callers put on a curve, so that does not happen on a chart).
    """
    d = b - a
    za, dz = a[axis], d[axis]
    l2 = level * level
    # z(t)² = level² |p(t)|²: both crossings of the cone, of which only those on the right nappe count.
    qa = dz * dz - l2 * (d * d).sum(axis=0)
    qb = za * dz - l2 * (a * d).sum(axis=0)
    qc = za * za - l2 * (a * a).sum(axis=0)
    root = np.sqrt(np.maximum(qb * qb - qa * qc, 0.0))
    q = -(qb + np.copysign(root, qb))
    with np.errstate(divide="ignore", invalid="ignore"):
        r1 = np.where(qa != 0.0, q / qa, np.inf)
        r2 = np.where(q != 0.0, qc / q, np.inf)
    in_a = za >= level * np.sqrt((a * a).sum(axis=0))
    in_b = b[axis] >= level * np.sqrt((b * b).sum(axis=0))

    def valid(r: Float) -> Bool:
        z = za + np.where(np.isfinite(r), r, 0.0) * dz
        same = z * level >= 0.0 if level != 0.0 else np.ones(len(z), dtype=bool)
        return np.asarray((r >= 0.0) & (r <= 1.0) & same)

    v1, v2 = valid(r1), valid(r2)
    only = np.where(v1, r1, np.where(v2, r2, 0.5))
    low = np.minimum(np.where(v1, r1, np.inf), np.where(v2, r2, np.inf))
    high = np.maximum(np.where(v1, r1, -np.inf), np.where(v2, r2, -np.inf))
    both_out = ~in_a & ~in_b
    through = both_out & v1 & v2 & (level > 0.0)
    t0 = np.where(in_a, 0.0, np.where(through, low, only))
    t1 = np.where(in_b, 1.0, np.where(through, high, only))
    missed = both_out & ~through
    return np.where(missed, 1.0, t0), np.where(missed, 0.0, t1)

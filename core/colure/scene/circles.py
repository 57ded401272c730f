"""Reference circles on the page: their curves, their graduation, and where figures and names may stand along them."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from colure.arrays import ARCSEC, DEG, TWO_PI, Bool, Float, Int, cartesian
from colure.clipping import Trace, lines, trace
from colure.graduation import Steps, grid_step, multiples, steps, visible_longitudes
from colure.marks import CIRCLE, DIVISION, F32, GRID, Layer, Lines, Mark, Segments
from colure.scene.context import Context, in_page
from colure.session import Circle
from colure.sky import FrameAxes

TICKS = (3.0, 5.5, 8.5)
"""Lengths in pixels of the smallest tick, the middle tick and the tick with a figure."""
_TICKS = np.array(TICKS, np.float32)


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """A graduated curve on the page, sampled at every smallest tick.

    `arcsec` (N,) longitudes as whole arcseconds, `xy` (N, 2) pixels, `tangent` (N, 2) unit vectors towards growing
    longitude, `north` (N, 2) unit vectors to the north side, `shown` (N,) whether the point is on the map.
    """

    number: int
    circle: Circle
    steps: Steps
    arcsec: Int
    xy: F32
    tangent: F32
    north: F32
    shown: Bool


def _radians(arcsec: Int) -> Float:
    return np.asarray(arcsec * ARCSEC, dtype=np.float64)


@lru_cache(maxsize=256)
def _base(first: int, last: int, step: int, lat: float) -> tuple[Int, Float]:
    """Return longitudes in arcseconds and directions (3, N) in the frame, for the multiples first … last of a step."""
    arcsec = np.arange(first, last + 1) * step
    columns = np.ascontiguousarray(cartesian(_radians(arcsec), lat).T)
    columns.flags.writeable = False
    return arcsec, columns


def span(ctx: Context, axes: FrameAxes, lat: float) -> tuple[float, float]:
    """Return the longitudes (rad) between which a parallel of a frame can be on the map; equal if nowhere."""
    radius = ctx.window.radius
    if radius > 1.0:
        return 0.0, TWO_PI
    lon0, lat0 = axes.spherical(ctx.window.centre[None, :])
    return visible_longitudes(float(lon0[0]), float(lat0[0]), radius, lat)


def columns_of(axes: FrameAxes, first: float, last: float, step: int, lat: float) -> tuple[Int, Float]:
    """Return longitudes in arcseconds and directions (3, N) on ICRS axes at the multiples of a step over a span."""
    whole = last - first >= TWO_PI - 1e-9
    if whole:
        low, high = 0, round(TWO_PI / ARCSEC / step)
    else:
        low, high = int(np.floor(first / ARCSEC / step)), int(np.ceil(last / ARCSEC / step))
    arcsec, columns = _base(low, high, step, lat)
    if axes.matrix is None:
        return arcsec, axes.columns(_radians(arcsec), lat)
    return arcsec, axes.matrix @ columns


def build(ctx: Context) -> tuple[Layer, tuple[Curve, ...]]:
    """Return the layer of circles, and their curves for the labels."""
    parts: list[tuple[int, Circle, FrameAxes, Int, Float, Steps]] = []
    for number, (circle, axes) in enumerate(ctx.sky["circles"]):
        lat = circle.lat_deg * DEG
        first, last = span(ctx, axes, lat)
        if last > first:
            # Degrees of longitude are shorter on a small circle.
            chosen = steps(ctx.step_scale * float(np.cos(lat)))
            parts.append((number, circle, axes, *columns_of(axes, first, last, chosen.minor, lat), chosen))
    if not parts:
        return Layer("circles", (), key(ctx)), ()
    starts = np.concatenate([[0], np.cumsum([len(part[3]) for part in parts])]).astype(np.int32)
    columns = np.concatenate([part[4] for part in parts], axis=1)
    drawn = trace(ctx.window, ctx.projector.to_camera(columns), starts)
    tangent, valid = _tangents(drawn)
    valid &= in_page(ctx, drawn.x, drawn.y, 0.0)
    xy = np.stack([drawn.x, drawn.y], axis=1).astype(np.float32)
    arcsec = np.concatenate([part[3] for part in parts])
    # North is to the left of growing longitude seen from outside the sphere; a sky chart is seen from inside, and the
    # horizon counts its azimuths the other way round.
    side = 1.0 if ctx.view.east_left else -1.0
    hands = [-side if part[2].left_handed else side for part in parts]
    hand = np.repeat(np.array(hands, np.float32), np.diff(starts))
    north = np.empty_like(tangent)
    north[:, 0], north[:, 1] = -tangent[:, 1] * hand, tangent[:, 0] * hand
    lengths = np.diff(starts)
    major = arcsec % np.repeat([part[5].major for part in parts], lengths) == 0
    middle = arcsec % np.repeat([part[5].middle for part in parts], lengths) == 0
    ticks = np.empty((len(xy), 4), np.float32)
    ticks[:, :2] = xy
    ticks[:, 2:] = xy + north * _TICKS[major.astype(np.intp) + middle][:, None]
    marks: list[Mark] = []
    curves: list[Curve] = []
    for k, ((points, ends), part) in enumerate(zip(drawn.polylines(starts), parts, strict=True)):
        if len(ends) < 2:
            continue
        number, circle, chosen = part[0], part[1], part[5]
        own = slice(int(starts[k]), int(starts[k + 1]))
        marks.append(Lines("circle", points, ends, CIRCLE, circle.colour))
        curves.append(Curve(number, circle, chosen, arcsec[own], xy[own], tangent[own], north[own], valid[own]))
        if circle.graduated:
            marks.append(Segments("circle", ticks[own][valid[own]], GRID, circle.colour))
    return Layer("circles", tuple(marks), key(ctx)), tuple(curves)


def key(ctx: Context) -> object:
    """Return what the layer depends on."""
    return (ctx.sky.key("circles"), ctx.view_key)


def _tangents(drawn: Trace) -> tuple[F32, Bool]:
    """Return unit tangents (N, 2) on the page from the neighbours that are joined, and which points have one."""
    n = len(drawn.x)
    after = np.zeros(n, dtype=bool)
    after[:-1] = drawn.whole
    before = np.zeros(n, dtype=bool)
    before[1:] = drawn.whole
    here = np.arange(n)
    upper, lower = here + after, here - before
    dx, dy = drawn.x[upper] - drawn.x[lower], drawn.y[upper] - drawn.y[lower]
    length = np.hypot(dx, dy)
    valid = length > 0.0
    length = np.where(valid, length, 1.0)
    return np.stack([dx / length, dy / length], axis=1).astype(np.float32), valid


def grid(ctx: Context) -> Layer:
    """Return the layer of coordinate lines, evenly spaced in latitude, and in longitude as evenly as a pole allows."""
    step = grid_step(ctx.step_scale)
    axes: FrameAxes = ctx.sky["grid"]
    pieces: list[Float] = []
    sizes: list[int] = []
    radius = ctx.window.radius
    lon0, lat0 = (float(v[0]) for v in axes.spherical(ctx.window.centre[None, :]))
    whole = radius > 1.0
    low, high = (-np.pi / 2, np.pi / 2) if whole else (max(lat0 - radius, -np.pi / 2), min(lat0 + radius, np.pi / 2))
    for arcsec in multiples(step, low, high).tolist():
        lat = arcsec * ARCSEC
        first, last = (0.0, TWO_PI) if whole else visible_longitudes(lon0, lat0, radius, lat)
        if abs(lat) < np.pi / 2 - 1e-9 and last > first:
            n = _points(ctx, (last - first) * float(np.cos(lat)))
            pieces.append(axes.columns(np.linspace(first, last, n), lat))
            sizes.append(n)
    reach = (0.0, TWO_PI)
    if not whole:
        spans = [visible_longitudes(lon0, lat0, radius, lat) for lat in (low, lat0, high, 0.5 * (low + lat0))]
        spans.append(visible_longitudes(lon0, lat0, radius, float(np.arcsin(np.clip(np.sin(lat0), -1, 1)))))
        reach = (min(s[0] for s in spans), max(s[1] for s in spans))
        if reach[1] - reach[0] > TWO_PI:
            reach = (0.0, TWO_PI)
    lon_step = _meridian_step(step, min(abs(low), abs(high)) if low * high > 0 else 0.0)
    lats = np.linspace(low, high, _points(ctx, high - low))
    meridians = multiples(lon_step, *reach)
    if reach[1] - reach[0] >= TWO_PI - 1e-9:
        meridians = np.unique(meridians % 1296000)
    for arcsec in meridians.tolist():
        pieces.append(axes.columns(np.full(len(lats), arcsec * ARCSEC), lats))
        sizes.append(len(lats))
    if not pieces:
        return Layer("grid", (), grid_key(ctx))
    starts = np.concatenate([[0], np.cumsum(sizes)]).astype(np.int32)
    camera = ctx.projector.to_camera(np.concatenate(pieces, axis=1))
    xy, ends = lines(ctx.window, camera, starts)
    return Layer("grid", (Lines("grid", xy, ends, GRID),), grid_key(ctx))


def _meridian_step(step: int, nearest_lat: float) -> int:
    """Return the spacing of meridians: that of the parallels, wider where a field near a pole squeezes them."""
    wanted = step / max(np.cos(nearest_lat), 0.02)
    round_ones = (1, 5, 10, 30, 60, 300, 600, 1800, 3600, 7200, 18000, 36000, 54000, 108000)
    return next((r for r in round_ones if r >= wanted - 1e-6), round_ones[-1])


def _points(ctx: Context, length: float) -> int:
    """Return how many points make a curve of this length (rad) look like one: 12 pixels apart, never over 2°."""
    return int(np.clip(max(length * ctx.scale / 12.0, length / (2.0 * DEG)), 8.0, 400.0)) + 1


def grid_key(ctx: Context) -> object:
    """Return what the layer of the grid depends on."""
    return (ctx.sky.key("grid"), ctx.view_key)


__all__ = ["DIVISION", "Curve", "build", "columns_of", "grid", "grid_key", "key", "span"]

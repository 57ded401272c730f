"""Reference circles on the page: their curves, their graduation, and where figures and names may stand along them."""

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure.arrays import ARCSEC, DEG, TWO_PI, Bool, Float, Int, cartesian
from colure.clipping import Trace
from colure.graduation import TURN, Steps, grid_step, multiples, steps, visible_longitudes
from colure.marks import CIRCLE, F32, GRID, I32, Layer, Lines, Mark, Segments
from colure.scene.context import Context, in_page
from colure.scene.strokes import Strokes
from colure.session import Circle
from colure.sky import FrameAxes

TICKS = (3.0, 5.5, 8.5)
"""Lengths in pixels of the smallest tick, the middle tick and the tick with a figure."""
_TICKS = np.array(TICKS, np.float32)


@dataclass(frozen=True, slots=True, eq=False)
class Scale:
    """The graduation of circles, which does not depend on where they are.

    For every circle, (C,): whether it is `graduated`, and `major`, the spacing of its figures in arcseconds. For every
    point, (N,): `row` which of the circles it is on, `arcsec` its longitude as a whole number. Of the points, `ticks`
    are those with a tick, `lengths` in pixels, `figures` those with a figure and `between` those halfway.
    """

    graduated: Bool
    major: Int
    row: NDArray[np.intp]
    arcsec: Int
    ticks: NDArray[np.intp]
    lengths: F32
    figures: NDArray[np.intp]
    between: NDArray[np.intp]


@dataclass(frozen=True, slots=True, eq=False)
class Curves:
    """The reference circles on the page, point after point, circle after circle.

    `circles` (C,) those that are shown and `numbers` (C,) their places in the session's list, `scale` their graduation.
    For every point, (N,): `xy` (N, 2) its pixel, `tangent` and `north` (N, 2) unit vectors on the page towards growing
    longitude and towards the north side, `shown` whether it is on the map.
    """

    circles: tuple[Circle, ...]
    numbers: Int
    scale: Scale
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
    """Return longitudes in arcseconds, at the multiples of a step over a span, and directions (3, N).

    The directions are on the frame's own axes if its `matrix` leads from there, else on ICRS axes.
    """
    whole = last - first >= TWO_PI - 1e-9
    if whole:
        low, high = 0, round(TWO_PI / ARCSEC / step)
    else:
        low, high = int(np.floor(first / ARCSEC / step)), int(np.ceil(last / ARCSEC / step))
    arcsec, columns = _base(low, high, step, lat)
    return arcsec, columns if axes.matrix is not None else axes.columns(_radians(arcsec), lat)


def prepare(ctx: Context) -> Strokes:
    """Return the circles' curves, to be traced and finished."""
    parts: list[tuple[int, Circle, FrameAxes, Int, Steps]] = []
    own: list[Float] = []
    step_scale = ctx.step_scale
    for number, (circle, axes) in enumerate(ctx.sky["circles"]):
        lat = circle.lat_deg * DEG
        first, last = span(ctx, axes, lat)
        if last > first:
            chosen = _steps(step_scale, lat)
            arcsec, columns = columns_of(axes, first, last, _fine(chosen.minor), lat)
            parts.append((number, circle, axes, arcsec, chosen))
            own.append(columns)
    starts = np.concatenate([[0], np.cumsum([len(part[3]) for part in parts])]).astype(np.int32)
    return Strokes(_camera(ctx, parts, own), starts, lambda drawn: _finish(ctx, parts, starts, drawn))


@lru_cache(maxsize=64)
def _steps(scale: float, lat: float) -> Steps:
    """Return the graduation of a parallel: degrees of longitude are shorter on a small circle."""
    return steps(scale * float(np.cos(lat)))


def _camera(ctx: Context, parts: list[tuple[int, Circle, FrameAxes, Int, Steps]], own: list[Float]) -> Any:
    """Return camera directions (3, N) of the circles' points, which each has on its own axes."""
    if not own:
        return np.empty((3, 0), np.float32)
    matrices = [part[2].matrix for part in parts]
    if all(columns is own[0] for columns in own) and all(matrix is not None for matrix in matrices):
        # Great circles all round the sky have the same points: one product turns them to every circle's place.
        turns = ctx.projector.camera @ np.array(matrices)
        together = turns.transpose(1, 0, 2).reshape(-1, 3)
        return ctx.turned(together, own[0]).reshape(3, -1)
    return np.concatenate([ctx.to_camera(columns, m) for columns, m in zip(own, matrices, strict=True)], axis=1)


def _finish(
    ctx: Context, parts: list[tuple[int, Circle, FrameAxes, Int, Steps]], starts: I32, drawn: Trace
) -> tuple[Layer, Curves | None]:
    """Return the layer of circles, and their curves for the labels."""
    if not parts:
        return Layer("circles", (), key(ctx)), None
    scale = _scale(
        tuple(
            (
                int(part[3][0]),
                int(part[3][-1]),
                len(part[3]),
                part[4].minor,
                part[4].middle,
                part[4].major,
                part[1].graduated,
            )
            for part in parts
        )
    )
    # Points and unit vectors of the page are complex numbers here, x + iy: half as many steps, and a quarter turn is i.
    here = drawn.xy.view(np.complex64)[:, 0]
    tangent, valid = _tangents(here, drawn.whole)
    valid &= in_page(ctx, drawn.xy[:, 0], drawn.xy[:, 1], 0.0)
    # North is to the left of growing longitude seen from outside the sphere; a sky chart is seen from inside, and the
    # horizon counts its azimuths the other way round.
    side = 1j if ctx.view.east_left else -1j
    hand = np.array([-side if part[2].left_handed else side for part in parts], np.complex64)
    north = tangent * np.repeat(hand, np.diff(starts))
    seen = valid.take(scale.ticks)
    at = scale.ticks[seen]
    ticks = np.empty((len(at), 4), np.float32)
    ends_of = ticks.view(np.complex64)
    ends_of[:, 0] = foot = here.take(at)
    ends_of[:, 1] = foot + north.take(at) * scale.lengths[seen]
    tick_at = np.searchsorted(at, starts)
    marks: list[Mark] = []
    for k, (points, ends) in enumerate(drawn.polylines(starts)):
        colour = parts[k][1].colour
        if len(ends) > 1:
            marks.append(Lines("circle", points, ends, CIRCLE, colour))
        if tick_at[k + 1] > tick_at[k]:
            marks.append(Segments("circle", ticks[tick_at[k] : tick_at[k + 1]], GRID, colour))
    curves = Curves(
        tuple(part[1] for part in parts),
        np.array([part[0] for part in parts]),
        scale,
        drawn.xy,
        tangent.view(np.float32).reshape(-1, 2),
        north.view(np.float32).reshape(-1, 2),
        valid,
    )
    return Layer("circles", tuple(marks), key(ctx)), curves


@lru_cache(maxsize=16)
def _scale(circles: tuple[tuple[int, int, int, int, int, int, bool], ...]) -> Scale:
    """Return the graduation of circles: first and last longitude, number of points, three steps, whether graduated."""
    row = np.repeat(np.arange(len(circles)), [circle[2] for circle in circles])
    arcsec = np.concatenate([np.linspace(first, last, n).round().astype(np.int64) for first, last, n, *_ in circles])
    minor, middle, major, graduated = (np.array([circle[k] for circle in circles]) for k in range(3, 7))
    ticks = np.flatnonzero(graduated[row] & (arcsec % minor[row] == 0))
    here, which = arcsec[ticks], row[ticks]
    large = here % major[which] == 0
    lengths = _TICKS[large.astype(np.intp) + (here % middle[which] == 0)]
    between = np.flatnonzero((arcsec - (major // 2)[row]) % major[row] == 0)
    return Scale(graduated, major, row, arcsec, ticks, lengths, ticks[large], between)


def _fine(minor: int) -> int:
    """Return the spacing of a curve's points in arcseconds: the smallest tick, or a part of it that looks round."""
    return minor if minor <= 7200 else 3600 if minor == 18000 else 7200


def key(ctx: Context) -> object:
    """Return what the layer depends on."""
    return (ctx.sky.key("circles"), ctx.view_key)


def _tangents(here: NDArray[np.complex64], whole: Bool) -> tuple[NDArray[np.complex64], Bool]:
    """Return unit tangents (N,) on the page from the neighbours that are joined, and which points have one."""
    ways = np.where(whole, here[1:] - here[:-1], np.complex64(0.0))
    tangent = np.zeros(len(here), np.complex64)
    tangent[:-1] = ways
    tangent[1:] += ways
    length = np.abs(tangent)
    valid = length > 0.0
    tangent /= np.maximum(length, np.float32(1e-30), out=length)
    return tangent, valid


def prepare_grid(ctx: Context) -> Strokes:
    """Return the coordinate lines, evenly spaced in latitude, and in longitude as evenly as a pole allows."""
    step = grid_step(ctx.step_scale)
    axes: FrameAxes = ctx.sky["grid"]
    if ctx.window.radius > 1.0 and axes.matrix is not None:
        columns, starts = _whole_grid(step)
        camera = ctx.to_camera(columns, axes.matrix)
    else:
        part, starts = _part_grid(ctx, axes, step)
        camera = ctx.to_camera(part)

    def finish(drawn: Trace) -> tuple[Layer, None]:
        (xy, ends) = drawn.polylines(starts[[0, -1]])[0]
        marks = (Lines("grid", xy, ends, GRID),) if len(xy) else ()
        return Layer("grid", marks, grid_key(ctx)), None

    return Strokes(camera, starts, finish)


@lru_cache(maxsize=8)
def _whole_grid(step: int) -> tuple[F32, I32]:
    """Return the lines of the whole sky in the grid's own frame: columns (3, N), a point every two degrees, starts."""
    # A hair off the pole, where a longitude still is one in float32.
    high = 0.5 * np.pi - 1e-3
    lats = multiples(step, -high, high)
    lons = np.arange(0, TURN, step)
    along, across = np.linspace(0.0, TWO_PI, 181), np.linspace(-high, high, 91)
    parallels = cartesian(np.tile(along, len(lats)), np.repeat(_radians(lats), len(along)))
    meridians = cartesian(np.repeat(_radians(lons), len(across)), np.tile(across, len(lons)))
    sizes = [len(along)] * len(lats) + [len(across)] * len(lons)
    columns = np.ascontiguousarray(np.concatenate([parallels, meridians]).T.astype(np.float32))
    return columns, np.concatenate([[0], np.cumsum(sizes)]).astype(np.int32)


def _part_grid(ctx: Context, axes: FrameAxes, step: int) -> tuple[Float, I32]:
    """Return the lines that a small field may show, on ICRS axes: columns (3, N), starts."""
    pieces: list[Float] = []
    sizes: list[int] = []
    radius = ctx.window.radius
    lon0, lat0 = (float(v[0]) for v in axes.spherical(ctx.window.centre[None, :]))
    top = np.pi / 2 - 1e-7
    low, high = max(lat0 - radius, -top), min(lat0 + radius, top)
    for arcsec in multiples(step, low, high).tolist():
        lat = arcsec * ARCSEC
        first, last = visible_longitudes(lon0, lat0, radius, lat)
        if abs(lat) < top and last > first:
            n = _points(ctx, (last - first) * float(np.cos(lat)))
            pieces.append(axes.columns(np.linspace(first, last, n), lat))
            sizes.append(n)
    spans = [visible_longitudes(lon0, lat0, radius, lat) for lat in (low, lat0, high, 0.5 * (low + lat0))]
    first, last = min(s[0] for s in spans), max(s[1] for s in spans)
    if last - first > TWO_PI:
        first, last = 0.0, TWO_PI
    lon_step = _meridian_step(step, min(abs(low), abs(high)) if low * high > 0 else 0.0)
    meridians = multiples(lon_step, first, last)
    if last - first >= TWO_PI - 1e-9:
        meridians = np.unique(meridians % TURN)
    lats = np.linspace(low, high, _points(ctx, high - low))
    for arcsec in meridians.tolist():
        pieces.append(axes.columns(np.full(len(lats), arcsec * ARCSEC), lats))
        sizes.append(len(lats))
    starts = np.concatenate([[0], np.cumsum(sizes)]).astype(np.int32)
    return (np.concatenate(pieces, axis=1) if pieces else np.empty((3, 0))), starts


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

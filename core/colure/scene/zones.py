"""Lines and filled zones under everything else: the sky itself, the Milky Way, the belt, constellation edges."""

from functools import lru_cache

import numpy as np

from colure.arrays import ARCSEC, DEG, TWO_PI, Float, cartesian
from colure.clipping import Trace
from colure.clipping_areas import areas, rim_ring
from colure.graduation import steps, visible_longitudes
from colure.marks import DIVISION, GRID, Areas, Layer, Lines, Mark
from colure.scene.circles import columns_of
from colure.scene.context import Context
from colure.scene.strokes import Strokes
from colure.sky import FrameAxes

DIVISIONS = 12
_MERIDIAN = 21
"""Points along a division line."""


def sky_disc(ctx: Context) -> Layer:
    """Return the layer of the sky's own shape: the map rectangle, or the outline of the projection where that shows."""
    left, top, right, bottom = ctx.frame
    box = np.array([[left, top], [right, top], [right, bottom], [left, bottom]], np.float32)
    ring = rim_ring(ctx.window)
    marks: list[Mark] = []
    if ring is None:
        marks.append(Areas("sky", box, np.array([0, 4], np.int32)))
    else:
        marks.append(Areas("sky", ring, np.array([0, len(ring)], np.int32)))
    return Layer("sky", tuple(marks), ctx.page_key)


def outline(ctx: Context) -> Layer:
    """Return the layer of the sky's outline where that shows on the page: over everything that ends there."""
    marks: tuple[Mark, ...] = ()
    ring = rim_ring(ctx.window)
    if ring is not None:
        closed = np.concatenate([ring, ring[:1]])
        marks = (Lines("rim", closed, np.array([0, len(closed)], np.int32), GRID),)
    return Layer("outline", marks, ctx.page_key)


def milky_way(ctx: Context) -> Layer:
    """Return the layer of the Milky Way's levels, fainter ones first."""
    marks: list[Mark] = []
    for outline in ctx.sky["milky way"]:
        camera = ctx.projector.to_camera(outline.columns)
        outside = ctx.projector.camera @ outline.outside
        points, starts = areas(ctx.window, camera, outline.starts, outside)
        if len(points):
            marks.append(Areas(f"milkyway.{outline.level}", points, starts))
    return Layer("milky way", tuple(marks), (ctx.sky.key("milky way"), ctx.view_key))


def prepare_belt(ctx: Context) -> Strokes:
    """Return the belt's two edges and twelve division lines, to be traced; its filled zone is laid out at once."""
    axes: FrameAxes = ctx.sky["belt"]
    setting = ctx.sky.session.belt
    half = setting.half_width_deg * DEG
    fine = min(max(steps(ctx.step_scale).minor, 60), 3600)
    if ctx.window.radius > 1.0:
        parallels = [columns_of(axes, 0.0, TWO_PI, 3600, lat)[1] for lat in (half, -half)]
        rings = [parallel[:, :-1] for parallel in parallels]
    else:
        parallels = [columns_of(axes, *_span(ctx, axes, lat), fine, lat)[1] for lat in (half, -half)]
        rings = [_dense_ring(ctx, axes, lat, fine) for lat in (half, -half)]
    ring_starts = np.array([0, rings[0].shape[1], rings[0].shape[1] + rings[1].shape[1]], np.int32)
    to_camera = ctx.projector.camera if axes.matrix is None else ctx.projector.camera @ axes.matrix
    pole = axes.columns(np.zeros(1), np.pi / 2)[:, 0] if axes.matrix is None else np.array([0.0, 0.0, 1.0])
    filled, ring_ends = areas(ctx.window, to_camera @ np.concatenate(rings, axis=1), ring_starts, to_camera @ pole)
    sizes = [line.shape[1] for line in parallels]
    if setting.divisions:
        parallels.append(_divisions(axes, half))
        sizes += [_MERIDIAN] * DIVISIONS
    starts = np.concatenate([[0], np.cumsum(sizes)]).astype(np.int32)

    def finish(drawn: Trace) -> tuple[Layer, None]:
        marks: list[Mark] = [Areas("belt", filled, ring_ends, alpha=0.55)] if len(filled) else []
        groups = drawn.polylines(starts[[0, 2, -1]] if setting.divisions else starts[[0, 2]])
        for role, weight, (points, ends) in zip(("belt.edge", "belt.division"), (GRID, DIVISION), groups, strict=False):
            if len(points):
                marks.append(Lines(role, points, ends, weight))
        return Layer("belt", tuple(marks), belt_key(ctx)), None

    return Strokes(ctx.to_camera(np.concatenate(parallels, axis=1), axes.matrix), starts, finish)


@lru_cache(maxsize=16)
def _division_points(half: float) -> tuple[Float, Float, Float]:
    """Return longitudes, latitudes and directions (3, N) of the division lines in the belt's own frame."""
    lon = np.repeat(np.arange(DIVISIONS) * (TWO_PI / DIVISIONS), _MERIDIAN)
    lat = np.tile(np.linspace(-half, half, _MERIDIAN), DIVISIONS)
    return lon, lat, np.ascontiguousarray(cartesian(lon, lat).T)


def _divisions(axes: FrameAxes, half: float) -> Float:
    """Return the twelve division lines (3, N), from the south edge to the north, on axes as `columns_of` has them."""
    lon, lat, columns = _division_points(half)
    return columns if axes.matrix is not None else axes.columns(lon, lat)


def belt_key(ctx: Context) -> object:
    """Return what the layer of the belt depends on."""
    return (ctx.sky.key("belt"), ctx.sky.session.belt, ctx.view_key)


def _span(ctx: Context, axes: FrameAxes, lat: float) -> tuple[float, float]:
    if ctx.window.radius > 1.0:
        return 0.0, TWO_PI
    lon0, lat0 = axes.spherical(ctx.window.centre[None, :])
    return visible_longitudes(float(lon0[0]), float(lat0[0]), ctx.window.radius, lat)


def _dense_ring(ctx: Context, axes: FrameAxes, lat: float, fine: int) -> Float:
    """Return a closed parallel (3, N): fine where it can be seen, a degree apart elsewhere."""
    first, last = _span(ctx, axes, lat)
    coarse = np.arange(0.0, TWO_PI, DEG)
    if last > first:
        seen = np.arange(int(first / ARCSEC / fine), int(last / ARCSEC / fine) + 1) * (fine * ARCSEC)
        rest = coarse[
            ((coarse - seen[-1]) % TWO_PI > DEG * 0.01) & ((coarse - seen[-1]) % TWO_PI < TWO_PI - (last - first))
        ]
        coarse = np.concatenate([seen, seen[-1] + np.sort((rest - seen[-1]) % TWO_PI)])
    return axes.columns(coarse, lat) if axes.matrix is None else np.ascontiguousarray(cartesian(coarse, lat).T)


def prepare_edges(ctx: Context) -> Strokes:
    """Return the constellation edges, to be traced."""
    sky = ctx.sky["edges"]

    def finish(drawn: Trace) -> tuple[Layer, None]:
        points, ends = drawn.polylines(sky.starts[[0, -1]])[0]
        marks = (Lines("edge", points, ends, GRID, dash=True),) if len(points) else ()
        return Layer("edges", marks, edges_key(ctx)), None

    return Strokes(ctx.to_camera(sky.columns), sky.starts, finish)


def edges_key(ctx: Context) -> object:
    """Return what the layer of constellation edges depends on."""
    return (ctx.sky.key("edges"), ctx.view_key)

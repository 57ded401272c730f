"""Overlays on the page: marks of rows, arrows to the catalogue's stars, outlines of images with north and east."""

from typing import TYPE_CHECKING

import numpy as np

from colure.arrays import Float
from colure.clipping import lines
from colure.marks import DIVISION, GRID, I64, Discs, Layer, Lines, Mark, Segments, Symbols
from colure.scene.context import Context, in_page

if TYPE_CHECKING:  # a start without overlays loads none of their modules
    from colure.overlays.skylayer import OverlaySky

SHAPES = ("cross", "diamond", "triangle", "square")
"""The marks that overlays take in turn, beside their colours."""
SIZE, CROWD = 4.2, 2500
"""Half-size of a mark in pixels; where more than CROWD rows are shown, each is a dot."""
DOT = np.array([1.5], np.float32)
CELL = 3.0
_ROW_BITS = 40
HEAD, HEAD_ANGLE, LEAST_ARROW = 6.0, 0.42, 2.0
MOST_ARROWS = 3000
"""Length in pixels and half-angle of an arrow's head; shorter arrows are not drawn, and of more than the most
on the map every so-many-th is."""


def ref(place: int, rows: I64) -> I64:
    """Return what marks of an overlay refer to: its place in the session's list and the row in its table."""
    return np.asarray(rows, dtype=np.int64) + (place << _ROW_BITS)


def unref(number: int) -> tuple[int, int]:
    """Return the place of the overlay and the row that a mark of this layer refers to."""
    return number >> _ROW_BITS, number & ((1 << _ROW_BITS) - 1)


def key(ctx: Context) -> object:
    """Return what the layer of overlays depends on."""
    return (ctx.sky.key("overlays"), ctx.view_key)


def build(ctx: Context) -> Layer:
    """Return the layer of overlays, the first of the list at the bottom."""
    marks: list[Mark] = []
    shown = total = 0
    for sky in ctx.sky["overlays"]:
        marks += _image(ctx, sky)
        if sky.foot.shape[1]:
            marks += _arrows(ctx, f"overlay.{sky.place}", sky.colour, sky.foot, sky.tip)
        if sky.columns.shape[1]:
            mark, inside = _rows(ctx, sky)
            marks.append(mark)
            shown += len(mark.xy)
            total += inside
    return Layer("overlays", tuple(marks), key(ctx), shown=shown, total=total)


def _rows(ctx: Context, sky: "OverlaySky") -> tuple[Symbols | Discs, int]:
    """Return the marks of a table's rows, one at most in each cell, and how many rows are on the map."""
    camera = ctx.to_camera(sky.columns)
    numbers = None
    if not ctx.projector.projection.unrolled and ctx.window.cap < 3.1:
        numbers = np.flatnonzero(camera[2] >= np.cos(ctx.window.cap))
        camera = camera[:, numbers]
    x, y = ctx.projector.to_page(camera)
    on = in_page(ctx, x, y)
    if ctx.projector.projection.name == "mercator":
        on &= ctx.projector.on_sky(camera)
    inside = np.flatnonzero(on)
    keep = inside[_first_in_cell(x[inside] - (ctx.frame[0] - 16.0), y[inside] - (ctx.frame[1] - 16.0))]
    xy = np.stack([x[keep], y[keep]], axis=1).astype(np.float32)
    crowded = len(keep) > CROWD
    rows = keep if numbers is None else numbers[keep]
    zeros = np.zeros(len(keep), np.uint8)
    role, refs = f"overlay.{sky.place}", ref(sky.place, rows)
    if crowded:
        return Discs(role, xy, zeros, zeros, DOT, refs, sky.colour), len(inside)
    shape = SHAPES[sky.place % len(SHAPES)]
    size = np.full((len(keep), 2), SIZE, np.float32)
    return Symbols(role, (shape,), zeros, xy, size, zeros.astype(np.float32), refs, sky.colour), len(inside)


def _first_in_cell(x: Float, y: Float) -> I64:
    """Return the numbers, ascending, of the first point in each cell of CELL pixels; x, y are not negative."""
    if not len(x):
        return np.empty(0, np.int64)
    column = (x * (1.0 / CELL)).astype(np.int64)
    row = (y * (1.0 / CELL)).astype(np.int64)
    width = int(column.max()) + 1
    cell = row * width + column
    owner = np.empty(width * (int(row.max()) + 1), dtype=np.int64)
    numbers = np.arange(len(x))
    # Written backwards, the first of a cell stays: which row is shown does not depend on what follows it.
    owner[cell[::-1]] = numbers[::-1]
    return np.flatnonzero(owner[cell] == numbers)


def _image(ctx: Context, sky: "OverlaySky") -> list[Mark]:
    marks: list[Mark] = []
    role, colour = f"overlay.{sky.place}", sky.colour
    for part, weight, dotted in ((sky.grid, GRID, True), (sky.outline, DIVISION, False)):
        if part is not None:
            points, starts = lines(ctx.window, ctx.to_camera(part.columns), part.starts)
            if len(points):
                marks.append(Lines(role, points, starts, weight, colour, dotted=dotted))
    if sky.arrows is not None:
        marks += _arrows(ctx, role, colour, sky.arrows.columns[:, ::2], sky.arrows.columns[:, 1::2])
    return marks


def _arrows(ctx: Context, role: str, colour: str, foot: Float, tip: Float) -> list[Mark]:
    """Return arrows between directions (3, M); they have heads where the whole arrow is on the page."""
    camera = ctx.to_camera(foot)
    x, y = ctx.projector.to_page(camera)
    at = np.flatnonzero(in_page(ctx, x, y) & ctx.projector.on_sky(camera))
    at = at[:: -(-len(at) // MOST_ARROWS) or 1]
    ends = np.empty((3, 2 * len(at)), dtype=foot.dtype)
    ends[:, ::2], ends[:, 1::2] = foot[:, at], tip[:, at]
    camera = ctx.to_camera(ends)
    x, y = ctx.projector.to_page(camera)
    good = in_page(ctx, x, y) & ctx.projector.on_sky(camera)
    both = good[::2] & good[1::2]
    xy = np.stack([x[::2][both], y[::2][both], x[1::2][both], y[1::2][both]], axis=1)
    dx, dy = xy[:, 2] - xy[:, 0], xy[:, 3] - xy[:, 1]
    length = np.hypot(dx, dy)
    # A chord that crosses the page is a bend or a seam of the projection: such an arrow is cut as a line.
    straight = length < 0.25 * (ctx.frame[2] - ctx.frame[0])
    seen = straight & (length >= LEAST_ARROW)
    xy, dx, dy, length = xy[seen], dx[seen], dy[seen], length[seen]
    head = np.minimum(HEAD, 0.5 * length) / length
    strokes = [xy]
    for side in (HEAD_ANGLE, -HEAD_ANGLE):
        c, s = np.cos(np.pi - side), np.sin(np.pi - side)
        strokes.append(
            np.stack([xy[:, 2], xy[:, 3], xy[:, 2] + head * (c * dx - s * dy), xy[:, 3] + head * (s * dx + c * dy)], 1)
        )
    marks: list[Mark] = []
    if len(xy):
        marks.append(Segments(role, np.concatenate(strokes).astype(np.float32), GRID, colour))
    rest = np.flatnonzero(good[::2] | good[1::2])
    rest = rest[~np.isin(rest, np.flatnonzero(both)[straight])]
    if len(rest):
        parts = ends[:, np.stack([2 * rest, 2 * rest + 1], axis=1).reshape(-1)]
        points, starts = lines(ctx.window, ctx.to_camera(parts), np.arange(0, 2 * len(rest) + 1, 2, dtype=np.int32))
        if len(points):
            marks.append(Lines(role, points, starts, GRID, colour))
    return marks

"""Deep-sky objects and the points of the ecliptic on the page: map symbols, as large as the object where that shows."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colure import deepsky as objects
from colure.arrays import Float
from colure.marks import Layer, Symbols
from colure.scene.context import Context, in_page, on_page
from colure.sky_fixed import SYMBOLS, DeepSky, NamesSky
from colure.sky_layers import widths_em

LEAST = 3.6
"""Least half-axis of a symbol in pixels."""


@dataclass(frozen=True, slots=True, eq=False)
class Spots:
    """What of the deep sky asks for a text: directions (3, N), rows, radii in pixels and texts."""

    columns: Float
    rows: NDArray[np.int64]
    radius: NDArray[np.float32]
    texts: tuple[str, ...]
    width_em: NDArray[np.float32]


def limit_of(ctx: Context) -> float:
    """Return the magnitude down to which objects are shown: they are harder to see than stars, and need room."""
    if ctx.view.width_deg >= 30.0:
        return ctx.limit - 0.8
    return ctx.limit + 1.0 if ctx.view.width_deg >= 5.0 else 100.0


def build(ctx: Context) -> tuple[Layer, Spots | None]:
    """Return the layer of symbols, and what of them asks for a text."""
    sky: DeepSky = ctx.sky["deep sky"]
    count = int(np.searchsorted(sky.magnitude, limit_of(ctx)))
    xy, on = on_page(ctx, sky.columns[:, :count], 20.0)
    at = np.flatnonzero(on)
    if not len(at):
        return Layer("deep sky", (), key(ctx)), None
    step = 1e-5
    x, y = ctx.projector.to_page(ctx.projector.to_camera(sky.columns[:, at] + step * sky.axis[:, at]))
    dx, dy = x - xy[at, 0], y - xy[at, 1]
    # The scale along the axis from the page itself; differences of float32 pixels are too coarse for it.
    camera = ctx.projector.to_camera(np.ascontiguousarray(sky.columns[:, at]))
    x0, y0 = ctx.projector.to_page(camera)
    dx, dy = x - x0, y - y0
    # Where a sheet is drawn out, as at its poles, an outline of one scale would be far too large.
    scale = np.minimum(np.hypot(dx, dy) / step, 2.0 * ctx.scale)
    size = sky.half[at] * scale[:, None]
    real = size[:, 0] > LEAST
    floor = np.maximum(size[:, 1], 0.45 * size[:, 0])
    shape = np.where(real[:, None], np.stack([size[:, 0], np.maximum(floor, 1.5)], axis=1), LEAST)
    galaxy = sky.symbol[at] == 0
    shape[~real & galaxy] = (LEAST + 1.0, 2.2)
    # Only galaxies are drawn along their axis; the other symbols stand upright.
    angle = np.where(galaxy, np.arctan2(dy, dx), 0.0)
    round_ones = ~galaxy
    shape[round_ones] = shape[round_ones].max(axis=1)[:, None]
    inside = in_page(ctx, xy[at, 0], xy[at, 1], 0.0)
    mark = Symbols(
        "deepsky",
        SYMBOLS,
        sky.symbol[at],
        xy[at],
        shape.astype(np.float32),
        angle.astype(np.float32),
        sky.ids[at],
    )
    # Messier's objects are named on every chart, the rest where the field is small.
    inside &= (sky.messier[at] > 0) | (ctx.view.width_deg < 30.0)
    named = at[inside]
    texts = _texts(sky, named)
    spots = Spots(
        sky.columns[:, named],
        sky.ids[named],
        shape[inside].max(axis=1).astype(np.float32),
        texts,
        widths_em(texts, "label.deepsky"),
    )
    return Layer("deep sky", (mark,), key(ctx), shown=len(at), total=len(at)), spots


def _texts(sky: DeepSky, at: NDArray[np.intp]) -> tuple[str, ...]:
    """Return short names; the list of names is read only for what is not Messier's."""
    return tuple(
        f"M {messier}" if messier else objects.names(int(row))[0]
        for messier, row in zip(sky.messier[at].tolist(), sky.ids[at].tolist(), strict=True)
    )


def key(ctx: Context) -> object:
    """Return what the layer depends on."""
    return (ctx.sky.key("deep sky"), ctx.view_key, ctx.limit)


def points(ctx: Context) -> Layer:
    """Return the layer of equinoxes, solstices and poles, and of the crossings into constellations."""
    # Equinoxes and solstices, the first four points, are circles with a dot; poles and crossings are crosses.
    circles_first = {"points": 4, "crossings": 0}
    shown = [name for name in circles_first if name in ctx.sky.layers]
    groups: list[NamesSky] = [ctx.sky[name] for name in shown]
    columns = groups[0].columns if len(groups) == 1 else np.concatenate([group.columns for group in groups], axis=1)
    xy, on = on_page(ctx, columns, 4.0)
    marks: list[Symbols] = []
    begin = 0
    for name, group in zip(shown, groups, strict=True):
        end = begin + group.columns.shape[1]
        if mark := _points(xy[begin:end], on[begin:end], circles_first[name]):
            marks.append(mark)
        begin = end
    return Layer("points", tuple(marks), points_key(ctx))


def points_key(ctx: Context) -> object:
    """Return what the layer of points depends on."""
    return (*(ctx.sky.key(name) for name in ("points", "crossings") if name in ctx.sky.layers), ctx.view_key)


def _points(xy: NDArray[np.float32], on: NDArray[np.bool_], first_cross: int) -> Symbols | None:
    """Return points as circles with a dot up to a row, and as crosses from it on."""
    at = np.flatnonzero(on)
    if not len(at):
        return None
    return Symbols(
        "point",
        ("point", "cross"),
        np.where(at < first_cross, 0, 1).astype(np.uint8),
        xy[at],
        np.full((len(at), 2), 3.2, np.float32),
        np.zeros(len(at), np.float32),
        at.astype(np.int64),
    )

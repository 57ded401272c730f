"""Sun, Moon and planets on the page: at true size where that can be seen, else as marks, with their phases."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from colure.arrays import Float, cross
from colure.marks import F32, Bodies, Layer
from colure.scene.context import Context, in_page

MARKS = {"sun": 7.5, "moon": 7.5, "venus": 5.2, "jupiter": 5.2, "mars": 4.4, "saturn": 4.6, "mercury": 3.8}
"""Least radius in pixels of a body's mark: its rank on a map, where its own size would not show."""
SMALL = 3.2
"""The same for every other body."""
PHASE_FROM = 4.0
"""A planet shows its phase from this true radius on, in pixels."""


@dataclass(frozen=True, slots=True, eq=False)
class Shown:
    """The bodies on the page, the largest marks first: names, positions and radii in pixels."""

    names: tuple[str, ...]
    xy: F32
    radius: F32


def build(ctx: Context) -> tuple[Layer, Shown]:
    """Return the layer of bodies and which are shown."""
    sky = ctx.sky["bodies"]
    wanted, marks, moon = _wanted(sky.names, ctx.sky.session.bodies, ctx.view.centre.body)
    if not len(wanted):
        return Layer("bodies", (), key(ctx)), Shown((), np.empty((0, 2), np.float32), np.empty(0, np.float32))
    # The nearest last: it is drawn over the others.
    order = (-sky.distance_au[wanted]).argsort(kind="stable")
    at, mark = wanted[order], marks[order]
    xy, limb, scale, shown = _laid(ctx, sky.vectors[at], sky.towards_sun[at])
    true = sky.radius[at] * scale
    radius = np.maximum(true, mark)
    true_size = true >= mark
    phased = moon[order] | (true_size & (true >= PHASE_FROM))
    lit = np.where(phased, sky.lit[at], 1.0)
    shown &= in_page(ctx, xy[:, 0], xy[:, 1], radius)
    keep = shown.nonzero()[0]
    names = [sky.names[i] for i in at.tolist()]
    pixel, reach = xy.astype(np.float32), radius.astype(np.float32)
    bodies = Bodies(
        tuple(names[i] for i in keep.tolist()),
        pixel[keep],
        reach[keep],
        lit[keep].astype(np.float32),
        limb[keep].astype(np.float32),
        true_size[keep],
        at[keep].astype(np.int64),
    )
    largest = keep[(-mark[keep]).argsort(kind="stable")]
    listed = Shown(tuple(names[i] for i in largest.tolist()), pixel[largest], reach[largest])
    return Layer("bodies", (bodies,), key(ctx), shown=len(keep), total=len(at)), listed


@lru_cache(maxsize=16)
def _wanted(
    names: tuple[str, ...], chosen: tuple[str, ...], centre: str | None
) -> tuple[NDArray[np.intp], Float, NDArray[np.bool_]]:
    """Return the places in `names` of the bodies to be drawn, the least radii of their marks, and which is the Moon."""
    wanted = [i for i, name in enumerate(names) if name in chosen]
    if centre in names and centre not in chosen:
        wanted.append(names.index(centre))
    marks = np.array([MARKS.get(names[i], SMALL) for i in wanted])
    return np.array(wanted, dtype=np.intp), marks, np.array([names[i] == "moon" for i in wanted], dtype=bool)


def _laid(ctx: Context, vectors: Float, towards_sun: Float) -> tuple[Float, Float, Float, NDArray[np.bool_]]:
    """Return page positions (B, 2), the direction of the bright limb, pixels per radian, and what is on the sky."""
    step, n = 1e-5, len(vectors)
    # A step so short leaves the length of a vector as it is.
    here = np.concatenate([vectors, vectors + step * towards_sun, vectors + step * cross(vectors, towards_sun)])
    camera = ctx.projector.to_camera(np.ascontiguousarray(here.T))
    x, y = ctx.projector.to_page(camera)
    along_x, along_y = x[n : 2 * n] - x[:n], y[n : 2 * n] - y[:n]
    # The mean of two perpendicular scales: a disc stays a disc, of about the area that its ellipse would have.
    area = np.abs(along_x * (y[2 * n :] - y[:n]) - along_y * (x[2 * n :] - x[:n]))
    scale = np.sqrt(area) / step
    xy = np.stack([x[:n], y[:n]], axis=1)
    on_sky = ctx.projector.on_sky(camera[:, :n])
    return xy, np.arctan2(along_y, along_x), np.where(scale > 0.0, scale, ctx.scale), on_sky


def key(ctx: Context) -> object:
    """Return what the layer of bodies depends on."""
    return (ctx.sky.key("bodies"), ctx.sky.session.bodies, ctx.view_key)

"""Sun, Moon and planets on the page: at true size where that can be seen, else as marks, with their phases."""

from dataclasses import dataclass

import numpy as np

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
    wanted = [i for i, name in enumerate(sky.names) if name in ctx.sky.session.bodies]
    centre = ctx.view.centre.body
    if centre in sky.names and centre not in ctx.sky.session.bodies:
        wanted.append(sky.names.index(centre))
    at = np.array(sorted(wanted, key=lambda i: -float(sky.distance_au[i])), dtype=np.intp)
    if not len(at):
        return Layer("bodies", (), key(ctx)), Shown((), np.empty((0, 2), np.float32), np.empty(0, np.float32))
    xy, limb, scale = _laid(ctx, sky.vectors[at], sky.towards_sun[at])
    true = sky.radius[at] * scale
    names = [sky.names[i] for i in at]
    mark = np.array([MARKS.get(name, SMALL) for name in names])
    radius = np.maximum(true, mark)
    true_size = true >= mark
    phased = np.array([name == "moon" for name in names]) | (true_size & (true >= PHASE_FROM))
    lit = np.where(phased, sky.lit[at], 1.0)
    camera = ctx.projector.to_camera(np.ascontiguousarray(sky.vectors[at].T))
    shown = ctx.projector.on_sky(camera)
    shown &= in_page(ctx, xy[:, 0], xy[:, 1], radius)
    keep = np.flatnonzero(shown)
    bodies = Bodies(
        tuple(names[i] for i in keep),
        xy[keep].astype(np.float32),
        radius[keep].astype(np.float32),
        lit[keep].astype(np.float32),
        limb[keep].astype(np.float32),
        true_size[keep],
        at[keep].astype(np.int64),
    )
    order = keep[np.argsort(-mark[keep], kind="stable")]
    listed = Shown(tuple(names[i] for i in order), xy[order].astype(np.float32), radius[order].astype(np.float32))
    return Layer("bodies", (bodies,), key(ctx), shown=len(keep), total=len(at)), listed


def _laid(ctx: Context, vectors: Float, towards_sun: Float) -> tuple[Float, Float, Float]:
    """Return page positions (B, 2), the direction of the bright limb on the page, and pixels per radian there."""
    step = 1e-5
    here = np.concatenate([vectors, vectors + step * towards_sun, vectors + step * cross(vectors, towards_sun)])
    here /= np.sqrt((here * here).sum(axis=1))[:, None]
    x, y = ctx.projector.to_page(ctx.projector.to_camera(np.ascontiguousarray(here.T)))
    page = np.stack([x, y], axis=1).reshape(3, -1, 2)
    along, across = page[1] - page[0], page[2] - page[0]
    # The mean of two perpendicular scales: a disc stays a disc, of about the area that its ellipse would have.
    area = np.abs(along[:, 0] * across[:, 1] - along[:, 1] * across[:, 0])
    scale = np.sqrt(area) / step
    return page[0], np.arctan2(along[:, 1], along[:, 0]), np.where(scale > 0.0, scale, ctx.scale)


def key(ctx: Context) -> object:
    """Return what the layer of bodies depends on."""
    return (ctx.sky.key("bodies"), ctx.sky.session.bodies, ctx.view_key)

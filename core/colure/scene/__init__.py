"""From the sky to the page: `build` lays every layer out in logical pixels and remembers where the labels stood.

    sky.compute(session, previous)  →  scene.build(sky, size, ratio, previous)  →  a painter

A layer is laid out anew only when its own part of the sky or the view has changed; else the very same Layer object is
handed on, so that a painter may keep what it made of it.
"""

from collections.abc import Callable
from typing import Any

from colure.marks import Layer, Scene
from colure.scene import bodies, circles, deepsky, furniture, names, overlays, rim, stars, zones
from colure.scene.context import Context, context
from colure.scene.strokes import Strokes, draw
from colure.sky import Sky

__all__ = ["build"]

_ORDER = (
    "sky",
    "milky way",
    "belt",
    "grid",
    "edges",
    "circles",
    "deep sky",
    "stars",
    "overlays",
    "points",
    "outline",
    "bodies",
    "labels",
    "rim",
    "title",
    "caution",
)


def build(sky: Sky, size: tuple[int, int], ratio: float = 1.0, previous: Scene | None = None) -> Scene:
    """Return the chart of a sky on a page of `size` = (width, height) logical pixels.

    `ratio` is device pixels per logical pixel (marks do not depend on it). `previous` gives label positions to keep and
    layers to hand on; a still passes none.
    """
    kept: dict[str, tuple[Layer, Any]] = previous.memo if previous is not None and previous.memo is not None else {}
    ctx = context(sky, size, kept)
    has = sky.layers
    ctx.layer("sky", ctx.page_key, lambda: (zones.sky_disc(ctx), None))
    ctx.layer("outline", ctx.page_key, lambda: (zones.outline(ctx), None))
    if "milky way" in has:
        ctx.layer("milky way", (sky.key("milky way"), ctx.view_key), lambda: (zones.milky_way(ctx), None))
    lined: list[tuple[str, object, Callable[[], Strokes]]] = [
        ("circles", circles.key(ctx), lambda: circles.prepare(ctx))
    ]
    if "belt" in has:
        lined.append(("belt", zones.belt_key(ctx), lambda: zones.prepare_belt(ctx)))
    if "grid" in has:
        lined.append(("grid", circles.grid_key(ctx), lambda: circles.prepare_grid(ctx)))
    if "edges" in has:
        lined.append(("edges", zones.edges_key(ctx), lambda: zones.prepare_edges(ctx)))
    draw(ctx, lined)
    curves = ctx.made["circles"][1]
    if "deep sky" in has:
        ctx.layer("deep sky", deepsky.key(ctx), lambda: deepsky.build(ctx))
    shown = ctx.layer("stars", stars.key(ctx), lambda: stars.build(ctx)) if "stars" in has else None
    if "overlays" in has:
        ctx.layer("overlays", overlays.key(ctx), lambda: (overlays.build(ctx), None))
    if "points" in has or "crossings" in has:
        ctx.layer("points", deepsky.points_key(ctx), lambda: (deepsky.points(ctx), None))
    listed = ctx.layer("bodies", bodies.key(ctx), lambda: bodies.build(ctx))
    memory = previous.placement if previous is not None else None
    labels_key = _labels_key(ctx)
    placement = ctx.layer("labels", labels_key, lambda: names.build(ctx, curves, shown, listed, memory, labels_key))
    ctx.layer("rim", rim.key(ctx), lambda: (rim.build(ctx), None))
    ctx.layer("title", furniture.title_key(ctx), lambda: (furniture.title(ctx), None))
    warning = furniture.warning(ctx)
    ctx.layer("caution", (warning, ctx.page), lambda: (furniture.caution(ctx, warning, (warning, ctx.page)), None))
    layers = tuple(ctx.made[name][0] for name in _ORDER if name in ctx.made)
    notes = (*sky.notes, *((warning,) if warning else ()), *_counts(layers))
    return Scene(size[0], size[1], ratio, ctx.frame, layers, ctx.projector, placement, notes, ctx.made)


def _labels_key(ctx: Context) -> object:
    """Return what the texts depend on: the very layers that they stand beside."""
    beside = ("circles", "belt", "deep sky", "stars", "overlays", "points", "bodies")
    named = ("star names", "constellations", "points", "crossings")
    texts = tuple(ctx.sky.key(name) for name in named if name in ctx.sky.layers)
    return (tuple(ctx.made[name][0].key for name in beside if name in ctx.made), texts)


def _counts(layers: tuple[Layer, ...]) -> tuple[str, ...]:
    """Return a remark for each layer that shows fewer objects than there are on the map."""
    return tuple(
        f"{layer.name}: {layer.shown} of {layer.total} shown, one in each 3-pixel cell"
        for layer in layers
        if layer.name in ("stars", "overlays") and layer.shown < layer.total
    )

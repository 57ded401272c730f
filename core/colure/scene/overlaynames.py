"""Texts of overlays: titles of images, the letters of their arrows, and names of rows where these are asked for."""

import numpy as np

from colure.fontmetrics import PX_PER_PT
from colure.labels import Request, around
from colure.scene.context import Context, on_page
from colure.scene.wanted import Wanted, height

CODE = 15 << 56
"""First part of the identity of these texts, apart from those of `colure.scene.names`."""
_ROW_BITS = 40
MOST = 60
"""Texts of one overlay that ask for a place."""
SIZE_PT = 9.0
APART = 5.5
"""Distance in pixels of a text from the mark that it names."""


def wanted(ctx: Context) -> list[Wanted]:
    """Return the texts of every overlay on the map, in the overlay's colour."""
    return [w for sky in ctx.sky["overlays"] if (w := _of(ctx, sky)) is not None]


def _of(ctx: Context, sky: object) -> Wanted | None:
    from colure.overlays.skylayer import OverlaySky

    assert isinstance(sky, OverlaySky)
    if not len(sky.texts):
        return None
    xy, on = on_page(ctx, sky.spots, 0.0)
    at = np.flatnonzero(on)[:MOST]
    if not len(at):
        return None
    half = np.empty((len(at), 2), np.float32)
    half[:, 0] = sky.width_em[at] * np.float32(0.5 * SIZE_PT * PX_PER_PT)
    half[:, 1] = 0.5 * height(SIZE_PT)
    here = xy[at]
    centres = around(here, np.full(len(at), APART, np.float32), half)
    if sky.overlay.kind == "image":  # a title stands in its image, a letter at the end of its arrow
        centres = np.concatenate([here[:, None, :], centres], axis=1)
    ids = CODE + (sky.place << _ROW_BITS) + sky.rows[at]
    return Wanted(
        "label.overlay",
        Request(ids, centres, half),
        tuple(sky.texts[i] for i in at.tolist()),
        np.arange(len(at), dtype=np.int32),
        np.zeros(len(at), np.float32),
        SIZE_PT,
        colours=(sky.colour,) * len(at),
    )

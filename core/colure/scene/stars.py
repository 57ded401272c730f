"""Stars on the page: discs whose areas fall with magnitude on one scale, at most one in each 3-pixel cell."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from colure.marks import F32, U8, Discs, Layer
from colure.scene.context import Context, all_in_page, in_page
from colure.sky_layers import StarRows

SIZES = 24
"""Number of size classes between the faintest star shown and the brightest."""
LARGEST = 6.6
"""Radius in pixels of the brightest stars."""
SPAN_MAG = 9.5
"""Magnitudes between the faintest size and the largest: beyond, areas would differ too little from step to step."""
BRIGHTEST = -1.5
CELL = 3.0
BRIGHT_RADIUS = 2.3
"""Stars with at least this radius in pixels are never covered by a text."""
MOST_BRIGHT = 320
"""Nor are more than the brightest so many."""


@dataclass(frozen=True, slots=True, eq=False)
class Scale:
    """The one scale of a chart: areas fall evenly from magnitude `brightest` (and brighter) to its limit.

    `radii` (SIZES,) are the radii of the size classes in pixels, a geometric series.
    """

    limit: float
    brightest: float
    radii: F32

    def size(self, vmag: NDArray[np.floating]) -> U8:
        """Return the size class of magnitudes."""
        per_mag = (SIZES - 1) / (self.limit - self.brightest)
        classes = (np.float32(self.limit) - vmag) * np.float32(per_mag) + np.float32(0.5)
        return np.asarray(np.clip(classes, 0.0, SIZES - 1), dtype=np.uint8)

    @property
    def area_ratio(self) -> float:
        """By how much the area of a disc falls from one magnitude to the next."""
        return float((self.radii[0] / self.radii[-1]) ** (2.0 / (self.limit - self.brightest)))


@lru_cache(maxsize=64)
def scale_of(limit: float) -> Scale:
    """Return the scale of a chart with this magnitude limit; deep charts hold few stars, so their least is larger."""
    smallest = 0.62 if limit <= 8.5 else 0.8 if limit <= 10.5 else 1.0
    radii = smallest * (LARGEST / smallest) ** (np.arange(SIZES) / (SIZES - 1.0))
    return Scale(limit, max(BRIGHTEST, limit - SPAN_MAG), radii.astype(np.float32))


@lru_cache(maxsize=4)
def _sizes(base: StarRows, limit: float) -> U8:
    """Return the size classes of a list of stars; kept, as neither changes from frame to frame."""
    return scale_of(limit).size(base.vmag)


@dataclass(frozen=True, slots=True, eq=False)
class Shown:
    """The stars on the page that no text may cover: positions (N, 2) and radii (N,), faintest first."""

    xy: F32
    radius: F32


def build(ctx: Context) -> tuple[Layer, Shown]:
    """Return the layer of stars, and the bright ones for the labels."""
    stars = ctx.sky["stars"]
    base: StarRows = stars.base
    # Rows are sorted faintest first: what is brighter than the limit is the end of the list.
    first = base.first_brighter(ctx.limit)
    camera = ctx.projector.to_camera(stars.directions[:, first:])
    numbers: NDArray[np.intp] | None = None
    if not ctx.projector.projection.unrolled and ctx.window.cap < 3.1:
        numbers = (camera[2] >= np.cos(ctx.window.cap)).nonzero()[0]
        # Most stars of the sky are out of a small field: drop them before the projection.
        camera = camera.take(numbers, axis=1)
    x, y = ctx.projector.to_page(camera)
    inside: NDArray[np.intp] | None = None
    if not (len(x) and all_in_page(ctx, x, y)) or ctx.projector.projection.name == "mercator":
        shown = in_page(ctx, x, y)
        if ctx.projector.projection.name == "mercator":
            shown &= ctx.projector.on_sky(camera)
        inside = shown.nonzero()[0]
        x, y = x.take(inside), y.take(inside)
    keep = _thin(x - (ctx.frame[0] - 16.0), y - (ctx.frame[1] - 16.0), ctx.page.width + 32, ctx.page.height + 32)
    total = len(x)
    pairs = np.empty((total, 2), dtype=np.float32)
    pairs[:, 0], pairs[:, 1] = x, y
    xy = pairs.take(keep, axis=0)
    at = keep if inside is None else inside.take(keep)
    if numbers is not None:
        at = numbers.take(at)
    at += first
    size = _sizes(base, ctx.limit).take(at)
    radii = scale_of(ctx.limit).radii
    mark = Discs("star", xy, size, base.tint.take(at), radii, base.ids.take(at))
    layer = Layer("stars", (mark,), key(ctx), shown=len(at), total=total)
    bright = slice(max(len(at) - MOST_BRIGHT, 0), len(at))
    radius = radii[size[bright]]
    large = radius >= BRIGHT_RADIUS
    return layer, Shown(xy[bright][large], radius[large])


def key(ctx: Context) -> object:
    """Return what the layer of stars depends on."""
    return (ctx.sky.key("stars"), ctx.view_key, ctx.limit)


def _thin(x: NDArray[np.floating], y: NDArray[np.floating], width: int, height: int) -> NDArray[np.intp]:
    """Return the numbers, ascending, of the last point in each cell of CELL pixels; x, y are not negative."""
    columns = int(width / CELL) + 2
    scale = x.dtype.type(1.0 / CELL)
    # Counted in the floating point of the pixels, which hold such whole numbers exactly, and made a number once.
    cells, across = y * scale, x * scale
    np.floor(cells, out=cells)
    cells *= columns
    cells += np.floor(across, out=across)
    cell = cells.astype(np.intp)
    # Later rows are brighter and overwrite fainter ones; the table need not be cleared, as only written cells are read.
    # The smaller it is, the more of it stays near the processor.
    kind = np.uint16 if len(cell) <= 65536 else np.int32
    owner = np.empty(columns * (int(height / CELL) + 2), dtype=kind)
    numbers = np.arange(len(cell), dtype=kind)
    owner[cell] = numbers
    return np.flatnonzero(owner.take(cell) == numbers)

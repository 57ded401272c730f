"""What every layer of a scene is built from: the sky, the view on the page, and the scene before."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from colure.arrays import DEG, Float
from colure.clipping import Window
from colure.marks import Layer
from colure.projections import Projector, projector
from colure.scene.layout import Layout, layout
from colure.session import View
from colure.sky import Sky
from colure.sky_layers import limit_of

PAGE_MARGIN = 10.0
"""Pixels outside the map within which marks are kept: more than the radius of the largest star."""


FULL_PAGE = 450_000.0
"""Square pixels of a map from which on the limit depends on the width alone."""
COARSE = 3.0e4
"""Pixels per radian above which lines are laid out in float64: a float32 direction is good to 1e-7."""


@dataclass(slots=True)
class Context:
    """The inputs of one build.

    `view_key` changes whenever any direction would fall on another pixel, `page_key` only when the shape of the whole
    sky on the page does.
    """

    sky: Sky
    view: View
    page: Layout
    projector: Projector
    window: Window
    view_key: object
    page_key: object
    limit: float
    previous: dict[str, tuple[Layer, Any]]
    made: dict[str, tuple[Layer, Any]] = field(default_factory=dict)

    @property
    def frame(self) -> tuple[float, float, float, float]:
        """The map rectangle."""
        return self.page.frame

    @property
    def scale(self) -> float:
        """Pixels per radian at the centre."""
        return self.projector.scale

    @property
    def step_scale(self) -> float:
        """Pixels per radian to choose steps by: the centre's, or less where the map is squeezed, as at a pole."""
        left, top, right, bottom = self.frame
        return min(self.scale, 1.5 * float(np.hypot(right - left, bottom - top)) / self.window.radius)

    def to_camera(self, columns: Any, axes: Float | None = None) -> Any:
        """Return camera directions (3, N) of directions on ICRS axes, or on axes that a matrix (3, 3) takes there.

        In float32 where that is good to a hundredth of a pixel, which is everywhere but in small fields.
        """
        return self.turned(self.projector.camera if axes is None else self.projector.camera @ axes, columns)

    def turned(self, matrix: Float, columns: Any) -> Any:
        """Return a matrix (K, 3) times directions (3, N), in the precision that `to_camera` has."""
        if self.scale > COARSE:
            return matrix @ columns.astype(np.float64, copy=False)
        return matrix.astype(np.float32) @ columns.astype(np.float32, copy=False)

    def layer(self, name: str, key: object, make: Callable[[], tuple[Layer, Any]]) -> Any:
        """Add a layer, that of the scene before if its key is the same, and return what it holds for other layers."""
        old = self.previous.get(name)
        self.made[name] = old if old is not None and old[0].key == key else make()
        return self.made[name][1]


def projector_of(
    view: View, frame: tuple[float, float, float, float], centre: Float, pole: Float, spare: Float
) -> Projector:
    """Return the projector of a view on a map rectangle; vectors (3,) as in `sky.Axes`."""
    return projector(
        view.projection,
        centre,
        pole,
        spare,
        east_left=view.east_left,
        width=view.width_deg * DEG,
        rotation=view.rotation_deg * DEG,
        frame=frame,
    )


def context(sky: Sky, size: tuple[int, int], previous: dict[str, tuple[Layer, Any]]) -> Context:
    """Return the context of a build on a page of `size` logical pixels."""
    view = sky.session.view
    page = layout(*size)
    p = projector_of(view, page.frame, sky.axes.centre, sky.axes.pole, sky.axes.spare)
    page_key = (view.projection, size, p.plane.tobytes(), p.shift.tobytes())
    view_key = (page_key, p.camera.tobytes())
    limit = page_limit(view, page.frame)
    return Context(sky, view, page, p, Window.of(p, page.frame), view_key, page_key, limit, previous)


def page_limit(view: View, frame: tuple[float, float, float, float]) -> float:
    """Return the magnitude limit on a map: that of the view, brighter on a small map where it follows the width.

    Star counts grow by 10^0.45 a magnitude, so this keeps the stars on a square inch about the same.
    """
    limit = limit_of(view)
    if view.limit_mag is not None:
        return limit
    area = (frame[2] - frame[0]) * (frame[3] - frame[1])
    return round(limit + min(float(np.log10(max(area, 1.0) / FULL_PAGE)) / 0.45, 0.0), 1)


def in_page(ctx: Context, x: Any, y: Any, margin: Any = PAGE_MARGIN) -> Any:
    """Return which pixels (N,) lie on the map or within a margin of it."""
    left, top, right, bottom = ctx.frame
    return (x > left - margin) & (x < right + margin) & (y > top - margin) & (y < bottom + margin)


def all_in_page(ctx: Context, x: Any, y: Any, margin: float = PAGE_MARGIN) -> bool:
    """Return whether all pixels (N,), N > 0, lie on the map or within a margin of it."""
    left, top, right, bottom = ctx.frame
    across = x.min() > left - margin and x.max() < right + margin
    return bool(across and y.min() > top - margin and y.max() < bottom + margin)


def on_page(ctx: Context, columns: Any, margin: float = PAGE_MARGIN) -> tuple[Any, Any]:
    """Return page positions (N, 2) float32 of directions (3, N) on ICRS axes, and which (N,) are on the map."""
    camera = ctx.projector.to_camera(columns)
    x, y = ctx.projector.to_page(camera)
    shown = ctx.projector.on_sky(camera) & in_page(ctx, x, y, margin)
    xy = np.empty((len(x), 2), np.float32)
    xy[:, 0], xy[:, 1] = x, y
    return xy, shown

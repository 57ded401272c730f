"""The marks a chart is made of: arrays of logical pixels and strings, which any painter can draw.

Shape rule: every mark class is a set of columns of equal length N, so that a painter can draw each in one call. Pixels
are logical, x to the right and y down, float32 and not rounded (a painter that can place parts of a pixel moves stars
smoothly). Angles are radians, clockwise on the page (from +x towards +y), so that `rotate(degrees(angle))` of a y-down
painter draws them as they are. A role is what the mark is for; a theme gives it a colour, unless the mark carries the
user's own (`colour`, as `#RRGGBB`).

Roles, by layer (a suffix after a full stop is a grade of the part before it):

    paper          the whole page             sky            the disc, ellipse or rectangle that holds the sky
    milkyway.1 …   brighter and brighter      grid           coordinate lines
    edge           constellation edge         belt           the filled zone; belt.edge, belt.division its lines
    circle         a reference circle; its ticks carry the same role and colour
    star           stars, tinted              deepsky        symbols of clusters, nebulae, galaxies
    body.sun body.moon body.<planet>          rim            frame lines; rim.bar filled graduation, rim.tick
    label.star label.deepsky label.body label.constellation label.circle label.belt label.grid
    figure.circle figure.rim                  degree figures
    overlay.N      marks, arrows and outlines of the overlay at place N of the session's list; label.overlay its texts
    title legend caution                      title block, magnitude legend, warning
    legend.star                               discs of the legend
"""

from dataclasses import dataclass, field
from typing import Any, Protocol, TypeAlias

import numpy as np
from numpy.typing import NDArray

F32: TypeAlias = NDArray[np.float32]
I32: TypeAlias = NDArray[np.int32]
I64: TypeAlias = NDArray[np.int64]
U8: TypeAlias = NDArray[np.uint8]

CIRCLE, DIVISION, GRID = 3, 2, 1
"""The three line weights and no more: reference circles, divisions, and grid lines."""


@dataclass(frozen=True, slots=True, eq=False)
class Lines:
    """Polylines: polyline k is `points[starts[k]:starts[k + 1]]`; `starts` has one entry more than there are lines."""

    role: str
    points: F32
    starts: I32
    weight: int = GRID
    colour: str | None = None
    dash: bool = False
    dotted: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Segments:
    """Separate straight strokes, such as ticks: rows of `xy` (N, 4) are x1, y1, x2, y2."""

    role: str
    xy: F32
    weight: int = GRID
    colour: str | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Areas:
    """Closed rings laid out as in Lines (the last point is not repeated); filled with no outline.

    With `even_odd` all rings are one shape whose overlaps are holes; else each ring is filled by itself.
    """

    role: str
    points: F32
    starts: I32
    colour: str | None = None
    alpha: float = 1.0
    even_odd: bool = True


@dataclass(frozen=True, slots=True, eq=False)
class Discs:
    """Star discs: `xy` (N, 2), a size class and a tint class per star, and the row each stands for.

    `radii[size]` is the radius in logical pixels (sizes are quantised so that a painter can keep one picture for each);
    `tint` is a class of B−V from 0 (blue, hottest) to 6 (red, coolest), 3 being neutral or unknown. Rows are ordered
    faintest first, so that a bright star is painted over its neighbours. `refs` (N,) are row numbers in the source
    that the layer names. With a `colour` the tints are not used: all discs have it, made to stand out as lines are.
    """

    role: str
    xy: F32
    size: U8
    tint: U8
    radii: F32
    refs: I64
    colour: str | None = None


TINTS = 7
"""Number of tint classes in Discs."""


@dataclass(frozen=True, slots=True, eq=False)
class Symbols:
    """Map symbols: `kinds[kind]` names the shape, `size` (N, 2) its half-axes in pixels, `angle` its first axis.

    Shapes: `open_cluster` (dotted ring), `globular` (ring with a cross), `galaxy` (ellipse), `nebula` (square),
    `planetary` (ring with four rays), `dark` (dashed square), `cross`, `ring`, `square`, `diamond`, `triangle`, `point`
    (an equinox, a pole, a crossing).
    """

    role: str
    kinds: tuple[str, ...]
    kind: U8
    xy: F32
    size: F32
    angle: F32
    refs: I64
    colour: str | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Bodies:
    """Sun, Moon and planets, farthest first: discs with their phase.

    `radius` is the larger of the true size and the size of the magnitude scale. `lit` is the illuminated fraction of
    the disc (1 where no phase is to be drawn), `limb` (N,) the direction on the page from the centre of the disc to the
    middle of the bright limb. `true_size` marks the discs drawn at their true size. The role of a body is
    `body.<name>`; `refs` are positions in the session's list of bodies.
    """

    names: tuple[str, ...]
    xy: F32
    radius: F32
    lit: F32
    limb: F32
    true_size: NDArray[np.bool_]
    refs: I64


@dataclass(frozen=True, slots=True, eq=False)
class Labels:
    """Texts: `texts[index[i]]` stands at `xy[i]`, turned by `angle[i]`.

    `xy` is the centre of the text: the middle of its advance width, and half the height of its capitals above the
    baseline. Size is in points of 1/72 inch at 96 logical pixels to the inch (one point = 4/3 logical pixels). A `halo`
    of the paper's colour keeps the text readable where it crosses lines.
    """

    role: str
    texts: tuple[str, ...]
    index: I32
    xy: F32
    angle: F32
    size_pt: float = 9.0
    colour: str | None = None
    italic: bool = False
    bold: bool = False
    halo: bool = True


Mark: TypeAlias = Lines | Segments | Areas | Discs | Symbols | Bodies | Labels


@dataclass(frozen=True, slots=True, eq=False)
class Layer:
    """Marks that share a key: while the key of a layer is equal to that of the frame before, so is the layer itself.

    A painter may keep what it made of a Layer for as long as it meets the same object. `clip` says that the marks are
    to be cut at `Scene.frame`; `shown` of `total` objects have a mark (the rest share a 3-pixel cell with a brighter).
    """

    name: str
    marks: tuple[Mark, ...]
    key: object
    clip: bool = True
    shown: int = 0
    total: int = 0


class Projector(Protocol):
    """What a Scene asks of its projection."""

    @property
    def centre(self) -> NDArray[np.float64]:
        """The direction (3,) on ICRS axes that the view is centred on."""

    def unproject(self, xy: Any) -> NDArray[np.float64]:
        """Return unit vectors (..., 3) on ICRS axes for pixels (..., 2); NaN off the sky."""

    def project(self, vectors: Any) -> NDArray[np.float64]:
        """Return pixels (..., 2) for vectors (..., 3) on ICRS axes; NaN where they are not on the chart."""


@dataclass(frozen=True, slots=True)
class Picked:
    """What lies under the pointer: a layer, a row in that layer's source, its pixel, and how far off it is."""

    layer: str
    row: int
    x: float
    y: float
    distance: float


@dataclass(frozen=True, slots=True, eq=False)
class Scene:
    """One chart, ready to be painted: layers from back to front on a page of `width` × `height` logical pixels.

    `frame` is the map rectangle (left, top, right, bottom) inside the rim. `placement` remembers where each label
    stood, for the next frame. `notes` are remarks that belong on the chart, such as "n of m".
    """

    width: int
    height: int
    ratio: float
    frame: tuple[float, float, float, float]
    layers: tuple[Layer, ...]
    projector: Projector
    placement: Any = None
    notes: tuple[str, ...] = field(default=())
    memo: Any = None

    def layer(self, name: str) -> Layer:
        """Return a layer by name; KeyError when the scene has none of that name."""
        for candidate in self.layers:
            if candidate.name == name:
                return candidate
        raise KeyError(name)

    def unproject(self, x: float, y: float) -> NDArray[np.float64] | None:
        """Return the ICRS direction (3,) under a pixel, or None off the map or off the sky."""
        left, top, right, bottom = self.frame
        if not (left <= x <= right and top <= y <= bottom):
            return None
        vector = self.projector.unproject(np.array([x, y]))
        return None if not np.isfinite(vector).all() else vector

    def pick(self, x: float, y: float, r: float = 8.0) -> Picked | None:
        """Return the object whose mark is nearest to a pixel within `r`, or None.

        A body wins over a star, and a star over a deep-sky object, when their marks are equally near; a mark that
        covers the pixel counts as if its distance were measured from its edge.
        """
        best: Picked | None = None
        for layer in reversed(self.layers):
            for mark in layer.marks:
                if not isinstance(mark, Discs | Symbols | Bodies) or not len(mark.xy) or mark_is_legend(mark):
                    continue
                d = np.hypot(mark.xy[:, 0] - x, mark.xy[:, 1] - y)
                edge = np.maximum(d - _extent(mark), 0.0) + d * 1e-3
                at = int(np.argmin(edge))
                if edge[at] <= r and (best is None or edge[at] < best.distance):
                    px, py = mark.xy[at]
                    best = Picked(layer.name, int(mark.refs[at]), float(px), float(py), float(edge[at]))
        return best


def mark_is_legend(mark: Mark) -> bool:
    """Return whether a mark explains the chart instead of showing an object."""
    return isinstance(mark, Discs | Symbols) and mark.role.startswith("legend")


def _extent(mark: Discs | Symbols | Bodies) -> F32:
    if isinstance(mark, Discs):
        return np.asarray(mark.radii[mark.size], dtype=np.float32)
    if isinstance(mark, Symbols):
        return np.asarray(mark.size.min(axis=1), dtype=np.float32)
    return mark.radius

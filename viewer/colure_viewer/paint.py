"""Paints a Scene with a QPainter: fast on pictures and screens, as pure shapes on SVG, PDF and printers."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QRect, Qt
from PySide6.QtGui import QColor, QPaintEngine, QPainter, QPen

from colure import marks
from colure.marks import Scene
from colure_viewer import strokes
from colure_viewer.atlas import StarAtlas, TextAtlas
from colure_viewer.bodyshapes import draw_bodies
from colure_viewer.fonts import PX_PER_PT, family
from colure_viewer.primitives import Batch, fragments, lines, path, polygon
from colure_viewer.themes import Theme

F64 = NDArray[np.float64]

MAX_STAR_ATLASES = 4
PLAIN_AREAS = ("paper", "sky", "milkyway", "belt")


@dataclass
class Kit:
    """What a painter keeps between frames: pictures of stars and labels, and blocks of primitives."""

    stars: dict[tuple[object, ...], StarAtlas] = field(default_factory=dict)
    text: TextAtlas = field(default_factory=TextAtlas)
    fragments: Batch[QPainter.PixmapFragment] = field(default_factory=fragments)
    lines: Batch = field(default_factory=lines)  # type: ignore[type-arg]

    def star_atlas(self, radii: NDArray[np.float32], tints: tuple[str, ...], ratio: float) -> StarAtlas:
        """Return the discs for a table of radii, drawn at the first call."""
        key = (radii.tobytes(), tints, ratio)
        found = self.stars.get(key)
        if found is None:
            while len(self.stars) >= MAX_STAR_ATLASES:
                del self.stars[next(iter(self.stars))]
            found = self.stars[key] = StarAtlas(radii, tints, ratio)
        return found


_KIT = Kit()


def draw(scene: Scene, theme: Theme, painter: QPainter, kit: Kit | None = None) -> None:
    """Paint a whole chart at the origin of the painter's device.

    On a raster device one logical pixel of the scene is `scene.ratio` device pixels and the painter's own transform is
    set aside; on a vector device it is one unit of the painter's coordinates, and nothing is drawn as a bitmap.
    """
    if painter.paintEngine().type() == QPaintEngine.Type.Raster:
        _Raster(scene, theme, painter, _KIT if kit is None else kit).draw()
    else:
        from colure_viewer.vector import draw_vector

        draw_vector(scene, theme, painter)


class _Raster:
    """One frame on a raster device, in device pixels."""

    def __init__(self, scene: Scene, theme: Theme, painter: QPainter, kit: Kit) -> None:
        self.scene, self.theme, self.painter, self.kit = scene, theme, painter, kit
        self.ratio = scene.ratio
        self.pens: dict[str, QPen] = {}
        self.prepared: dict[int, tuple[NDArray[np.int32] | None, NDArray[np.int32] | None, NDArray[np.bool_]]] = {}
        self.methods: dict[type, Callable[..., None]] = {
            marks.Areas: self.areas,
            marks.Lines: self.lines,
            marks.Segments: self.segments,
            marks.Discs: self.discs,
            marks.Symbols: self.symbols,
            marks.Bodies: self.bodies,
            marks.Labels: self.labels,
        }

    def draw(self) -> None:
        """Paint the page, then the layers from back to front."""
        painter, ratio, scene = self.painter, self.ratio, self.scene
        if self.kit.text.full:
            self.kit.text.clear()
        painter.save()
        painter.resetTransform()
        own = painter.device().devicePixelRatioF()
        if own != 1.0:
            painter.scale(1.0 / own, 1.0 / own)
        painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, False)
        page = QRect(0, 0, round(scene.width * ratio), round(scene.height * ratio))
        painter.fillRect(page, QColor(self.theme.colour("paper")))
        left, top, right, bottom = (round(v * ratio) for v in scene.frame)
        frame = QRect(left, top, right - left, bottom - top)
        clipped = False
        # Every missing label is drawn before any is used, so that the growing picture is handed to Qt once a frame.
        for layer in scene.layers:
            for mark in layer.marks:
                if isinstance(mark, marks.Labels):
                    self.prepare(mark)
        for layer in scene.layers:
            if layer.clip != clipped:
                clipped = layer.clip
                if clipped:
                    painter.setClipRect(frame)
                else:
                    painter.setClipping(False)
            for mark in layer.marks:
                self.methods[type(mark)](mark)
        painter.restore()

    def _pen(self, colour: str) -> None:
        pen = self.pens.get(colour)
        if pen is None:
            pen = QPen(QColor(colour), 1.0)
            # Flat ends: two strokes that meet do not overlap into a bead.
            pen.setCapStyle(Qt.PenCapStyle.FlatCap)
            self.pens[colour] = pen
        self.painter.setPen(pen)
        self.painter.setBrush(Qt.BrushStyle.NoBrush)
        self.painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)

    def areas(self, mark: marks.Areas) -> None:
        """Fill rings."""
        painter = self.painter
        colour = QColor(mark.colour or self.theme.colour(mark.role))
        colour.setAlphaF(mark.alpha)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour)
        # Smooth edges cost ten times as much: these are hidden under a line, or too faint to show their steps.
        plain = mark.role.startswith(PLAIN_AREAS)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, not plain)
        points = mark.points * np.float32(self.ratio)
        if mark.even_odd and len(mark.starts) > 2:
            painter.drawPath(path(points, mark.starts))
        else:
            for a, b in zip(mark.starts[:-1].tolist(), mark.starts[1:].tolist(), strict=True):
                painter.drawPolygon(polygon(points[a:b]))

    def lines(self, mark: marks.Lines) -> None:
        """Draw polylines as parallels one pixel wide, or as short strokes where they are dashed."""
        if len(mark.points) < 2:
            return
        points = mark.points.astype(np.float64) * self.ratio
        if mark.dash or mark.dotted:
            stroke, gap = strokes.DOT if mark.dotted else strokes.DASH
            cut = strokes.dashes(points, mark.starts, stroke * self.ratio, gap * self.ratio)
            self._strokes(cut, self.theme.line(mark.role, mark.colour), mark.weight)
            return
        self._pen(self.theme.line(mark.role, mark.colour))
        places = strokes.offsets(mark.weight, self.ratio)
        normal = strokes.normals(points, mark.starts) if len(places) > 1 else None
        for place in places:
            moved = points if normal is None else points + place * normal
            if len(mark.starts) == 2:
                self.painter.drawPolyline(polygon(moved))
            else:
                self.painter.drawPath(path(moved, mark.starts))

    def _strokes(self, xy: F64, colour: str, weight: int) -> None:
        """Draw separate strokes (N, 4), given in device pixels."""
        count = len(xy)
        if not count:
            return
        self._pen(colour)
        places = strokes.offsets(weight, self.ratio)
        rows = self.kit.lines.rows(count)
        if len(places) > 1:
            along = xy[:, 2:] - xy[:, :2]
            length = np.maximum(np.hypot(along[:, 0], along[:, 1]), 1e-9)
            across = np.stack([-along[:, 1] / length, along[:, 0] / length], axis=-1)
            across = np.concatenate([across, across], axis=-1)
        for place in places:
            rows[...] = xy if len(places) == 1 else xy + place * across
            self.painter.drawLines(self.kit.lines.first(), count)

    def segments(self, mark: marks.Segments) -> None:
        """Draw ticks."""
        self._strokes(mark.xy.astype(np.float64) * self.ratio, self.theme.line(mark.role, mark.colour), mark.weight)

    def discs(self, mark: marks.Discs) -> None:
        """Draw stars from the atlas."""
        count = len(mark.xy)
        if not count:
            return
        tints = (
            self.theme.tints
            if mark.role.startswith(("star", "legend"))
            else (self.theme.colour(mark.role),) * marks.TINTS
        )
        atlas = self.kit.star_atlas(mark.radii, tints, self.ratio)
        atlas.fill(self.kit.fragments.rows(count), mark.xy, mark.size, mark.tint, self.ratio)
        # With antialiasing on, every fragment would be drawn as a filled shape, twice as slowly.
        self.painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        self.painter.drawPixmapFragments(self.kit.fragments.first(), count, atlas.pixmap)

    def symbols(self, mark: marks.Symbols) -> None:
        """Draw map symbols, a batch of strokes for all of them."""
        colour = self.theme.line(mark.role, mark.colour)
        xy, size = mark.xy.astype(np.float64) * self.ratio, mark.size.astype(np.float64) * self.ratio
        parts = [
            strokes.symbols(name, xy[chosen], size[chosen], mark.angle[chosen])
            for number, name in enumerate(mark.kinds)
            if (chosen := mark.kind == number).any()
        ]
        if parts:
            self._strokes(np.concatenate(parts), colour, marks.GRID)

    def bodies(self, mark: marks.Bodies) -> None:
        """Draw Sun, Moon and planets with their phases."""
        self.painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
        draw_bodies(self.painter, mark, self.theme, self.ratio)

    def _tiles(self, mark: marks.Labels, turned: bool) -> NDArray[np.int32]:
        """Return the tile of each text of a mark, drawing those that are missing."""
        scale = self.ratio * (2.0 if turned else 1.0)
        face = (family(mark.role), mark.size_pt * PX_PER_PT, mark.italic, mark.bold)
        halo = self.theme.colour("sky") if mark.halo else None
        return self.kit.text.tiles(mark.texts, face, self.theme.text(mark.role, mark.colour), halo, scale)

    def prepare(self, mark: marks.Labels) -> None:
        """Find or draw the texts of a mark, level or turned as they are needed."""
        turned = mark.angle != 0.0
        if not len(mark.index):
            self.prepared[id(mark)] = (None, None, turned)
            return
        some, every = turned.any(), turned.all()
        self.prepared[id(mark)] = (
            None if every else self._tiles(mark, False),
            self._tiles(mark, True) if some else None,
            turned,
        )

    def labels(self, mark: marks.Labels) -> None:
        """Draw texts from the atlas: level ones on whole pixels, turned ones from a finer picture."""
        level, turned, which = self.prepared[id(mark)]
        if level is not None:
            self._texts(mark, level, None if turned is None else ~which, 1.0)
        if turned is not None:
            self._texts(mark, turned, None if level is None else which, 2.0)

    def _texts(
        self, mark: marks.Labels, tiles: NDArray[np.int32], chosen: NDArray[np.bool_] | None, fineness: float
    ) -> None:
        index, xy, angle = mark.index, mark.xy, mark.angle
        if chosen is not None:
            index, xy, angle = index[chosen], xy[chosen], angle[chosen]
        table = self.kit.text.table[tiles[index]]
        count = len(index)
        rows = self.kit.fragments.rows(count)
        rows[:, 2:6] = table[:, :4]
        rows[:, 6] = rows[:, 7] = 1.0 / fineness
        rows[:, 9] = 1.0
        half = table[:, 2:4] / 2.0
        # From the anchor to the centre of the tile, in device pixels.
        reach = (half - table[:, 4:6]) / fineness
        turned = fineness != 1.0
        if turned:
            c, s = np.cos(angle), np.sin(angle)
            rows[:, 0] = xy[:, 0] * self.ratio + reach[:, 0] * c - reach[:, 1] * s
            rows[:, 1] = xy[:, 1] * self.ratio + reach[:, 0] * s + reach[:, 1] * c
            rows[:, 8] = np.degrees(angle)
        else:
            rows[:, :2] = np.rint(xy * self.ratio + reach - half) + half
            rows[:, 8] = 0.0
        painter = self.painter
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, turned)
        painter.drawPixmapFragments(self.kit.fragments.first(), count, self.kit.text.pixmap)
        painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, False)

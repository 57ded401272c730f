"""Paints a Scene with a QPainter: fast on pictures and screens, as pure shapes on SVG, PDF and printers."""

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cache, lru_cache
from itertools import groupby, pairwise

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QRect, Qt
from PySide6.QtGui import QBrush, QColor, QImage, QPaintEngine, QPainter, QPen

from colure import marks
from colure.marks import Scene
from colure_viewer import strokes
from colure_viewer.atlas import StarAtlas
from colure_viewer.bodyshapes import draw_bodies
from colure_viewer.lettering import Lettering
from colure_viewer.primitives import Batch, fragments, lines, passing, path
from colure_viewer.themes import Theme, mix

F64 = NDArray[np.float64]

MAX_STAR_ATLASES = 12
FEW_STARS = 12000
"""Up to this many, fetching the page in bands costs more than the waiting."""
FEW_POINTS = 200
FEW_LINES = 16
"""Room for the bounds of twelve signs: up to so many a call for each costs less than a path of all."""
BAND_BYTES = 524288
"""Bytes of a picture that stay in the second-level cache of common processors, with room beside them."""
LARGE_STAR = 4
"""Radius in device pixels from which a disc is drawn after the bands."""
NO_BRUSH = QBrush()
PLAIN_AREAS = ("paper", "sky", "milkyway", "belt")


@dataclass
class Kit:
    """What a painter keeps between frames: pictures of stars and labels, and blocks of primitives."""

    stars: dict[tuple[object, ...], StarAtlas] = field(default_factory=dict)
    texts: Lettering = field(default_factory=Lettering)
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


@cache
def _kit() -> Kit:
    """Return the kit that is used where none is given; made late, as a pixmap needs a running application."""
    return Kit()


@lru_cache(maxsize=64)
def _thin_pen(colour: str) -> QPen:
    """Return the pen of a colour that draws one device pixel wide."""
    return QPen(QColor(colour), 1.0)


def draw(scene: Scene, theme: Theme, painter: QPainter, kit: Kit | None = None) -> None:
    """Paint a whole chart at the origin of the painter's device.

    On a raster device one logical pixel of the scene is `scene.ratio` device pixels and the painter's own transform is
    set aside; on a vector device it is one unit of the painter's coordinates, and nothing is drawn as a bitmap.
    """
    if painter.paintEngine().type() == QPaintEngine.Type.Raster:
        _Raster(scene, theme, painter, _kit() if kit is None else kit).draw()
    else:
        from colure_viewer.vector import draw_vector

        draw_vector(scene, theme, painter)


def _memory(device: object) -> NDArray[np.uint64] | None:
    """Return the memory (rows, words) of a picture that is being painted, to be read only; None for other devices."""
    if not isinstance(device, QImage) or device.bytesPerLine() % 8:
        return None
    words = np.frombuffer(device.constBits(), dtype=np.uint64)
    return words.reshape(device.height(), device.bytesPerLine() // 8)


class _Raster:
    """One frame on a raster device, in device pixels."""

    def __init__(self, scene: Scene, theme: Theme, painter: QPainter, kit: Kit) -> None:
        self.scene, self.theme, self.painter, self.kit = scene, theme, painter, kit
        self.ratio = scene.ratio
        self.memory: NDArray[np.uint64] | None = None
        self.ground: QColor | None = None
        """The colour of the sky while nothing else is painted on it."""
        self.methods: dict[type, Callable[..., None]] = {
            marks.Areas: self.areas,
            marks.Lines: self.lines,
            marks.Segments: self.segments,
            marks.Discs: self.discs,
            marks.Symbols: self.symbols,
            marks.Bodies: self.bodies,
        }

    def draw(self) -> None:
        """Paint the page, then the layers from back to front."""
        painter, ratio, scene = self.painter, self.ratio, self.scene
        painter.save()
        painter.resetTransform()
        own = painter.device().devicePixelRatioF()
        if own != 1.0:
            painter.scale(1.0 / own, 1.0 / own)
        painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, False)
        self.memory = _memory(painter.device())
        page = QRect(0, 0, round(scene.width * ratio), round(scene.height * ratio))
        painter.fillRect(page, QColor(self.theme.colour("paper")))
        left, top, right, bottom = (round(v * ratio) for v in scene.frame)
        frame = QRect(left, top, right - left, bottom - top)
        clipped = False
        texts = self.kit.texts
        texts.prepare(scene.layers, self.theme, ratio)
        for layer in scene.layers:
            if layer.clip != clipped:
                clipped = layer.clip
                if clipped:
                    painter.setClipRect(frame)
                else:
                    painter.setClipping(False)
            for lettered, run in groupby(layer.marks, lambda mark: isinstance(mark, marks.Labels)):
                if lettered:
                    texts.draw(list(run), self.theme, ratio, painter, self.kit.fragments)  # type: ignore[arg-type]
                    continue
                for mark in run:
                    self.methods[type(mark)](mark)
        painter.restore()

    def _pen(self, colour: str) -> None:
        self.painter.setPen(_thin_pen(colour))
        self.painter.setBrush(NO_BRUSH)
        self.painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)

    def areas(self, mark: marks.Areas) -> None:
        """Fill rings."""
        painter = self.painter
        colour = QColor(mark.colour or self.theme.colour(mark.role))
        colour.setAlphaF(mark.alpha)
        # Smooth edges cost ten times as much: these are hidden under a line, or too faint to show their steps.
        plain = mark.role.startswith(PLAIN_AREAS)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, not plain)
        if mark.role == "sky":
            self.ground = colour
        elif self.ground is not None and mark.role == "belt":
            # Over the bare sky the mixture is one colour, and an opaque fill costs a third of a blended one.
            colour = QColor(mix(self.ground.name(), colour.name(), mark.alpha))
        else:
            self.ground = None
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour)
        points = mark.points * np.float32(self.ratio)
        if mark.even_odd and len(mark.starts) > FEW_LINES:
            painter.drawPath(path(points, mark.starts))
        elif mark.even_odd:
            painter.drawPolygon(passing(strokes.bridged(points, mark.starts)))
        else:
            for a, b in zip(mark.starts[:-1].tolist(), mark.starts[1:].tolist(), strict=True):
                painter.drawPolygon(passing(points[a:b]))

    def lines(self, mark: marks.Lines) -> None:
        """Draw polylines as parallels one pixel wide, or as short strokes where they are dashed."""
        if len(mark.points) < 2:
            return
        points = mark.points.astype(np.float64) * self.ratio
        if mark.dash or mark.dotted:
            stroke, gap = strokes.DOT if mark.dotted else strokes.DASH
            # The pen's square ends reach half a pixel beyond each stroke.
            cut = strokes.dashes(points, mark.starts, stroke * self.ratio - 1.0, gap * self.ratio + 1.0)
            self._strokes(cut, self.theme.line(mark.role, mark.colour), mark.weight)
            return
        if len(points) <= FEW_POINTS and strokes.is_level(points, mark.starts):
            # A rim runs along rows and columns of pixels: whole ones are sharper, and a filled box is drawn at once.
            thick = max(1, round(strokes.THICKNESS[mark.weight] * self.ratio))
            colour = _thin_pen(self.theme.line(mark.role, mark.colour)).color()
            for left, top, width, height in strokes.boxes(points, mark.starts, thick).tolist():
                self.painter.fillRect(left, top, width, height, colour)
            return
        self._pen(self.theme.line(mark.role, mark.colour))
        places = strokes.offsets(mark.weight, self.ratio)
        normal = strokes.normals(points, mark.starts) if len(places) > 1 else None
        if len(mark.starts) <= FEW_LINES:
            # To fill a polygon costs a tenth of making a path; but each is a call of its own.
            ends = mark.starts.tolist()
            for place in places:
                moved = points if normal is None else points + place * normal
                for a, b in pairwise(ends):
                    self.painter.drawPolyline(passing(moved[a:b]))
        elif normal is None:
            self.painter.drawPath(path(points, mark.starts))
        else:
            # All parallels are one path: to make a path costs more than to draw it.
            moved = (points + np.multiply.outer(np.array(places), normal)).reshape(-1, 2)
            firsts = np.add.outer(len(points) * np.arange(len(places), dtype=np.int32), mark.starts[:-1]).ravel()
            self.painter.drawPath(path(moved, np.append(firsts, np.int32(len(moved)))))

    def _strokes(self, xy: F64, colour: str, weight: int) -> None:
        """Draw separate strokes (N, 4), given in device pixels."""
        count = len(xy)
        if not count:
            return
        self._pen(colour)
        places = strokes.offsets(weight, self.ratio)
        rows = self.kit.lines.rows(count)
        if len(places) > 1:
            across = strokes.across(xy)
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
            else (self.theme.line(mark.role, mark.colour),) * marks.TINTS
        )
        atlas = self.kit.star_atlas(mark.radii, tints, self.ratio)
        # With antialiasing on, every fragment would be drawn as a filled shape, twice as slowly.
        self.painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        fine = atlas.fine(mark.xy, self.ratio)
        code = atlas.codes(fine, mark.size, mark.tint)
        if self.memory is None or count < FEW_STARS:
            self._fragments(atlas, code, fine)
        else:
            self._in_bands(mark, atlas, code, fine)

    def _fragments(self, atlas: StarAtlas, code: NDArray[np.int32], fine: NDArray[np.int32]) -> None:
        """Draw the pictures `code` (N,) at `fine` (N, 2)."""
        block = self.kit.fragments
        atlas.fill(block.rows(len(code)), code, fine)
        self.painter.drawPixmapFragments(block.first(), len(code), atlas.pixmap)

    def _in_bands(self, mark: marks.Discs, atlas: StarAtlas, code: NDArray[np.int32], fine: NDArray[np.int32]) -> None:
        """Draw many stars band by band of the page, each band read into the processor's cache just before.

        Stars in order of brightness lie all over a picture that is larger than the cache, and each would wait for
        memory three times: that takes three times as long as the drawing itself. The fragments of one band fit into
        the cache as well. Within a band the order stays; the few large discs, which could reach over the edge of a
        band, are drawn last.
        """
        memory = self.memory
        assert memory is not None
        count = len(mark.xy)
        # Sizes ascend, faintest first.
        small = int(np.searchsorted(mark.size, np.searchsorted(mark.radii * self.ratio, LARGE_STAR)))
        height = len(memory)
        shift = max(3, int(np.log2(BAND_BYTES / memory.strides[0])))
        bands = (height >> shift) + 1
        # The narrowest integers: numpy sorts them by counting.
        narrow = np.uint8 if bands < 256 else np.uint16
        band = np.clip(fine[:small, 1] >> (atlas.bits + shift), 0, bands - 1).astype(narrow)
        order = np.concatenate([np.argsort(band, kind="stable"), np.arange(small, count)])
        code, fine = code.take(order), fine.take(order, axis=0)
        ends = np.cumsum(np.bincount(band, minlength=bands)).tolist()
        # A sky is rarely as wide as its page; two pixels are a word.
        left, right = (int(v) >> (atlas.bits + 1) for v in (fine[:, 0].min(), fine[:, 0].max()))
        left = min(max(left - LARGE_STAR, 0), memory.shape[1] - 1)
        columns = slice(left, max(right + LARGE_STAR, left + 1), 8)
        start = 0
        for number, end in enumerate(ends):
            if end > start:
                top = max((number << shift) - LARGE_STAR, 0)
                # One word of each cache line is enough to have it fetched, and in this order it is fetched ahead.
                memory[top : ((number + 1) << shift) + LARGE_STAR, columns].max()
                self._fragments(atlas, code[start:end], fine[start:end])
                start = end
        if count > small:
            self._fragments(atlas, code[small:], fine[small:])

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

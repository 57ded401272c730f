"""Draws the texts of a frame on a raster device: those of neighbouring marks together, from one picture."""

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF
from PySide6.QtGui import QColor, QPainter

from colure.marks import Labels, Layer
from colure_viewer.atlas import TextAtlas, measured
from colure_viewer.fonts import CAP_MIDDLE, PX_PER_PT, family
from colure_viewer.primitives import Batch
from colure_viewer.themes import Theme

TURNED = 2.0
"""Pixels of the atlas to a device pixel for text that is turned when it is drawn."""


class Lettering:
    """The texts of one frame after another.

    `written` are the texts of title marks that were new in the frame before: a date that changes with every frame is
    written straight on to the page, and only what stays is given a place in the atlas.
    """

    def __init__(self) -> None:
        self.atlas = TextAtlas()
        self.written: set[tuple[str, ...]] = set()
        self._tiles: dict[int, NDArray[np.intp]] = {}
        self._passing: set[tuple[str, ...]] = set()

    def prepare(self, layers: Iterable[Layer], theme: Theme, ratio: float) -> None:
        """Find or draw every text of a frame, level or turned as it is needed.

        All that are missing are drawn before any is used, so that the growing picture is handed to Qt once a frame.
        """
        if self.atlas.full:
            self.atlas.clear()
        self._tiles.clear()
        self._passing = set()
        for layer in layers:
            for mark in layer.marks:
                if isinstance(mark, Labels) and len(mark.index):
                    if mark.role.startswith("title") and not mark.halo:
                        self._passing.add(mark.texts)
                        if mark.texts not in self.written:
                            continue
                    self._tiles[id(mark)] = self._found(mark, theme, ratio)
        self.written = self._passing

    def _found(self, mark: Labels, theme: Theme, ratio: float) -> NDArray[np.intp]:
        """Return the tile (N,) of each text as it stands, drawing those that are missing."""
        face = (family(mark.role), mark.size_pt * PX_PER_PT, mark.italic, mark.bold)
        halo = theme.colour("sky") if mark.halo else None
        colour = theme.text(mark.role, mark.colour)
        turned = mark.angle != 0.0
        some = np.count_nonzero(turned)
        # Those that stand on the page only: a mark may carry hundreds that have found no room.
        texts = [mark.texts[number] for number in mark.index.tolist()]
        level, fine = (
            self.atlas.tiles(texts, face, colour, halo, ratio * scale) if wanted else None
            for scale, wanted in ((1.0, some < len(turned)), (TURNED, some > 0))
        )
        if fine is None or level is None:
            tiles = fine if level is None else level
            assert tiles is not None
            return tiles
        return np.where(turned, fine, level)

    def draw(
        self,
        marks: Sequence[Labels],
        theme: Theme,
        ratio: float,
        painter: QPainter,
        block: Batch[QPainter.PixmapFragment],
    ) -> None:
        """Draw the texts of marks: level ones on whole pixels, turned ones from a finer picture."""
        held = [mark for mark in marks if id(mark) in self._tiles]
        for mark in marks:
            if len(mark.index) and id(mark) not in self._tiles:
                _write(mark, theme, ratio, painter)
        if not held:
            return
        angle = np.concatenate([mark.angle for mark in held])
        turned = angle != 0.0
        order = np.argsort(turned, kind="stable")
        flat = len(order) - int(np.count_nonzero(turned))
        table = self.atlas.table[np.concatenate([self._tiles[id(mark)] for mark in held])[order]]
        xy = np.concatenate([mark.xy for mark in held])[order] * ratio
        rows = block.rows(len(order))
        rows[:, 2:6] = table[:, :4]
        rows[:flat, 6:8] = 1.0
        rows[flat:, 6:8] = 1.0 / TURNED
        rows[:flat, 8] = 0.0
        rows[:, 9] = 1.0
        # From the anchor to the centre of the tile, in pixels of the picture.
        half = table[:, 2:4] * 0.5
        reach = half - table[:, 4:6]
        rows[:flat, :2] = np.rint(xy[:flat] + reach[:flat] - half[:flat]) + half[:flat]
        if flat < len(order):
            angle = angle[order[flat:]]
            along, across = reach[flat:, 0] / TURNED, reach[flat:, 1] / TURNED
            c, s = np.cos(angle), np.sin(angle)
            rows[flat:, 0] = xy[flat:, 0] + along * c - across * s
            rows[flat:, 1] = xy[flat:, 1] + along * s + across * c
            rows[flat:, 8] = np.degrees(angle)
        # With antialiasing on, every fragment would be drawn as a filled shape.
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
        if flat:
            painter.drawPixmapFragments(block.first(), flat, self.atlas.pixmap)
        if flat < len(order):
            painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, True)
            painter.drawPixmapFragments(block.at(flat), len(order) - flat, self.atlas.pixmap)
            painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform, False)


def _write(mark: Labels, theme: Theme, ratio: float, painter: QPainter) -> None:
    """Write level texts straight on to the page."""
    em = mark.size_pt * PX_PER_PT
    face, metrics = measured(family(mark.role), em * ratio, mark.italic, mark.bold)
    painter.setFont(face)
    painter.setPen(QColor(theme.text(mark.role, mark.colour)))
    for number, (x, y) in zip(mark.index.tolist(), (mark.xy * ratio).tolist(), strict=True):
        text = mark.texts[number]
        left, base = x - metrics.horizontalAdvance(text) / 2.0, y + CAP_MIDDLE * em * ratio
        painter.drawText(QPointF(round(left), round(base)), text)

"""The two references of a frame: a bare QPainter, and pyqtgraph items, given the very marks of a finished scene."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QColor, QFont, QImage, QPainter, QPen, QPixmap, QStaticText

from colure.marks import Areas, Discs, Labels, Lines, Scene, Segments
from colure_viewer.primitives import fragments, lines, polygon

INK = QColor("#20242c")
PAPER = QColor("#f4efe2")


@dataclass(frozen=True, slots=True)
class Marks:
    """The marks of a scene, sorted by the call that draws them."""

    lines: tuple[NDArray[np.float32], ...]
    segments: NDArray[np.float32]
    areas: tuple[NDArray[np.float32], ...]
    star_xy: NDArray[np.float32]
    star_radius: NDArray[np.float32]
    texts: tuple[tuple[str, float, float], ...]

    @classmethod
    def of(cls, scene: Scene) -> "Marks":
        """Collect the marks of every layer."""
        marks = [mark for layer in scene.layers for mark in layer.marks]
        ticks = [mark.xy for mark in marks if isinstance(mark, Segments)]
        discs = [mark for mark in marks if isinstance(mark, Discs)]
        empty = np.zeros((0, 4), np.float32)
        return cls(
            lines=tuple(
                mark.points[a:b]
                for mark in marks
                if isinstance(mark, Lines)
                for a, b in zip(mark.starts[:-1], mark.starts[1:], strict=True)
                if b - a > 1
            ),
            segments=np.concatenate(ticks) if ticks else empty,
            areas=tuple(
                mark.points[a:b]
                for mark in marks
                if isinstance(mark, Areas)
                for a, b in zip(mark.starts[:-1], mark.starts[1:], strict=True)
            ),
            star_xy=np.concatenate([mark.xy for mark in discs]) if discs else empty[:, :2],
            star_radius=np.concatenate([mark.radii[mark.size] for mark in discs]) if discs else empty[:, 0],
            texts=tuple(
                (mark.texts[i], float(x), float(y))
                for mark in marks
                if isinstance(mark, Labels)
                for i, (x, y) in zip(mark.index, mark.xy, strict=True)
            ),
        )


def new_image(scene: Scene) -> QImage:
    """Return an opaque page of the scene's size in device pixels."""
    ratio = scene.ratio
    image = QImage(round(scene.width * ratio), round(scene.height * ratio), QImage.Format.Format_RGB32)
    image.setDevicePixelRatio(ratio)
    return image


def bare_painter(scene: Scene) -> Callable[[], None]:
    """Return a job that paints the scene's marks with the fewest and cheapest QPainter calls that show them all.

    Everything that can be prepared is: a picture per star size, polygons, prepared texts. Stars snap to whole pixels,
    lines are one pixel wide and texts lie flat, so it is a floor and no picture to be proud of.
    """
    marks, image = Marks.of(scene), new_image(scene)
    sizes = np.unique(np.round(marks.star_radius, 1))
    tile = int(np.ceil(2 * sizes.max())) + 2 if len(sizes) else 4
    sheet = QPixmap(tile * max(len(sizes), 1), tile)
    sheet.fill(Qt.GlobalColor.transparent)
    painter = QPainter(sheet)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(INK)
    for at, radius in enumerate(sizes):
        painter.drawEllipse(QPointF((at + 0.5) * tile, 0.5 * tile), float(radius), float(radius))
    painter.end()
    which = np.searchsorted(sizes, np.round(marks.star_radius, 1))
    stars = fragments()
    rows = stars.rows(len(which))
    rows[:, :2] = marks.star_xy
    rows[:, 2], rows[:, 3:] = which * tile, (0.0, tile, tile, 1.0, 1.0, 0.0, 1.0)
    polygons = [polygon(line) for line in marks.lines]
    rings = [polygon(ring) for ring in marks.areas]
    strokes = lines()
    strokes.rows(len(marks.segments))[:] = marks.segments
    texts = []
    for text, x, y in marks.texts:
        prepared = QStaticText(text)
        prepared.setTextFormat(Qt.TextFormat.PlainText)
        texts.append((QPointF(x, y), prepared))
    pen, font = QPen(INK, 1.0), QFont()
    font.setPointSizeF(9.0)

    def paint() -> None:
        image.fill(PAPER)
        painter = QPainter(image)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(font)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(QColor("#eadfc2"))
        for ring in rings:
            painter.drawPolygon(ring)
        painter.setPen(pen)
        for line in polygons:
            painter.drawPolyline(line)
        if len(marks.segments):
            painter.drawLines(strokes.first(), len(marks.segments))
        if len(which):
            painter.drawPixmapFragments(stars.first(), len(which), sheet)
        for at, prepared in texts:
            painter.drawStaticText(at, prepared)
        painter.end()

    return paint


def pyqtgraph_items(scene: Scene) -> Callable[[], None]:
    """Return a job that gives the scene's marks to pyqtgraph items and renders them.

    As its users would for speed: star sizes rounded to half pixels, one brush, one curve item for all lines with gaps,
    `setData` on every frame.
    """
    import pyqtgraph as pg

    marks, image = Marks.of(scene), new_image(scene)
    plot = pg.PlotWidget(background=PAPER)
    plot.resize(scene.width, scene.height)
    plot.hideAxis("left")
    plot.hideAxis("bottom")
    box = plot.getViewBox()
    box.setRange(xRange=(0, scene.width), yRange=(0, scene.height), padding=0)
    box.invertY()
    brush, pen = pg.mkBrush(INK), pg.mkPen(INK, width=1)
    stars = pg.ScatterPlotItem(pen=None, brush=brush, pxMode=True)
    curves = pg.PlotCurveItem(pen=pen, antialias=True, connect="finite")
    ticks = pg.PlotCurveItem(pen=pen, antialias=True, connect="pairs")
    for item in (curves, ticks, stars):
        plot.addItem(item)
    for text, x, y in marks.texts:
        label = pg.TextItem(text, color=INK)
        label.setPos(x, y)
        plot.addItem(label)
    size = np.maximum(np.round(4.0 * marks.star_radius) / 2.0, 1.0)
    gap = np.full((1, 2), np.nan, np.float32)
    joined = np.concatenate([part for line in marks.lines for part in (line, gap)]) if marks.lines else gap
    pairs = marks.segments.reshape(-1, 2)

    def paint() -> None:
        stars.setData(x=marks.star_xy[:, 0], y=marks.star_xy[:, 1], size=size)
        curves.setData(x=joined[:, 0], y=joined[:, 1])
        ticks.setData(x=pairs[:, 0], y=pairs[:, 1])
        painter = QPainter(image)
        plot.render(painter)
        painter.end()

    return paint

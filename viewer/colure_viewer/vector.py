"""Paints a Scene on a vector device: discs as ellipses, text as outlines, lines as strokes, and no bitmap at all."""

import math
from functools import lru_cache

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPainterPath, QPen, QTransform

from colure import marks
from colure.marks import Scene
from colure_viewer import atlas, strokes
from colure_viewer.bodyshapes import draw_bodies
from colure_viewer.fonts import CAP_MIDDLE, PX_PER_PT, SERIF, family, register
from colure_viewer.primitives import path, polygon
from colure_viewer.themes import Theme

EM = 200
"""Pixels to the em of the outlines that are kept and scaled: a whole number, and so the same on every device."""

HALO = 1.7
"""Width of a halo beside its text in logical pixels."""


def draw_vector(scene: Scene, theme: Theme, painter: QPainter) -> None:
    """Paint a chart; one logical pixel is one unit of the painter's coordinates."""
    painter.save()
    painter.setRenderHint(QPainter.RenderHint.Antialiasing, True)
    page = QRectF(0.0, 0.0, scene.width, scene.height)
    painter.fillRect(page, QColor(theme.colour("paper")))
    left, top, right, bottom = scene.frame
    for layer in scene.layers:
        painter.save()
        if layer.clip:
            painter.setClipRect(QRectF(left, top, right - left, bottom - top))
        for mark in layer.marks:
            _draw_mark(mark, theme, painter)
        painter.restore()
    painter.restore()


def _draw_mark(mark: marks.Mark, theme: Theme, painter: QPainter) -> None:
    if isinstance(mark, marks.Areas):
        _areas(mark, theme, painter)
    elif isinstance(mark, marks.Lines):
        _lines(mark, theme, painter)
    elif isinstance(mark, marks.Segments):
        _strokes(mark.xy, theme.line(mark.role, mark.colour), mark.weight, painter)
    elif isinstance(mark, marks.Discs):
        _discs(mark, theme, painter)
    elif isinstance(mark, marks.Symbols):
        for number, name in enumerate(mark.kinds):
            chosen = mark.kind == number
            if chosen.any():
                shape = strokes.symbols(
                    name, mark.xy[chosen].astype(np.float64), mark.size[chosen].astype(np.float64), mark.angle[chosen]
                )
                _strokes(shape, theme.line(mark.role, mark.colour), marks.GRID, painter)
    elif isinstance(mark, marks.Bodies):
        draw_bodies(painter, mark, theme, 1.0)
    else:
        _labels(mark, theme, painter)


def _pen(colour: str, weight: int) -> QPen:
    pen = QPen(QColor(colour), strokes.THICKNESS[weight])
    pen.setCapStyle(Qt.PenCapStyle.FlatCap)
    pen.setJoinStyle(Qt.PenJoinStyle.RoundJoin)
    return pen


def _areas(mark: marks.Areas, theme: Theme, painter: QPainter) -> None:
    colour = QColor(mark.colour or theme.colour(mark.role))
    colour.setAlphaF(mark.alpha)
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(colour)
    if mark.even_odd:
        painter.drawPath(path(mark.points, mark.starts))
    else:
        for a, b in zip(mark.starts[:-1].tolist(), mark.starts[1:].tolist(), strict=True):
            painter.drawPolygon(polygon(mark.points[a:b]))


def _lines(mark: marks.Lines, theme: Theme, painter: QPainter) -> None:
    pen = _pen(theme.line(mark.role, mark.colour), mark.weight)
    if mark.dash or mark.dotted:
        stroke, gap = strokes.DOT if mark.dotted else strokes.DASH
        # Qt counts dashes in widths of the pen.
        pen.setDashPattern([stroke / pen.widthF(), gap / pen.widthF()])
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(pen)
    painter.drawPath(path(mark.points, mark.starts))


def _strokes(xy: np.ndarray, colour: str, weight: int, painter: QPainter) -> None:
    if not len(xy):
        return
    painter.setBrush(Qt.BrushStyle.NoBrush)
    painter.setPen(_pen(colour, weight))
    painter.drawPath(path(xy.reshape(-1, 2), 2 * np.arange(len(xy) + 1, dtype=np.int32)))


def _discs(mark: marks.Discs, theme: Theme, painter: QPainter) -> None:
    painter.setPen(Qt.PenStyle.NoPen)
    stars = mark.role.startswith(("star", "legend"))
    brushes = [QColor(c) for c in theme.tints] if stars else [QColor(theme.line(mark.role, mark.colour))] * marks.TINTS
    radii = mark.radii.tolist()
    current = -1
    # Still faintest first, but of one size all of one tint together: a file repeats the colour at each change.
    order = np.lexsort((mark.tint, mark.size))
    rows = zip(mark.xy[order].tolist(), mark.size[order].tolist(), mark.tint[order].tolist(), strict=True)
    for (x, y), size, tint in rows:
        if tint != current:
            painter.setBrush(brushes[tint])
            current = tint
        painter.drawEllipse(QPointF(x, y), radii[size], radii[size])


@lru_cache(maxsize=2048)
def _outline(text: str, family_name: str, italic: bool, bold: bool) -> tuple[QPainterPath, float]:
    """Return the outline of a text at EM pixels to the em, its origin on the baseline, and its advance width."""
    register()
    font = QFont(family_name)
    font.setPixelSize(EM)
    font.setHintingPreference(QFont.HintingPreference.PreferNoHinting)
    font.setItalic(italic and family_name == SERIF)
    font.setBold(bold)
    shape = QPainterPath()
    shape.addText(QPointF(0.0, 0.0), font, text)
    # Overlapping contours of a letter are filled, not holes.
    shape.setFillRule(Qt.FillRule.WindingFill)
    return shape, QFontMetricsF(font).horizontalAdvance(text)


def _labels(mark: marks.Labels, theme: Theme, painter: QPainter) -> None:
    colour = QColor(theme.text(mark.role, mark.colour))
    face = family(mark.role)
    scale = mark.size_pt * PX_PER_PT / EM
    placed: list[QPainterPath] = []
    for number, (x, y), angle in zip(mark.index.tolist(), mark.xy.tolist(), mark.angle.tolist(), strict=True):
        shape, advance = _outline(mark.texts[number], face, mark.italic, mark.bold)
        place = QTransform()
        place.translate(x, y)
        place.rotate(math.degrees(angle))
        place.scale(scale, scale)
        place.translate(-advance / 2.0, CAP_MIDDLE * EM)
        placed.append(place.map(shape))
    if mark.halo:
        ground = QColor(theme.colour("sky"))
        ground.setAlphaF(atlas.HALO)
        pen = QPen(ground, 2.0 * HALO)
        pen.setJoinStyle(Qt.PenJoinStyle.RoundJoin)
        painter.setPen(pen)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        for shape in placed:
            painter.drawPath(shape)
    painter.setPen(Qt.PenStyle.NoPen)
    painter.setBrush(colour)
    for shape in placed:
        painter.drawPath(shape)

"""The discs of Sun, Moon and planets with the shape of their phase, for raster and vector painters alike."""

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QColor, QPainter, QPen

from colure.marks import Bodies
from colure_viewer.primitives import polygon
from colure_viewer.themes import Theme, mix

F64 = NDArray[np.float64]

OUTLINE = 1.3
"""Thickness of a body's rim in logical pixels."""


def lit_shape(radius: float, lit: float, limb: float, x: float, y: float) -> F64:
    """Return the outline (N, 2) of the lit part of a disc: half the limb and half the ellipse of the terminator.

    `lit` is the lit fraction of the disc and `limb` the direction of the middle of the bright limb, clockwise from +x
    on a page with y down. The terminator's half-axis along the limb direction is radius × (1 − 2 lit), because the lit
    fraction of a sphere's disc is also that of its diameter.
    """
    angle = np.linspace(-np.pi / 2.0, np.pi / 2.0, 33)
    outer = np.stack([np.cos(angle), np.sin(angle)], axis=-1)
    inner = outer[::-1] * np.array([1.0 - 2.0 * lit, 1.0])
    shape = radius * np.concatenate([outer, inner[1:-1]])
    c, s = np.cos(limb), np.sin(limb)
    return np.stack([x + shape[:, 0] * c - shape[:, 1] * s, y + shape[:, 0] * s + shape[:, 1] * c], axis=-1)


@lru_cache(maxsize=64)
def _colours(theme: Theme, name: str) -> tuple[QColor, QColor, QColor]:
    """Return the colours of a body's rim, lit side and night side."""
    colour, sky = theme.colour(f"body.{name}"), theme.colour("sky")
    # On paper the lit side is bare paper and the night side inked; on a dark ground it is the other way round.
    bright = colour if theme.dark else mix("#FFFFFF", colour, 0.14)
    night = mix(sky, colour, 0.28 if theme.dark else 0.62)
    return QColor(colour), QColor(bright), QColor(night)


def draw_bodies(painter: QPainter, mark: Bodies, theme: Theme, scale: float) -> None:
    """Draw the discs; `scale` is painter units per logical pixel."""
    places = (mark.xy * scale).tolist()
    radii = (mark.radius * scale).tolist()
    for row, name in enumerate(mark.names):
        colour, bright, night = _colours(theme, name)
        (x, y), radius, lit = places[row], radii[row], float(mark.lit[row])
        full = lit >= 0.999 or radius < 2.0 * scale
        centre = QPointF(x, y)
        painter.setBrush(bright if full else night)
        if not full and lit > 0.001:
            # The rim goes over both sides.
            painter.setPen(Qt.PenStyle.NoPen)
            painter.drawEllipse(centre, radius, radius)
            painter.setBrush(bright)
            painter.drawPolygon(polygon(lit_shape(radius, lit, float(mark.limb[row]), x, y)))
            painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(QPen(colour, OUTLINE * scale))
        painter.drawEllipse(centre, radius, radius)
        if name == "sun" and not mark.true_size[row]:
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(QColor(theme.colour("sky")) if theme.dark else colour)
            painter.drawEllipse(centre, 1.6 * scale, 1.6 * scale)

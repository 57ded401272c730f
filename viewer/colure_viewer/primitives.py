"""Arrays of Qt drawing primitives that share their memory with numpy, so that a batch is one call and no loop.

A Qt call such as `drawLines(first, count)` reads plain structs of doubles. A numpy array of float64 has that layout, so
shiboken is asked for a wrapper of the first struct at the array's address; nothing is copied or converted.
"""

import ctypes
from functools import lru_cache
from typing import Any, Generic, TypeVar, cast

import numpy as np
import shiboken6
from numpy.typing import NDArray
from PySide6.QtCore import QByteArray, QDataStream, QLineF
from PySide6.QtGui import QPainter, QPainterPath, QPolygonF

P = TypeVar("P", QLineF, QPainter.PixmapFragment)

LINE, FRAGMENT = 4, 10
"""Doubles in a QLineF (x1 y1 x2 y2) and in a PixmapFragment (x y left top width height scale_x scale_y angle alpha)."""


class Batch(Generic[P]):
    """A growing block of primitives: write rows of `rows(n)`, then pass `first()` and n to the painter.

    The block is kept between frames and only ever grows, by doubling, so that a steady picture allocates nothing.
    """

    def __init__(self, kind: type[P], doubles: int) -> None:
        self._kind: Any = kind
        self._block: NDArray[np.float64] = np.zeros((0, doubles))
        self._first: P | None = None

    def rows(self, count: int) -> NDArray[np.float64]:
        """Return a writable view (count, doubles); earlier contents of the block are not kept when it grows."""
        if count > len(self._block):
            size = max(count, 2 * len(self._block), 64)
            self._block = np.zeros((size, self._block.shape[1]))
            self._first = None
        return self._block[:count]

    def first(self) -> P:
        """Return a Qt object that lies at the start of the block; valid until the block grows."""
        if self._first is None:
            if not len(self._block):
                raise ValueError("an empty batch has no first element")
            self._first = cast("P", shiboken6.wrapInstance(self._block.ctypes.data, self._kind))
        return self._first

    def at(self, row: int) -> P:
        """Return a Qt object that lies at a row of the block; valid until the block grows."""
        address = self._block.ctypes.data + row * self._block.strides[0]
        return cast("P", shiboken6.wrapInstance(address, self._kind))


def lines() -> Batch[QLineF]:
    """Return an empty block of QLineF."""
    return Batch(QLineF, LINE)


def fragments() -> Batch[QPainter.PixmapFragment]:
    """Return an empty block of pixmap fragments."""
    return Batch(QPainter.PixmapFragment, FRAGMENT)


def polygon(points: NDArray[np.floating]) -> QPolygonF:
    """Return a QPolygonF filled from points (N, 2) by one copy."""
    shape, memory = _shape(len(points))
    memory[...] = points
    return shape


def passing(points: NDArray[np.floating]) -> QPolygonF:
    """Return a QPolygonF filled from points (N, 2), for one call of a raster painter, which keeps nothing of it.

    The next polygon of as many points takes its place.
    """
    shape, memory = _kept_shape(len(points))
    memory[...] = points
    return shape


def _shape(count: int) -> tuple[QPolygonF, NDArray[np.float64]]:
    """Return a new polygon and its memory (count, 2)."""
    shape = QPolygonF()
    if not count:
        return shape, np.empty((0, 2))
    shape.resize(count)
    # A fresh polygon is shared with nobody, so its memory can be written directly.
    address = shiboken6.getCppPointer(shape.data())[0]
    memory = (ctypes.c_double * (2 * count)).from_address(address)
    return shape, np.frombuffer(cast("memoryview[int]", memory), dtype=np.float64).reshape(count, 2)


_kept_shape = lru_cache(maxsize=64)(_shape)


_ELEMENT = np.dtype([("kind", "<i4"), ("xy", "<f8", 2)])
"""One element of a QPainterPath as QDataStream writes it; kind 0 moves, kind 1 draws a line."""


def path(points: NDArray[np.floating], starts: NDArray[np.int32]) -> QPainterPath:
    """Return polylines, laid out as in colure.marks.Lines, as one QPainterPath, filled odd-even.

    Qt's own stream format is read back in one call, because adding points one by one costs a Python call for each.
    """
    count = len(points)
    out = QPainterPath()
    if not count:
        return out
    body = np.empty(count, dtype=_ELEMENT)
    body["kind"] = 1
    body["kind"][starts[:-1][starts[:-1] < count]] = 0
    body["xy"] = points
    # Before the elements their number; after them the start of the last subpath and the fill rule (0 is odd-even).
    head, tail = np.array([count], dtype="<i4"), np.array([starts[-2], 0], dtype="<i4")
    stream = QDataStream(QByteArray(head.tobytes() + body.tobytes() + tail.tobytes()))
    stream.setByteOrder(QDataStream.ByteOrder.LittleEndian)
    stream >> out
    return out

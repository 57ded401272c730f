"""Pictures kept for re-use: star discs at every sub-pixel phase, and labels with their halos."""

import math
from collections.abc import Sequence
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QImage, QPainter, QPixmap

from colure_viewer.fonts import CAP_MIDDLE, font
from colure_viewer.primitives import FRAGMENT
from colure_viewer.themes import channels

F64 = NDArray[np.float64]

_FORMAT = QImage.Format.Format_ARGB32_Premultiplied


def blank(width: int, height: int) -> QImage:
    """Return a transparent picture."""
    image = QImage(width, height, _FORMAT)
    image.fill(0)
    # 96 dots to the inch, whatever the screen: text is the same size everywhere.
    image.setDotsPerMeterX(3780)
    image.setDotsPerMeterY(3780)
    return image


def _clear_pixmap(width: int, height: int) -> QPixmap:
    pixmap = QPixmap(width, height)
    pixmap.fill(QColor(0, 0, 0, 0))
    return pixmap


def pixels(image: QImage) -> NDArray[np.uint8]:
    """Return the bytes (height, width, 4) of a picture, blue green red alpha, as a writable view.

    The view does not keep the picture alive: hold on to the picture while it is used.
    """
    view = np.frombuffer(image.bits(), dtype=np.uint8)
    return view.reshape(image.height(), image.bytesPerLine() // 4, 4)[:, : image.width()]


class StarAtlas:
    """Discs of every size class and tint, drawn at `phases` × `phases` fractions of a pixel.

    A star that moves by a tenth of a pixel takes another picture instead of jumping by a whole pixel. A disc smaller
    than a pixel keeps its area as its darkness, the same at every phase, so that nothing flickers while it moves.
    """

    def __init__(self, radii: NDArray[np.float32], tints: Sequence[str], ratio: float) -> None:
        """Draw the discs; `radii` in logical pixels, `tints` the colours of the tint classes."""
        self.phases = 4 if ratio < 1.5 else 2
        count, phase_count = len(radii), self.phases**2
        device = np.asarray(radii, dtype=np.float64) * ratio
        reach = np.ceil(device + 0.5).astype(int)
        side = 2 * reach + 1
        widest = max(int(side.max()) * phase_count, 256)
        # Shelves: one strip of phases per size and tint, laid left to right until the row is full.
        width, x, y, tall = min(max(widest, 1024), 8192), 0, 0, 0
        place: list[tuple[int, int]] = []
        for n in side:
            for _ in tints:
                if x + int(n) * phase_count > width:
                    x, y, tall = 0, y + tall, 0
                place.append((x, y))
                x, tall = x + int(n) * phase_count, max(tall, int(n))
        image = blank(width, y + tall)
        canvas = pixels(image)
        self.table = np.zeros((count * len(tints) * phase_count, FRAGMENT))
        colours = np.array([[b, g, r, 255] for r, g, b in map(channels, tints)], dtype=np.float64)
        fraction = np.arange(self.phases) / self.phases
        row = 0
        for k in range(count):
            n, m = int(side[k]), int(reach[k])
            cover = _disc(float(device[k]), n, m, fraction)
            first, extent = _inked(cover)
            for tint, colour in enumerate(colours):
                left, top = place[k * len(tints) + tint]
                strip = cover.transpose(1, 0, 2).reshape(n, n * phase_count)
                canvas[top : top + n, left : left + n * phase_count] = np.rint(strip[..., None] * colour)
                block = self.table[row : row + phase_count]
                block[:, 0] = first[:, 1] - m + extent[:, 1] / 2.0
                block[:, 1] = first[:, 0] - m + extent[:, 0] / 2.0
                block[:, 2] = left + n * np.arange(phase_count) + first[:, 1]
                block[:, 3] = top + first[:, 0]
                block[:, 4], block[:, 5] = extent[:, 1], extent[:, 0]
                block[:, 6] = block[:, 7] = block[:, 9] = 1.0
                row += phase_count
        self.tints = len(tints)
        self.pixmap = QPixmap.fromImage(image)

    def fine(self, xy: NDArray[np.float32], ratio: float) -> NDArray[np.int32]:
        """Return logical pixels (N, 2) as whole numbers of phases of a device pixel."""
        return np.asarray(np.rint(xy * np.float32(self.phases * ratio)).astype(np.int32))

    def codes(self, fine: NDArray[np.int32], size: NDArray[np.uint8], tint: NDArray[np.uint8]) -> NDArray[np.int32]:
        """Return which picture (N,) each star takes."""
        p, bits = self.phases, self.bits
        code = size.astype(np.int32)
        code *= self.tints
        code += tint
        code <<= 2 * bits
        code += (fine[:, 1] & (p - 1)) << bits
        code += fine[:, 0] & (p - 1)
        return code

    def fill(self, rows: F64, code: NDArray[np.int32], fine: NDArray[np.int32]) -> None:
        """Write the fragments (N, 10) of stars with pictures `code` at `fine` (N, 2)."""
        # Clipping spares a check of every index; the codes are in range by their making.
        np.take(self.table, code, axis=0, out=rows, mode="clip")
        # Column by column: numpy's loops are long ones then, three times as fast.
        whole = fine >> self.bits
        rows[:, 0] += whole[:, 0]
        rows[:, 1] += whole[:, 1]

    @property
    def bits(self) -> int:
        """Binary digits of a phase."""
        return self.phases.bit_length() - 1


def _disc(radius: float, side: int, middle: int, fraction: F64) -> F64:
    """Return coverages (phases², side, side) of a disc; row-major over the y and then the x fraction."""
    cells = np.arange(side)
    # A pixel's centre lies at index + 0.5, the star's at middle + fraction in the same units.
    d = cells[None, :] + 0.5 - (middle + fraction[:, None])
    distance = np.sqrt(d[:, None, :, None] ** 2 + d[None, :, None, :] ** 2)
    cover = np.clip(radius + 0.5 - distance, 0.0, 1.0).reshape(len(fraction) ** 2, side, side)
    # The rim's pixels make up the area that the whole ones inside leave.
    area = math.pi * radius * radius
    whole = (cover == 1.0).sum(axis=(1, 2), keepdims=True)
    rim = cover.sum(axis=(1, 2), keepdims=True) - whole
    scaled = np.minimum(cover * ((area - whole) / np.maximum(rim, 1e-9)), 1.0)
    return np.where(cover == 1.0, 1.0, scaled)


def _inked(cover: F64) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Return the first row and column (N, 2) and the height and width (N, 2) of what shows of coverages (N, n, n).

    Most stars are two or three pixels wide at most phases: a margin would take longer to draw than they do.
    """
    ink = np.rint(cover * 255.0) > 0.0
    lines = np.stack([ink.any(axis=2), ink.any(axis=1)], axis=1)
    first = lines.argmax(axis=2)
    return first, lines.shape[2] - lines[:, :, ::-1].argmax(axis=2) - first


STEP = 256
"""Rows by which the picture of labels grows."""
HALO = 0.8
"""How much of what lies behind a halo covers: lines fade, and a tinted ground shows through a little."""

_METRIC = blank(1, 1)
"""What text is measured on: it has the 96 dots to the inch of every picture."""


@lru_cache(maxsize=64)
def measured(family: str, pixels: float, italic: bool, bold: bool) -> tuple[QFont, QFontMetricsF]:
    """Return a font with its metrics on a picture."""
    made = font(family, pixels, italic, bold)
    return made, QFontMetricsF(made, _METRIC)


class TextAtlas:
    """Labels drawn once, each with its halo, in one growing picture.

    A tile is `scale` device pixels per logical pixel: the painter's own ratio for level text, twice that for text that
    is turned when it is drawn, so that turning it leaves it sharp.
    """

    WIDTH = 1024
    LIMIT = 8192
    RUNS = 256

    def __init__(self) -> None:
        """Start with an empty picture."""
        self.pixmap = _clear_pixmap(self.WIDTH, 256)
        self._tiles: dict[tuple[object, ...], dict[str, int]] = {}
        self._runs: dict[tuple[object, ...], NDArray[np.intp]] = {}
        # Left, top, width, height, anchor x, anchor y in pixels of the picture; a row per tile.
        self.table = np.zeros((256, 6))
        self._count = 0
        self._x = self._y = self._tall = 0

    def clear(self) -> None:
        """Forget every tile."""
        self.__init__()  # type: ignore[misc]

    def tiles(
        self,
        texts: Sequence[str],
        face: tuple[str, float, bool, bool],
        colour: str,
        halo: str | None,
        scale: float,
    ) -> NDArray[np.intp]:
        """Return the tile numbers of texts set in `face` (family, logical pixels to the em, italic, bold)."""
        style = (*face, colour, halo, scale)
        # A steady picture asks for the same texts at every frame: their numbers are remembered as one array.
        run = (style, tuple(texts))
        found = self._runs.get(run)
        if found is None:
            known = self._tiles.setdefault(style, {})
            missing = [text for text in texts if text not in known]
            if missing:
                self._render(list(dict.fromkeys(missing)), known, face, colour, halo, scale)
            found = np.array([known[text] for text in texts], dtype=np.intp)
            if len(self._runs) >= self.RUNS:
                del self._runs[next(iter(self._runs))]
            self._runs[run] = found
        return found

    def _room(self, width: int, height: int) -> tuple[int, int]:
        if self._x + width > self.WIDTH:
            self._x, self._y, self._tall = 0, self._y + self._tall, 0
        at = (self._x, self._y)
        self._x, self._tall = self._x + width, max(self._tall, height)
        return at

    def _render(
        self,
        texts: list[str],
        known: dict[str, int],
        face: tuple[str, float, bool, bool],
        colour: str,
        halo: str | None,
        scale: float,
    ) -> None:
        """Draw texts into the picture in one batch, then grow the halos of them all at once."""
        family, em, italic, bold = face
        pen_font, metrics = measured(family, em * scale, italic, bold)
        spread = 1.7 * scale if halo else 0.0
        pad = math.ceil(spread) + 2
        rise, fall = math.ceil(metrics.ascent()), math.ceil(metrics.descent())
        line = rise + fall + 2 * pad
        work, spots = [], []
        x = y = widest = 0
        for text in texts:
            advance = metrics.horizontalAdvance(text)
            width = min(math.ceil(advance) + 2 * pad + 2, self.WIDTH)
            if x + width > self.WIDTH:
                x, y = 0, y + line
            work.append((text, x, y, width, advance))
            x += width
            widest = max(widest, x)
        sheet = blank(widest, y + line)
        painter = QPainter(sheet)
        painter.setRenderHint(QPainter.RenderHint.TextAntialiasing)
        painter.setFont(pen_font)
        painter.setPen(QColor(colour))
        for text, x, y, _, _ in work:
            painter.drawText(QPointF(x + pad, y + pad + rise), text)
        painter.end()
        if halo:
            _add_halo(pixels(sheet), channels(halo), spread)
        for text, x, y, width, advance in work:
            # Figures have no descenders: a tile cut to its ink is half as large, and turning it half as slow.
            ink = metrics.tightBoundingRect(text)
            over = max(0, rise + math.floor(ink.top()) - 1)
            height = min(line, rise + math.ceil(ink.bottom()) + 1 + 2 * pad) - over
            left, top = self._room(width, height)
            spots.append((left, top, x, y + over, width, height))
            # The anchor is the middle of the advance width, half the capitals above the baseline.
            anchor = (pad + advance / 2.0, pad + rise - over - CAP_MIDDLE * em * scale)
            known[text] = self._count
            if self._count == len(self.table):
                self.table = np.concatenate([self.table, np.zeros_like(self.table)])
            self.table[self._count] = (left, top, width, height, *anchor)
            self._count += 1
        # Painting on the pixmap itself copies only the new tiles; a new pixmap would copy the whole picture.
        bottom, old = self._y + self._tall, self.pixmap
        if bottom > old.height():
            self.pixmap = _clear_pixmap(self.WIDTH, max(bottom, old.height() + STEP))
        painter = QPainter(self.pixmap)
        painter.setCompositionMode(QPainter.CompositionMode.CompositionMode_Source)
        if self.pixmap is not old:
            painter.drawPixmap(0, 0, old)
        for left, top, x, y, width, height in spots:
            painter.drawImage(left, top, sheet, x, y, width, height)
        painter.end()

    @property
    def full(self) -> bool:
        """Whether the picture has grown so far that it should be started afresh before the next frame."""
        return self.pixmap.height() > self.LIMIT // 2


def _add_halo(sheet: NDArray[np.uint8], colour: tuple[int, int, int], spread: float) -> None:
    """Put a soft rim of `colour` behind what is drawn on a transparent sheet, in place."""
    alpha = sheet[..., 3].copy()
    grown = alpha
    # Growing by crosses and squares in turn makes octagons, near enough to discs.
    for step in range(max(1, round(spread))):
        grown = _grow(grown, square=step % 2 == 1)
    r, g, b = colour
    behind = grown.astype(np.uint16)
    clear = ((255 - alpha) * HALO).astype(np.uint16)
    cover = (behind * clear + 127) // 255
    for channel, value in enumerate((b, g, r)):
        sheet[..., channel] += ((cover * value + 127) // 255).astype(np.uint8)
    sheet[..., 3] += cover.astype(np.uint8)


def _grow(source: NDArray[np.uint8], square: bool) -> NDArray[np.uint8]:
    """Return the maximum over each pixel and its four neighbours, or eight for a square."""
    out = source.copy()
    np.maximum(out[1:], source[:-1], out=out[1:])
    np.maximum(out[:-1], source[1:], out=out[:-1])
    across = out.copy() if square else source
    np.maximum(out[:, 1:], across[:, :-1], out=out[:, 1:])
    np.maximum(out[:, :-1], across[:, 1:], out=out[:, :-1])
    return out

"""Writes a chart to a PNG, SVG or PDF file, to a printer or to the clipboard, by the painter of the screen."""

import os
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QBuffer, QByteArray, QCoreApplication, QIODevice, QMarginsF, QRect, QSize, QSizeF
from PySide6.QtGui import QGuiApplication, QImage, QPageLayout, QPageSize, QPainter, QPdfWriter

from colure import __version__, files, marks
from colure.errors import ColureError, near_names
from colure.marks import Scene
from colure_viewer import paint
from colure_viewer.themes import Theme

if TYPE_CHECKING:
    from PySide6.QtPrintSupport import QPrinter

FORMATS = ("png", "svg", "pdf")
DOTS_PER_INCH = 96
PDF_RESOLUTION = 1200
LARGEST = 16384
"""The most device pixels along a side of a picture: beyond it Qt's rasteriser loses its fixed-point precision."""


class ExportError(ColureError):
    """A chart that cannot be written where or how it was asked for."""


_application: QCoreApplication | None = None


def application() -> QCoreApplication:
    """Return the running Qt application, or start one that needs no display; for drawing from the command line."""
    global _application
    running = QGuiApplication.instance()
    if running is not None:
        return running
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    _application = QGuiApplication(["colure"])
    return _application


def kind(path: Path) -> str:
    """Return the format that a file's name asks for: png, svg or pdf; raise ExportError for any other."""
    suffix = path.suffix.lower().lstrip(".")
    if suffix not in FORMATS:
        raise ExportError(
            f"output '{path}': unknown format {path.suffix or '(no suffix)'!r}; expected .png, .svg or .pdf"
            + near_names(suffix, FORMATS)
        )
    return suffix


def write(scene: Scene, theme: Theme, path: Path | str) -> None:
    """Write a chart to a file in the format of its suffix; an interrupted or refused write leaves an old file whole.

    Raise ExportError for an unknown suffix or a picture that is too large, and the error of colure.files for a place
    that cannot be written.
    """
    path = Path(path)
    data = encode(scene, theme, kind(path))
    files.atomic_write(path, data)


def prepared(scene: Scene, theme: Theme, path: Path) -> Callable[[], None]:
    """Return the slow part of `write` as a function that touches nothing of the window: for a thread beside it.

    A picture is painted here, at once, because only the thread of the window may use what is kept for painting.
    """
    form = kind(path)
    if form != "png":
        return lambda: write(scene, theme, path)
    image = picture(scene, theme)
    return lambda: files.atomic_write(path, _png(image, scene))


def encode(scene: Scene, theme: Theme, form: str) -> bytes:
    """Return a chart as the bytes of a PNG, SVG or PDF file."""
    application()
    if form == "png":
        return _png(picture(scene, theme), scene)
    if form == "svg":
        return _svg(scene, theme)
    return _pdf(scene, theme)


def picture(scene: Scene, theme: Theme) -> QImage:
    """Return a chart as a picture of `width × ratio` by `height × ratio` pixels."""
    wide, high = round(scene.width * scene.ratio), round(scene.height * scene.ratio)
    if not (0 < wide <= LARGEST and 0 < high <= LARGEST):
        raise ExportError(f"picture: {wide} × {high} pixels; expected 1 to {LARGEST} along each side")
    image = QImage(wide, high, QImage.Format.Format_RGB32)
    if image.isNull():
        raise ExportError(f"picture: {wide} × {high} pixels do not fit into memory; expected a smaller size")
    image.setDevicePixelRatio(scene.ratio)
    painter = QPainter(image)
    paint.draw(scene, theme, painter)
    painter.end()
    dots = round(DOTS_PER_INCH * scene.ratio / 0.0254)
    image.setDotsPerMeterX(dots)
    image.setDotsPerMeterY(dots)
    return image


def title(scene: Scene) -> str:
    """Return the words of the title block, for a file's own description."""
    return " · ".join(_words(scene, "title")) or "Chart"


def remarks(scene: Scene) -> str:
    """Return the cautions and notes of a chart in one line: a file repeats them outside the picture."""
    return " ".join([*_words(scene, "caution"), *scene.notes])


def _words(scene: Scene, role: str) -> list[str]:
    return [
        mark.texts[number]
        for layer in scene.layers
        for mark in layer.marks
        if isinstance(mark, marks.Labels) and mark.role.split(".")[0] == role
        for number in mark.index.tolist()
    ]


def _buffer() -> tuple[QBuffer, QByteArray]:
    store = QByteArray()
    buffer = QBuffer(store)
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    return buffer, store


def _png(image: QImage, scene: Scene) -> bytes:
    image.setText("Title", title(scene))
    image.setText("Software", f"Colure {__version__}")
    if remarks(scene):
        image.setText("Comment", remarks(scene))
    buffer, store = _buffer()
    if not image.save(buffer, "PNG"):  # type: ignore[call-overload]  # the stub asks for bytes, Qt for text
        raise ExportError("picture: Qt could not encode it as PNG")
    buffer.close()
    return bytes(store.data())


def _svg(scene: Scene, theme: Theme) -> bytes:
    from PySide6.QtSvg import QSvgGenerator

    buffer, store = _buffer()
    # SVG Tiny, the generator's default, has no clipping.
    generator = QSvgGenerator(QSvgGenerator.SvgVersion.Svg11)
    generator.setOutputDevice(buffer)
    generator.setResolution(DOTS_PER_INCH)
    generator.setSize(QSize(scene.width, scene.height))
    generator.setViewBox(QRect(0, 0, scene.width, scene.height))
    generator.setTitle(title(scene))
    generator.setDescription(f"{remarks(scene)} Drawn by Colure {__version__}.".strip())
    _paint_on(generator, scene, theme)
    buffer.close()
    return bytes(store.data())


def _pdf(scene: Scene, theme: Theme) -> bytes:
    buffer, store = _buffer()
    writer = QPdfWriter(buffer)
    writer.setResolution(PDF_RESOLUTION)
    points = 72.0 / DOTS_PER_INCH
    writer.setPageSize(QPageSize(QSizeF(scene.width * points, scene.height * points), QPageSize.Unit.Point))
    writer.setPageMargins(QMarginsF(0.0, 0.0, 0.0, 0.0), QPageLayout.Unit.Point)
    writer.setTitle(" ".join([title(scene), remarks(scene)]).strip())
    writer.setCreator(f"Colure {__version__}")
    _paint_on(writer, scene, theme, PDF_RESOLUTION / DOTS_PER_INCH)
    buffer.close()
    return bytes(store.data())


def _paint_on(device: "QPdfWriter | QPrinter | object", scene: Scene, theme: Theme, scale: float = 1.0) -> None:
    painter = QPainter()
    if not painter.begin(device):  # type: ignore[arg-type]
        raise ExportError("output: the device cannot be drawn on; expected a printer that is ready")
    painter.scale(scale, scale)
    paint.draw(scene, theme, painter)
    painter.end()


def print_chart(scene: Scene, theme: Theme, printer: "QPrinter") -> None:
    """Print a chart as large as the page allows, centred."""
    page = printer.pageLayout().paintRectPixels(printer.resolution())
    scale = min(page.width() / scene.width, page.height() / scene.height)
    painter = QPainter()
    if not painter.begin(printer):
        raise ExportError("printer: it cannot be drawn on; expected a printer that is ready")
    painter.translate((page.width() - scale * scene.width) / 2.0, (page.height() - scale * scene.height) / 2.0)
    painter.scale(scale, scale)
    paint.draw(scene, theme, painter)
    painter.end()


def copy(scene: Scene, theme: Theme) -> None:
    """Put a chart on the clipboard as a picture."""
    QGuiApplication.clipboard().setImage(picture(scene, theme))

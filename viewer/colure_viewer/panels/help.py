"""Help: the keys and gestures, the cautions, and what Colure is made from."""

from html import escape

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QDialog, QDialogButtonBox, QTextBrowser, QVBoxLayout, QWidget

from colure import __version__

CAUTIONS = (
    "The Sun is in the belt. Pointing optics near the Sun injures eyes and instruments: every chart whose field lies "
    "within 20° of the Sun says so.",
    "Times of twilight and of the Moon are for planning. The site's rules and the observatory's own safety procedures "
    "come first.",
    "Colure is not for navigation.",
)
LICENCES = (
    ("Colure", "BSD-3-Clause"),
    ("star catalogue (Tycho-2, Hipparcos-2, Gaia DR3)", "CC BY-SA 3.0 IGO"),
    ("deep-sky objects (OpenNGC)", "CC BY-SA 4.0"),
    ("Colure Sans and Colure Serif, from Source Sans 3, Source Serif 4 and Noto Sans Symbols", "OFL 1.1"),
    ("circle colours", "Okabe & Ito, Color Universal Design (2008)"),
)


def _show(parent: QWidget, title: str, html: str, width: int, height: int) -> QDialog:
    dialog = QDialog(parent)
    dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    dialog.setWindowTitle(title)
    text = QTextBrowser(dialog)
    text.setOpenLinks(False)
    text.setHtml(html)
    text.setAccessibleName(title)
    buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close, dialog)
    buttons.rejected.connect(dialog.reject)
    column = QVBoxLayout(dialog)
    column.addWidget(text)
    column.addWidget(buttons)
    dialog.resize(width, height)
    dialog.open()
    return dialog


def show_keys(parent: QWidget, rows: list[tuple[str, str]]) -> QDialog:
    """Show what keys and gestures do."""
    lines = "".join(
        f"<tr><td style='padding: 1px 18px 1px 0'><b>{escape(keys)}</b></td><td>{escape(what)}</td></tr>"
        for keys, what in rows
    )
    return _show(parent, "Keys and pointer", f"<table>{lines}</table>", 560, 620)


def show_cautions(parent: QWidget) -> QDialog:
    """Show the cautions."""
    return _show(parent, "Cautions", "".join(f"<p>{escape(text)}</p>" for text in CAUTIONS), 480, 260)


def show_about(parent: QWidget) -> QDialog:
    """Show the version and the licences."""
    cell = "<td style='padding-right: 18px'>{}</td>"
    lines = "".join(f"<tr>{''.join(cell.format(escape(part)) for part in row)}</tr>" for row in LICENCES)
    heading = f"<p><b>Colure {escape(__version__)}</b>: charts and coordinates near the ecliptic.</p>"
    return _show(parent, "About Colure", f"{heading}<table>{lines}</table>", 640, 280)

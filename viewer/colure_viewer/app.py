"""Starts the window: an application in the shipped fonts, a session, and the event loop."""

import gc
import os
import sys
from pathlib import Path

# One BLAS thread, set before numpy loads: a second one adds stalls of several milliseconds to small products.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from PySide6.QtCore import QSettings, QSize
from PySide6.QtWidgets import QApplication

from colure.session import Session
from colure_viewer import style
from colure_viewer.desk import Desk
from colure_viewer.themes import THEMES
from colure_viewer.window import Window

DEFAULT_SIZE = QSize(1440, 900)


def application() -> QApplication:
    """Return the running application, or start one."""
    running = QApplication.instance()
    made = running if isinstance(running, QApplication) else QApplication(sys.argv[:1])
    made.setApplicationName("colure")
    made.setApplicationDisplayName("Colure")
    if made.style().name() != "fusion":
        made.setStyle("Fusion")
    style.set_font(made)
    return made


def window(session: Session | None = None, path: Path | None = None, settings: QSettings | None = None) -> Window:
    """Return a window on a session, the demo by default, dressed in the theme used last."""
    made = application()
    desk = Desk(session if session is not None else Session.demo())
    desk.path = path
    settings = settings if settings is not None else QSettings("colure", "colure")
    theme = THEMES.get(str(settings.value("theme", "")))
    if theme is not None:
        desk.set_theme(theme)
    # The style sheet waits with the panels that it is for: the first chart needs only the palette.
    made.setPalette(style.palette(desk.theme))
    shown = Window(desk, settings)
    size = settings.value("size")
    shown.resize(size if isinstance(size, QSize) else DEFAULT_SIZE)
    desk.setParent(shown)
    return shown


def start_collector() -> None:
    """Let the collector of garbage begin, on what is made from now on.

    What is alive by now lives as long as the one window of the program: it need not be searched while time runs.
    """
    gc.freeze()
    gc.enable()


def run(path: str | Path | None = None) -> int:
    """Open the window, on a session file if one is given, and return the exit code when it closes.

    Raises the SessionError of a file that cannot be read, before any window is there.
    """
    session = None
    report: tuple[str, ...] = ()
    if path is not None:
        from colure import session_file

        path = Path(path)
        session, report = session_file.read(path)
    made = application()
    shown = window(session, path)
    if report:
        shown.note("; ".join(report))
    shown.chart.painted.connect(start_collector)
    shown.show()
    return made.exec()

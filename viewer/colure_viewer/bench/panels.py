"""Figures of the window's panels: how often a second the ledger's panel and its arrows follow the pointer."""

import tempfile
from itertools import count
from pathlib import Path

from PySide6.QtCore import QCoreApplication, QEvent, QPointF, QSettings, Qt
from PySide6.QtGui import QMouseEvent

from colure_viewer import app
from colure_viewer.bench.measure import Figure, Target, in_turn

MOVES = 200


def pointer_panel() -> Figure:
    """Moves of the pointer over the chart a second, each with its ledger, the panel's table and the arrows repainted.

    The part is the same without the ledger following: the line under the chart alone.
    """
    application = app.application()  # Qt forgets an application that nobody holds
    with tempfile.TemporaryDirectory() as folder:
        settings = QSettings(str(Path(folder) / "settings.ini"), QSettings.Format.IniFormat)
        window = app.window(settings=settings)
        window.resize(1440, 900)
        window.show()
        while window.right is None or not window.isVisible():
            application.processEvents()
        turn = count()
        none = Qt.MouseButton.NoButton

        def move() -> None:
            at = next(turn)
            here = QPointF(300.0 + at % 400, 250.0 + 7 * at % 300)
            there, keys = window.chart.mapToGlobal(here), Qt.KeyboardModifier.NoModifier
            moved = QMouseEvent(QEvent.Type.MouseMove, here, there, none, none, keys)
            QCoreApplication.sendEvent(window.chart, moved)
            # Once for the ledger, once for the painting that it asks for.
            application.processEvents()
            application.processEvents()

        alone = in_turn({"alone": move}, runs=MOVES)["alone"]
        window.right.ledger.follow.click()
        spent = in_turn({"following": move}, runs=MOVES)["following"]
        shown = window.right.ledger.subject
        followed = shown is not None and window.right.ledger.found is not None and shown.name == "under the pointer"
        window.close()
        window.deleteLater()
        application.processEvents()
    if not followed:
        raise RuntimeError("the panel did not follow the pointer, so its pace says nothing")
    return Figure(1e3 / spent, "/s", (Target("min", 60.0),), parts={"without the ledger": 1e3 / alone})

"""The bare window: rooms for the panels around the chart, the line at the foot, and what every command shares."""

from typing import TYPE_CHECKING

from PySide6.QtCore import QSettings, QSize, QTimer
from PySide6.QtGui import QAction
from PySide6.QtWidgets import QHBoxLayout, QLabel, QMainWindow, QMenu, QVBoxLayout, QWidget

from colure_viewer.chart import ChartWidget
from colure_viewer.desk import Desk
from colure_viewer.jobs import Jobs

if TYPE_CHECKING:
    from colure_viewer.hand import Hand
    from colure_viewer.panels.sides import LeftSide, RightSide, TopBar

LEFT, RIGHT, TOP, FOOT = 270, 350, 68, 26
"""Room kept for the panels before they are there, in logical pixels."""
NOTICE_MS = 8000


class Shell(QMainWindow):
    """Chart, rooms and foot; the classes built on it add the commands."""

    def __init__(self, desk: Desk, settings: QSettings | None = None) -> None:
        super().__init__()
        self.desk = desk
        self.settings = settings if settings is not None else QSettings("colure", "colure")
        self.jobs = Jobs(self)
        self.hand: Hand | None = None
        self.top: TopBar | None = None
        self.left: LeftSide | None = None
        self.right: RightSide | None = None
        self.chart = ChartWidget(desk)
        self._hover = QLabel()
        self.setWindowTitle("Colure")
        # Empty rooms of the panels' sizes: the chart does not move when the panels come.
        self._top_room, self._left_room, self._right_room, self._foot_room = (QWidget() for _ in range(4))
        self._foot_room.setFixedHeight(FOOT)
        self._top_room.setFixedHeight(TOP)
        self._left_room.setFixedWidth(LEFT)
        self._right_room.setFixedWidth(RIGHT)
        middle = QHBoxLayout()
        middle.setContentsMargins(0, 0, 0, 0)
        middle.setSpacing(0)
        middle.addWidget(self._left_room)
        middle.addWidget(self.chart, 1)
        middle.addWidget(self._right_room)
        whole = QWidget()
        column = QVBoxLayout(whole)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self._top_room)
        column.addLayout(middle, 1)
        column.addWidget(self._foot_room)
        self.setCentralWidget(whole)
        self.setMinimumSize(QSize(1000, 660))
        self.actions_by_name: dict[str, QAction | QMenu] = {}
        desk.checker = self.chart.check
        desk.filed.connect(self._retitle)
        desk.faulted.connect(self.say)
        desk.noted.connect(self.note)
        self._notice = QTimer(self)
        self._notice.setSingleShot(True)
        self._notice.timeout.connect(lambda: self._show_hover("", False))
        self._retitle()

    def _check(self, name: str, on: bool) -> None:
        action = self.actions_by_name.get(name)
        if isinstance(action, QAction):
            action.setChecked(on)

    def _retitle(self) -> None:
        name = self.desk.path.name if self.desk.path else "Demo session"
        self.setWindowTitle(f"{name}[*] · Colure")
        self.setWindowModified(self.desk.modified)

    # Telling

    def say(self, text: str) -> None:
        """Show one line about what was refused."""
        self._show_hover(text, True)
        self._notice.start(NOTICE_MS)

    def note(self, text: str) -> None:
        """Show one line about what was done."""
        self._show_hover(text, False)
        self._notice.start(NOTICE_MS)

    def _show_hover(self, text: str, fault: bool) -> None:
        name = "notice" if fault else ""
        if self._hover.objectName() != name:
            self._hover.setObjectName(name)
            self._hover.style().unpolish(self._hover)
            self._hover.style().polish(self._hover)
        self._hover.setText(text)
        self._hover.setToolTip(text)

    def _hovered(self, text: str) -> None:
        if not self._notice.isActive():
            self._show_hover(text, False)

"""Where the panels stand: two rows on top, a column on either side of the chart, and the progress of slow work."""

from collections.abc import Callable

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QFrame,
    QHBoxLayout,
    QLabel,
    QProgressBar,
    QScrollArea,
    QToolButton,
    QVBoxLayout,
    QWidget,
)

from colure.targets import Target
from colure_viewer.desk import Desk
from colure_viewer.jobs import Jobs
from colure_viewer.panels.belt import BeltPanel
from colure_viewer.panels.circles import CirclesPanel
from colure_viewer.panels.direction import DirectionPanel, MeasurePanel
from colure_viewer.panels.ledger import LedgerPanel
from colure_viewer.panels.momentbar import MomentBar, SiteBar
from colure_viewer.panels.overlays import OverlaysPanel
from colure_viewer.panels.search import SearchBar
from colure_viewer.panels.show import BodiesPanel, LayersPanel
from colure_viewer.panels.viewbar import ViewBar

MARGIN = 10


class TopBar(QWidget):
    """Moment, site and search above the view's controls."""

    def __init__(self, desk: Desk, found: Callable[[Target], None], parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.moment = MomentBar(desk)
        self.site = SiteBar(desk)
        self.search = SearchBar(desk, found)
        self.view = ViewBar(desk)
        first = QHBoxLayout()
        first.setSpacing(14)
        first.addWidget(self.moment, 5)
        first.addWidget(self.site, 4)
        first.addWidget(self.search, 2)
        column = QVBoxLayout(self)
        column.setContentsMargins(MARGIN, 4, MARGIN, 5)
        column.setSpacing(4)
        column.addLayout(first)
        column.addWidget(self.view)


class _Column(QScrollArea):
    """A column of titled panels that scrolls where the window is too low."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setWidgetResizable(True)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        inside = QWidget()
        inside.setObjectName("column")
        self._rows = QVBoxLayout(inside)
        self._rows.setContentsMargins(MARGIN, 0, MARGIN, MARGIN)
        self._rows.setSpacing(4)
        self.setWidget(inside)

    def add(self, title: str, panel: QWidget) -> None:
        """Add a panel under a heading, or under none."""
        if title:
            heading = QLabel(title)
            heading.setObjectName("heading")
            self._rows.addWidget(heading)
        self._rows.addWidget(panel)

    def close_up(self) -> None:
        """Leave the rest of the column free."""
        self._rows.addStretch(1)


class LeftSide(_Column):
    """Circles, belt, bodies, layers and overlays."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.circles = CirclesPanel(desk)
        self.belt = BeltPanel(desk)
        self.bodies = BodiesPanel(desk)
        self.layers = LayersPanel(desk)
        self.overlays = OverlaysPanel(desk)
        for title, panel in (
            ("Circles", self.circles),
            ("Belt", self.belt),
            ("Bodies", self.bodies),
            ("Layers", self.layers),
            ("Overlays", self.overlays),
        ):
            self.add(title, panel)
        self.close_up()


class RightSide(_Column):
    """The ledger of the selected direction, the direction in every frame, and the measurement."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.ledger = LedgerPanel(desk)
        self.direction = DirectionPanel(desk)
        self.measure = MeasurePanel(desk)
        self.add("", self.ledger)
        self.add("", self.direction)
        self.add("Measure", self.measure)
        self.close_up()


class Progress(QWidget):
    """A bar that moves while slow work is done beside the window, and a button that gives it up."""

    def __init__(self, jobs: Jobs, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._title = QLabel(self)
        bar = QProgressBar(self)
        # How long it takes is not known: the bar only shows that work goes on.
        bar.setRange(0, 0)
        bar.setTextVisible(False)
        bar.setFixedSize(120, 10)
        bar.setAccessibleName("Work in progress")
        cancel = QToolButton(self)
        cancel.setText("Cancel")
        cancel.clicked.connect(jobs.cancel)
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 4, 0)
        row.addWidget(self._title)
        row.addWidget(bar)
        row.addWidget(cancel)
        jobs.began.connect(self._began)
        jobs.ended.connect(self.hide)
        self.hide()

    def _began(self, title: str) -> None:
        self._title.setText(title)
        self.show()

"""The moment and the site: typed, stepped, and running at a chosen speed."""

from dataclasses import replace

from PySide6.QtCore import QElapsedTimer, QTimer
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QToolButton, QWidget

from colure.errors import ColureError
from colure.moment import SCALES, Moment
from colure.session import Session
from colure.sites import Site
from colure.time_steps import Step
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry

SPEEDS = (
    ("true speed", 1.0 / 86400.0),
    ("1 min/s", 1.0 / 1440.0),
    ("10 min/s", 10.0 / 1440.0),
    ("1 h/s", 1.0 / 24.0),
    ("6 h/s", 0.25),
    ("1 d/s", 1.0),
    ("1 week/s", 7.0),
    ("1 month/s", 30.436875),
    ("1 yr/s", 365.25),
    ("10 yr/s", 3652.5),
    ("1 century/s", 36525.0),
)
"""Speeds of running time, in days of the sky to a second of the clock."""

FRAME_MS = 16


class MomentBar(QWidget):
    """The moment's field, scale, step and run controls."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self.field = Entry("Moment", self._typed, self)
        self.field.setMinimumWidth(196)
        self.field.setPlaceholderText("2026-12-01 21:36 UTC")
        self.scale = QComboBox(self)
        self.scale.addItems(SCALES)
        self.scale.setAccessibleName("Time scale in which the moment is shown")
        self.scale.setToolTip("Time scale")
        self.scale.activated.connect(self._rescale)
        self.step = Entry("Step", self._typed_step, self)
        self.step.setFixedWidth(84)
        self._step = Step(1.0, "d")
        self.step.show_value(str(self._step))
        self.back = self._button("−", "One step back", lambda: self.go(-1))
        self.forth = self._button("+", "One step on", lambda: self.go(1))
        self.run_back = self._button("◀", "Run back in time", lambda: self.run(-1), checkable=True)
        self.run_forth = self._button("▶", "Run on in time", lambda: self.run(1), checkable=True)
        self.speed = QComboBox(self)
        self.speed.addItems([name for name, _ in SPEEDS])
        self.speed.setCurrentIndex(3)
        self.speed.setAccessibleName("Speed of running time")
        self.speed.setToolTip("Speed of running time")
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(4)
        label = QLabel("&Moment", self)
        label.setBuddy(self.field)
        label.setObjectName("bar")
        for part in (label, self.field, self.scale, self.back, self.step, self.forth):
            row.addWidget(part, 1 if part is self.field else 0)
        row.addSpacing(6)
        for part in (self.run_back, self.run_forth, self.speed):
            row.addWidget(part)
        self._direction = 0
        self._clock = QElapsedTimer()
        self._timer = QTimer(self)
        self._timer.setInterval(FRAME_MS)
        self._timer.timeout.connect(self._tick)
        desk.changed.connect(self._show)
        desk.stopped.connect(self._halt)
        self._show()

    def _button(self, text: str, name: str, act: object, checkable: bool = False) -> QToolButton:
        button = QToolButton(self)
        button.setText(text)
        button.setToolTip(name)
        button.setAccessibleName(name)
        button.setCheckable(checkable)
        button.clicked.connect(act)
        return button

    @property
    def running(self) -> int:
        """1 while time runs on, −1 while it runs back, 0 while it stands."""
        return self._direction

    def _show(self) -> None:
        moment = self._desk.session.moment
        self.field.show_value(str(moment.text(3 if self._fine() else 0)))
        self.scale.setCurrentText(moment.scale)

    def _fine(self) -> bool:
        """Whether the moment has a fraction of a second that a rounded text would lose."""
        if self._direction:
            return False
        moment = self._desk.session.moment
        return bool(abs(float(moment.civil(None, 3)[5]) % 1.0) > 0.0)

    def _typed(self, text: str) -> str | None:
        return self._desk.edit(lambda s: replace(s, moment=self._parsed(text)), "set the moment")

    def _parsed(self, text: str) -> Moment:
        return Moment.parse(text)

    def _typed_step(self, text: str) -> str | None:
        try:
            self._step = Step.parse(text)
        except ColureError as fault:
            return str(fault)
        self.step.show_value(str(self._step))
        return None

    def _rescale(self) -> None:
        scale = self.scale.currentText()
        reason = self._desk.edit(lambda s: replace(s, moment=s.moment.with_scale(scale)), f"show the moment in {scale}")
        shown = self._desk.session.moment.shown_scale
        if reason is not None:
            self._desk.faulted.emit(reason)
        elif shown != scale:
            self._desk.faulted.emit(f"{scale} is not defined at this moment: shown in {shown}")
        self._show()

    def go(self, count: int) -> None:
        """Move by whole steps."""
        self.stop()

        def moved(s: Session) -> Session:
            return replace(s, moment=self._step.from_moment(s.moment, float(count)))

        reason = self._desk.edit(moved, "step the moment")
        if reason is not None:
            self._desk.faulted.emit(reason)

    def run(self, direction: int) -> None:
        """Let time run on (1) or back (−1); the same again stops it."""
        if self._direction == direction or direction == 0:
            self.stop()
            return
        self._direction = direction
        self.run_back.setChecked(direction < 0)
        self.run_forth.setChecked(direction > 0)
        self._clock.start()
        self._timer.start()

    def stop(self) -> None:
        """Let time stand; the whole run is one entry of the history."""
        if self._direction:
            self._halt()
            self._desk.settle()

    def _halt(self) -> None:
        self._timer.stop()
        self._direction = 0
        self.run_back.setChecked(False)
        self.run_forth.setChecked(False)

    def _tick(self) -> None:
        seconds = min(self._clock.restart() / 1000.0, 0.25)
        days = self._direction * seconds * SPEEDS[self.speed.currentIndex()][1]
        session = self._desk.session
        try:
            moved = replace(session, moment=session.moment.shifted(days))
        except ColureError as fault:
            self.stop()
            self._desk.faulted.emit(str(fault))
            return
        self._desk.pass_by(moved, "run time")


class SiteBar(QWidget):
    """The site's field: a name, an observatory code, or longitude, latitude and height."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self.field = Entry("Site", self._typed, self)
        self.field.setMinimumWidth(150)
        self.field.setPlaceholderText("name, code, or LON LAT HEIGHT")
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(4)
        label = QLabel("&Site", self)
        label.setBuddy(self.field)
        label.setObjectName("bar")
        row.addWidget(label)
        row.addWidget(self.field, 1)
        desk.changed.connect(self._show)
        self._show()

    def _show(self) -> None:
        self.field.show_value(str(self._desk.session.site))

    def _typed(self, text: str) -> str | None:
        # What the field itself shows, a name with its coordinates, means the site in force.
        if text.strip() == str(self._desk.session.site):
            return None
        return self._desk.edit(lambda s: replace(s, site=Site.parse(text)), "set the site")

"""The ledger of the selected direction: its steps with their sizes, switches and arrows, and copying."""

import math
from dataclasses import replace
from functools import partial

import numpy as np
from PySide6.QtCore import QEvent, QObject, QPointF, Qt, QTimer
from PySide6.QtGui import QGuiApplication, QMouseEvent, QShowEvent
from PySide6.QtWidgets import QCheckBox, QComboBox, QGridLayout, QHBoxLayout, QLabel, QPushButton, QVBoxLayout, QWidget

from colure import ledger, pointing
from colure.angles import format_number
from colure.errors import ColureError
from colure.everyframe import FRAMES
from colure.ledger import Ledger
from colure.ledger.printing import CAUTION, near_sun
from colure.session import PLACES, Session
from colure.stepnames import STEPS
from colure_viewer.chart import ChartWidget
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry
from colure_viewer.panels import labels
from colure_viewer.panels.arrows import StepArrows
from colure_viewer.panels.direction import frame_words
from colure_viewer.panels.steps import StepsModel, StepsView
from colure_viewer.panels.subject import Subject, reduced

EMPTY = "Click a star, a body or any point of the chart to see every step of its reduction; or follow the pointer."
FACTORS = (1.0, 10.0, 100.0, 1e3, 1e4, 1e5, 1e6)
RUNNING_MS = 150
"""While time runs the figures follow a few times a second."""


class LedgerPanel(QWidget):
    """The ledger of the selection, or of what is under the pointer."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self._chart: ChartWidget | None = None
        self._arrows: StepArrows | None = None
        self._frame: str | None = None
        self._pointer: QPointF | None = None
        self._key: object = None
        self.found: Ledger | None = None
        self.subject: Subject | None = None
        self._make()
        self._lay_out()
        self._soon = QTimer(self)
        self._soon.setSingleShot(True)
        self._soon.setInterval(RUNNING_MS)
        self._soon.timeout.connect(self.refresh)
        # Several moves of the pointer between two frames are one ledger.
        self._next = QTimer(self)
        self._next.setSingleShot(True)
        self._next.setInterval(0)
        self._next.timeout.connect(self.refresh)
        desk.selected.connect(self.refresh)
        desk.changed.connect(self._changed)
        desk.themed.connect(self.table.fit)
        self.refresh()

    def _make(self) -> None:
        self.title = QLabel(self)
        self.title.setObjectName("heading")
        self.title.setWordWrap(True)
        self.detail = QLabel(self)
        self.detail.setWordWrap(True)
        self.frame = Entry("Frame that the steps lead to", self._typed_frame, self)
        self.frames = QComboBox(self)
        self.frames.setLineEdit(self.frame)
        self.frames.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
        self.frames.setCompleter(None)  # type: ignore[arg-type]
        self.frames.setAccessibleName("Frames that the steps may lead to")
        self.frames.addItems(list(FRAMES))
        self.frames.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        self.frames.setMinimumContentsLength(10)
        self.frames.textActivated.connect(self._picked_frame)
        self.place = QComboBox(self)
        self.place.addItem("as the frame implies", None)
        for place in PLACES:
            self.place.addItem(place, place)
        self.place.setAccessibleName("Place that the steps lead to")
        self.place.setToolTip("How far the direction is reduced")
        self.place.activated.connect(self.refresh)
        self.model = StepsModel(self)
        self.table = StepsView(self.model, self)
        self.model.ticked.connect(self._ticked)
        self.table.chosen.connect(self._show_arrows)
        self.end = QLabel(self)
        self.end.setWordWrap(True)
        self.caution = QLabel(CAUTION, self)
        self.caution.setObjectName("notice")
        self.caution.setWordWrap(True)
        self.follow = QCheckBox("follow the pointer", self)
        self.follow.setToolTip("Show the ledger of the direction under the pointer")
        self.follow.clicked.connect(self._follow)
        self.arrows = QCheckBox("arrows on the chart", self)
        self.arrows.setToolTip("An arrow for each step, numbered as here; turns of the axes are dashed")
        self.arrows.setChecked(True)
        self.arrows.clicked.connect(self._show_arrows)
        self.factor = QComboBox(self)
        self.factor.addItem("fitted", None)
        for value in FACTORS:
            self.factor.addItem(f"× {format_number(value, 0)}", value)
        self.factor.setAccessibleName("How far the arrows are enlarged")
        self.factor.setToolTip("Fitted: the chosen step, or else the longest, is given a good length")
        self.factor.activated.connect(self._show_arrows)
        self.scale = QLabel(self)
        self.scale.setObjectName("muted")
        self.scale.setWordWrap(True)
        self.left_out = labels.lines(self, "Steps that are left out of the chart", "notice")
        self.take_in = QPushButton("Take all in", self)
        self.take_in.setToolTip("Take every step that is left out in again")
        self.take_in.clicked.connect(self._take_all_in)
        self.matrices = QCheckBox("matrices", self)
        self.matrices.setToolTip("Copy the matrices of the turns as well, as text and as JSON")
        self.copies = {kind: QPushButton(text, self) for kind, text in _COPIES}
        for kind, button in self.copies.items():
            button.setAccessibleName(f"Copy the ledger as {button.text()}")
            button.setToolTip(f"Copy the ledger as {button.text()}")
            button.clicked.connect(partial(self.copy, kind))

    def _lay_out(self) -> None:
        form = QGridLayout()
        form.setHorizontalSpacing(6)
        form.setVerticalSpacing(4)
        self._names = []
        for row, (text, part) in enumerate((("to", self.frames), ("place", self.place))):
            label = QLabel(text, self)
            label.setBuddy(part)
            self._names.append(label)
            form.addWidget(label, row, 0)
            form.addWidget(part, row, 1)
        form.setColumnStretch(1, 1)
        drawn = QHBoxLayout()
        drawn.setSpacing(6)
        drawn.addWidget(self.arrows)
        drawn.addStretch(1)
        drawn.addWidget(self.factor)
        foot = QHBoxLayout()
        foot.setSpacing(4)
        self._copy_label = QLabel("Copy", self)
        foot.addWidget(self._copy_label)
        for button in self.copies.values():
            foot.addWidget(button)
        foot.addStretch(1)
        foot.addWidget(self.matrices)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        column.addWidget(self.title)
        column.addWidget(self.detail)
        column.addLayout(form)
        column.addWidget(self.table)
        column.addWidget(self.end)
        column.addWidget(self.caution)
        column.addWidget(self.left_out)
        column.addWidget(self.take_in, 0, Qt.AlignmentFlag.AlignLeft)
        column.addLayout(drawn)
        column.addWidget(self.scale)
        column.addWidget(self.follow)
        column.addLayout(foot)

    def showEvent(self, event: QShowEvent) -> None:
        """The fonts of the window are known now."""
        super().showEvent(event)
        self.table.fit()

    def attach(self, chart: ChartWidget) -> None:
        """Draw arrows on a chart and listen to the pointer over it."""
        self._chart = chart
        self._arrows = StepArrows(self._desk, chart)
        chart.installEventFilter(self)
        self._show_arrows()

    # Following

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Follow the pointer over the chart while no button is down."""
        if self.follow.isChecked():
            if event.type() == QEvent.Type.MouseMove and isinstance(event, QMouseEvent):
                if event.buttons() == Qt.MouseButton.NoButton:
                    self._pointer = event.position()
                    self._next.start()
            elif event.type() == QEvent.Type.Leave:
                self._pointer = None
                self._next.start()
        return False

    def _follow(self) -> None:
        self._pointer = None
        self.refresh()

    def _changed(self, transient: bool) -> None:
        if not transient:
            self.refresh()
        elif not self._soon.isActive():
            self._soon.start()

    def _subject(self) -> Subject | None:
        chart = self._chart
        if self._pointer is not None and chart is not None and chart.current is not None:
            vector = chart.scene.unproject(self._pointer.x(), self._pointer.y())
            if vector is not None:
                return Subject(pointing.DIRECTION, -1, "under the pointer", np.asarray(vector, dtype=np.float64), 1.0)
        chosen = self._desk.selection
        if chosen is None:
            return None
        return Subject(chosen.kind, chosen.row, chosen.name, chosen.vector, chosen.sigma_arcsec)

    # Showing

    @property
    def frame_in_force(self) -> str:
        """The frame that the steps lead to: the user's choice, or the one with the most steps that the chart has."""
        return self._frame or ("horizon" if self._desk.session.from_site else "equator/true/date")

    def refresh(self) -> None:
        """Show the ledger of the selection or the pointer, if it is another than is shown."""
        self._soon.stop()
        session, subject = self._desk.session, self._subject()
        self.frame.show_value(self.frame_in_force)
        place = self.place.currentData()
        key = None if subject is None else (
            subject.key, session.moment, session.site, session.from_site, session.place, session.omitted,
            self.frame_in_force, place,
        )  # fmt: skip
        if key is None:
            self._show_left_out()
        elif key == self._key:
            if subject is not None and self.subject is not None:
                self.subject = subject
            self._show_arrows()
            return
        self._key, self.subject, self.found = key, subject, None
        fault = ""
        if subject is not None:
            try:
                self.found = reduced(subject, session, self.frame_in_force, place)
            except ColureError as raised:
                fault = str(raised)
        self._show(fault)

    def _show(self, fault: str) -> None:
        found, subject = self.found, self.subject
        self._show_left_out()
        self.title.setText("Ledger" if subject is None else f"Ledger · {subject.name}")
        for part in (self.table, self.end, self.arrows, self.factor, self.scale, self.matrices, self._copy_label,
                     *self.copies.values()):  # fmt: skip
            part.setVisible(found is not None)
        for part in (self.frames, self.place, *self._names):
            part.setVisible(subject is not None)
        name = "muted" if subject is None else "notice" if fault else ""
        labels.dress(self.detail, name)
        # While the pointer is followed the Sun is not looked for at every move: the chart has its own caution.
        self.caution.setVisible(found is not None and self._pointer is None and near_sun(found))
        if found is None:
            self.detail.setText(fault or EMPTY)
            self.model.show(None)
        else:
            seen_from = found.observer.site.name if found.observer.site is not None else "the Earth's centre"
            self.detail.setText(f"{found.place} place, from {seen_from}")
            self.model.show(found)
            self.end.setText(_end(found))
        self.table.fit()
        self._show_arrows()

    def _show_left_out(self) -> None:
        """Say what the whole chart does without: this ledger need not have those steps."""
        omitted = self._desk.session.omitted
        self.left_out.setText(f"The whole chart is without {', '.join(omitted)}." if omitted else "")
        self.left_out.setVisible(bool(omitted))
        self.take_in.setVisible(bool(omitted))

    def _show_arrows(self) -> None:
        if self._arrows is None:
            return
        shown = self.found is not None and self.subject is not None and self.arrows.isChecked()
        self._arrows.show_ledger(
            self.found if shown else None,
            self.subject.vector if shown and self.subject is not None else None,
            self.table.step,
            self.factor.currentData(),
            self.subject.name.casefold() if self.subject and self.subject.kind == pointing.BODIES else "",
        )
        self.factor.setEnabled(self.arrows.isChecked())
        text = ""
        if shown:
            laid = self._arrows.laid
            text = (
                "Arrows: the direction is off the map."
                if laid is None
                else f"Arrows {laid.text.removeprefix('steps ')}"
            )
            if laid is not None:
                text += "".join(
                    f"; {word}: {', '.join(map(str, which))}"
                    for word, which in (("too long", laid.long), ("too short", laid.short))
                    if which
                )
        if text != self.scale.text():
            self.scale.setText(text)

    # Acting

    def _picked_frame(self, text: str) -> None:
        self.frame.setModified(True)
        self.frame.commit()

    def _typed_frame(self, text: str) -> str | None:
        from colure.frames import Frame

        if not text.strip():
            self._frame = None
        else:
            try:
                self._frame = str(Frame.parse(text.strip().replace("−", "-")))
            except ColureError as fault:
                return str(fault)
        self.frame.show_value(self.frame_in_force)
        self.refresh()
        return None

    def _ticked(self, step: str, on: bool) -> None:
        """Leave a step out of the whole chart, or take it in again."""

        def make(s: Session) -> Session:
            left = set(s.omitted) - {step} if on else {*s.omitted, step}
            return replace(s, omitted=tuple(name for name in STEPS if name in left))

        reason = self._desk.edit(make, f"{'take in' if on else 'leave out'} {step}")
        if reason is not None:
            self._desk.faulted.emit(reason)

    def _take_all_in(self) -> None:
        reason = self._desk.edit(lambda s: replace(s, omitted=()), "take all steps in")
        if reason is not None:
            self._desk.faulted.emit(reason)

    def copy(self, kind: str = "text", _checked: bool = False) -> None:
        """Put the ledger on the clipboard as "text", "json" or "csv"."""
        found = self.found
        if found is None:
            self._desk.faulted.emit("There is no ledger to copy: nothing is selected")
            return
        matrices = self.matrices.isChecked()
        text = {
            "text": lambda: ledger.as_text(found, matrices=matrices),
            "json": lambda: ledger.as_json(found, matrices=matrices),
            "csv": lambda: ledger.as_csv(found),
        }[kind]()
        QGuiApplication.clipboard().setText(text)
        self._desk.noted.emit(f"Copied the ledger of {found.target} as {dict(_COPIES)[kind]}")


_COPIES = (("text", "text"), ("json", "JSON"), ("csv", "CSV"))


def _end(found: Ledger) -> str:
    """Return the end and its uncertainty in a line."""
    unknown = [one.step for one in found.entries if not math.isfinite(one.uncertainty_arcsec)]
    known = found.uncertainty_arcsec
    places = min(max(1 - math.floor(math.log10(known)), 0), 6) if known else 0
    total = f"± {format_number(known, places)}″ (1σ)" if known else "1σ unknown" if unknown else "exact"
    without = f", without {', '.join(unknown)}" if known and unknown else ""
    return f"End in {frame_words(found.frame)}: {total}{without}"

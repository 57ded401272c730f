"""The dialog of the audit, "which frame is this coordinate in?": positions, what they are held against, the verdict."""

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication, QKeyEvent
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
    QComboBox,
    QDialog,
    QFrame,
    QGridLayout,
    QHBoxLayout,
    QHeaderView,
    QLabel,
    QLineEdit,
    QPlainTextEdit,
    QPushButton,
    QScrollArea,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from colure import pointing
from colure.errors import ColureError
from colure.everyframe import FRAMES
from colure.moment import Moment
from colure.overlays import Overlay
from colure.session import BODIES, PLACES
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry, FaultNote
from colure_viewer.jobs import Jobs
from colure_viewer.panels import auditing, labels
from colure_viewer.panels.asking import parse_frame
from colure_viewer.panels.auditing import Answer, Asked
from colure_viewer.panels.sides import Progress

HINT = (
    "Type one position as it was given to you, with all its digits, and what it should be the position of. Without a "
    "reference the star catalogue is searched; five positions and more are dated together."
)
CATALOGUE = "the star catalogue"
COLUMNS = ("3σ", "σ", "lon off", "lat off", "explanation")
SIZE = (780, 640)


class PositionsEdit(QPlainTextEdit):
    """A few lines of positions; Tab leaves it, and a refusal is marked in place."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self.setTabChangesFocus(True)
        self.setAccessibleName("Positions, one a line: longitude and latitude as they were given")
        self.setPlaceholderText("LON LAT, one position a line; ? for a coordinate that is not known")
        self.setFixedHeight(self.fontMetrics().lineSpacing() * 4 + 12)
        self._note: FaultNote | None = None
        self.fault: str | None = None
        self.textChanged.connect(lambda: self.mark(None))

    def mark(self, reason: str | None) -> None:
        """Mark the text as refused, with the reason, or take the mark away."""
        if reason == self.fault:
            return
        self.fault = reason
        if reason is not None:
            if self._note is None:
                self._note = FaultNote(self)
            self._note.show_text(reason)
        elif self._note is not None:
            self._note.hide()
        self.setAccessibleDescription(f"Refused: {reason}" if reason else "")
        self.setProperty("fault", reason is not None)
        self.style().unpolish(self)
        self.style().polish(self)


class AuditDialog(QDialog):
    """Asks and answers; it may stay open beside the chart."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle("Which frame is this coordinate in?")
        self._desk = desk
        # Work of its own: neither the chart's stars nor an export take its place.
        self.jobs = Jobs(self)
        self._claim: str | None = None
        self._moment: Moment | None = None
        self._rounding: float | None = None
        self.answer: Answer | None = None
        self._make()
        self._lay_out()
        desk.changed.connect(lambda transient: None if transient else self.refresh())
        desk.selected.connect(self.refresh)
        self.refresh()
        self._show(None)
        self.resize(*SIZE)

    def _make(self) -> None:
        self.source = QComboBox(self)
        self.source.setAccessibleName("What is audited")
        self.source.activated.connect(self._source_chosen)
        self.positions = PositionsEdit(self)
        self.against, self.references = self._choice(
            "What the position should be of: a body, a star or a position", self._typed_against, BODIES
        )
        self.against.setPlaceholderText(CATALOGUE)
        self.selection = QPushButton("Selection", self)
        self.selection.setToolTip("Hold it against what is selected on the chart")
        self.selection.setAccessibleName("Hold the position against what is selected on the chart")
        self.selection.setAutoDefault(False)
        self.selection.clicked.connect(self.take_selection)
        self.claim, self.claims = self._choice(
            "The frame that the numbers are said to be in", self._typed_claim, FRAMES
        )
        self.claim.setPlaceholderText("nothing is said")
        self.place = QComboBox(self)
        self.place.addItem("as the frame implies", None)
        for place in PLACES:
            self.place.addItem(place, place)
        self.place.setAccessibleName("The place that the numbers are said to be")
        self.moment = Entry("Moment of the position; empty for that of the chart", self._typed_moment, self)
        self.rounding = Entry("Uncertainty in arcseconds; empty for half the last digit", self._typed_rounding, self)
        self.rounding.setPlaceholderText("half the last digit")
        self.site = QCheckBox(self)
        self.site.setChecked(self._desk.session.from_site)
        self.audit_button = QPushButton("Audit", self)
        self.audit_button.setDefault(True)
        self.audit_button.clicked.connect(self.audit)
        self.title = labels.lines(self, "Kind of verdict", "heading")
        self.verdict = labels.lines(self, "Verdict")
        self.details = labels.lines(self, "What else the audit says")
        self.command = QLineEdit(self)
        self.command.setReadOnly(True)
        self.command.setAccessibleName("The conversion that mends the data, ready to run")
        self.copy_command = self._copy_button("Copy", "Copy the conversion", self.copy_conversion)
        self.copy_answer = self._copy_button("Copy answer", "Copy the whole answer as text", self.copy_text)
        self.table = QTableWidget(0, len(COLUMNS), self)
        self.table.setHorizontalHeaderLabels(list(COLUMNS))
        self.table.setAccessibleName("Explanations, the nearest first; a dot marks those within 3σ")
        self.table.verticalHeader().hide()
        self.table.verticalHeader().setDefaultSectionSize(22)
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setTabKeyNavigation(False)
        self.table.setShowGrid(False)
        self.table.setMinimumHeight(120)
        header = self.table.horizontalHeader()
        header.setHighlightSections(False)
        for column in range(len(COLUMNS) - 1):
            header.setSectionResizeMode(column, QHeaderView.ResizeMode.ResizeToContents)
        header.setSectionResizeMode(len(COLUMNS) - 1, QHeaderView.ResizeMode.Stretch)

    def _choice(self, name: str, typed: Any, items: tuple[str, ...]) -> tuple[Entry, QComboBox]:
        entry, combo = Entry(name, typed, self), QComboBox(self)
        combo.setLineEdit(entry)
        combo.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
        combo.setCompleter(None)  # type: ignore[arg-type]
        combo.setAccessibleName(name)
        combo.addItems(list(items))
        combo.setCurrentIndex(-1)
        combo.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        combo.setMinimumContentsLength(10)

        def picked(_text: str) -> None:
            entry.setModified(True)
            entry.commit()

        combo.textActivated.connect(picked)
        return entry, combo

    def _copy_button(self, text: str, name: str, act: Any) -> QPushButton:
        button = QPushButton(text, self)
        button.setAccessibleName(name)
        button.setToolTip(name)
        button.setAutoDefault(False)
        button.clicked.connect(act)
        return button

    def _lay_out(self) -> None:
        form = QGridLayout()
        form.setHorizontalSpacing(8)
        form.setVerticalSpacing(4)
        rows = (
            (("audit", self.source), ("said to be", self.claims)),
            (("against", self.references), ("place", self.place)),
            (("moment", self.moment), ("uncertainty", self.rounding)),
        )
        for row, pair in enumerate(rows):
            for at, (text, part) in enumerate(pair):
                label = QLabel(text, self)
                label.setBuddy(part)
                form.addWidget(label, row, 3 * at)
                form.addWidget(part, row, 3 * at + 1)
        form.addWidget(self.selection, 1, 2)
        form.setColumnStretch(1, 1)
        form.setColumnStretch(4, 1)
        foot = QHBoxLayout()
        foot.addWidget(self.site)
        foot.addStretch(1)
        foot.addWidget(Progress(self.jobs, self))
        foot.addWidget(self.audit_button)
        mend = QHBoxLayout()
        mend.setSpacing(4)
        self._mend = QLabel("mends it", self)
        self._mend.setBuddy(self.command)
        mend.addWidget(self._mend)
        mend.addWidget(self.command, 1)
        mend.addWidget(self.copy_command)
        # Long answers scroll by themselves, so that the dialog fits a low screen.
        words = QWidget()
        words.setObjectName("column")
        said = QVBoxLayout(words)
        said.setContentsMargins(0, 0, 6, 0)
        said.setSpacing(4)
        said.addWidget(self.verdict)
        said.addWidget(self.details)
        said.addStretch(1)
        self.area = QScrollArea(self)
        self.area.setFrameShape(QFrame.Shape.NoFrame)
        self.area.setWidgetResizable(True)
        self.area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.area.setWidget(words)
        self.area.setMinimumHeight(90)
        head = QHBoxLayout()
        head.addWidget(self.title, 1)
        head.addWidget(self.copy_answer)
        column = QVBoxLayout(self)
        column.setContentsMargins(12, 10, 12, 12)
        column.setSpacing(6)
        column.addWidget(self.positions)
        column.addLayout(form)
        column.addLayout(foot)
        column.addLayout(head)
        column.addWidget(self.area, 2)
        column.addLayout(mend)
        column.addWidget(self.table, 3)

    # Asking

    def refresh(self) -> None:
        """Offer what the session has now: overlays, moment, site and selection."""
        session, chosen = self._desk.session, self.source.currentData()
        self.source.clear()
        for text, overlay in auditing.names(session.overlays):
            self.source.addItem(text, overlay)
        at = next((at for at in range(self.source.count()) if self.source.itemData(at) == chosen), 0)
        self.source.setCurrentIndex(at)
        self._source_chosen()
        self.moment.setPlaceholderText(session.moment.text())
        self.site.setText(f"from {session.site.name}")
        selection = self._desk.selection
        self.selection.setEnabled(selection is not None)

    def _source_chosen(self) -> None:
        self.positions.setEnabled(self.overlay is None)

    @property
    def overlay(self) -> Overlay | None:
        """The overlay that is audited, or None where positions are typed."""
        found: Overlay | None = self.source.currentData()
        return found

    def take_selection(self) -> None:
        """Hold the position against what is selected on the chart."""
        selection = self._desk.selection
        if selection is None:
            return
        name = selection.name
        if selection.kind == pointing.DIRECTION:
            from colure.arrays import DEG, spherical

            lon, lat = spherical(selection.vector)
            name = f"icrs {float(lon) / DEG:.6f} {float(lat) / DEG:+.6f}"
        self.against.setText(name)
        self.against.setModified(True)
        self.against.commit()

    def _at(self) -> Moment:
        return self._moment if self._moment is not None else self._desk.session.moment

    def _typed_against(self, text: str) -> str | None:
        plain = text.strip()
        try:
            if plain:
                auditing.reference(plain, self._at())
        except ColureError as fault:
            return str(fault)
        self.against.show_value(plain)
        return None

    def _typed_claim(self, text: str) -> str | None:
        try:
            self._claim = parse_frame(text) if text.strip() else None
        except ColureError as fault:
            return str(fault)
        self.claim.show_value(self._claim or "")
        return None

    def _typed_moment(self, text: str) -> str | None:
        try:
            self._moment = Moment.parse(text) if text.strip() else None
        except ColureError as fault:
            return str(fault)
        self.moment.show_value(self._moment.text() if self._moment is not None else "")
        return None

    def _typed_rounding(self, text: str) -> str | None:
        plain = text.strip().rstrip('″"').replace("−", "-")
        try:
            value = float(plain) if plain else None
        except ValueError:
            return f"uncertainty '{plain[:30]}': expected arcseconds, or nothing"
        if value is not None and not 0.0 < value < 3.6e5:
            return f"uncertainty {plain}″: expected more than zero and less than 100°"
        self._rounding = value
        self.rounding.show_value("" if value is None else f"{value:g}″")
        return None

    def audit(self) -> None:
        """Ask, beside the window's own work."""
        entries = (self.against, self.claim, self.moment, self.rounding)
        for entry in entries:
            entry.commit()
        if any(entry.fault is not None for entry in entries):
            return
        numbers = None
        if self.overlay is None:
            try:
                numbers = auditing.read(self.positions.toPlainText(), self._claim, self._rounding)
            except ColureError as fault:
                self.positions.mark(str(fault))
                self.positions.setFocus()
                return
        site = self._desk.session.site if self.site.isChecked() else None
        asked = Asked(
            numbers, self.overlay, self.against.value, self._at(), site, self._claim, self.place.currentData()
        )
        self.jobs.run("Auditing", lambda: auditing.answer(asked), self._show, self._refused)

    def _refused(self, reason: str) -> None:
        self._show(None)
        self.title.setText("Cannot be audited")
        labels.dress(self.verdict, "notice")
        self.verdict.setText(reason)

    # Answering

    def _show(self, found: Answer | None) -> None:
        self.answer = found
        labels.dress(self.verdict, "muted" if found is None else "")
        self.title.setText("" if found is None else found.title)
        self.verdict.setText(HINT if found is None else found.verdict)
        self.details.setText("" if found is None else "\n".join(found.lines))
        command = "" if found is None else "; ".join(found.commands)
        self.command.setText(command)
        self.command.setCursorPosition(0)
        self.command.setToolTip(command)
        for part in (self._mend, self.command, self.copy_command):
            part.setVisible(bool(command))
        self.copy_answer.setVisible(found is not None)
        rows = () if found is None else found.rows
        self.table.setVisible(bool(rows))
        self.table.setRowCount(len(rows))
        for number, row in enumerate(rows):
            for column, text in enumerate(("·" if row.inside else "", row.sigma, row.off_lon, row.off_lat, row.words)):
                item = QTableWidgetItem(text)
                item.setToolTip(f"{row.words} [{row.code}]" + ("\nwithin 3σ" if row.inside else ""))
                if 0 < column < 4:
                    item.setTextAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
                elif column == 0:
                    item.setTextAlignment(Qt.AlignmentFlag.AlignCenter)
                self.table.setItem(number, column, item)
        self.table.scrollToTop()
        self.area.verticalScrollBar().setValue(0)

    def copy_conversion(self) -> None:
        """Put the conversion on the clipboard."""
        if self.answer is not None and self.answer.commands:
            QGuiApplication.clipboard().setText("\n".join(self.answer.commands))
            self._desk.noted.emit("Copied the conversion")

    def copy_text(self) -> None:
        """Put the whole answer on the clipboard."""
        if self.answer is not None:
            QGuiApplication.clipboard().setText(self.answer.text)
            self._desk.noted.emit("Copied the audit's answer")

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return in a field hands over that field; with Ctrl, or on the button, it asks."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            asks = bool(event.modifiers() & Qt.KeyboardModifier.ControlModifier)
            if asks or self.focusWidget() is self.audit_button:
                self.audit()
            return
        super().keyPressEvent(event)

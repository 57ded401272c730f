"""Overlays: other people's tables and image headers on the chart, each with its declared frame and what decided it."""

from collections.abc import Callable
from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor, QIcon, QPixmap
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
    QColorDialog,
    QComboBox,
    QDialog,
    QGridLayout,
    QHBoxLayout,
    QHeaderView,
    QLabel,
    QPushButton,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from colure.angles import format_number
from colure.everyframe import FRAMES
from colure.overlays import Overlay
from colure.session import Session
from colure_viewer.chart import ChartWidget
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry
from colure_viewer.jobs import Jobs
from colure_viewer.panels import labels, matched, stored

EMPTY = "None yet. Open a table (CSV, ECSV, VOTable, FITS) or a FITS image header to lay it on the chart."
FACTORS = (1.0, 10.0, 100.0, 1e3, 1e4, 1e5)
FILES = "Tables and images (*.csv *.ecsv *.txt *.vot *.xml *.votable *.fits *.fit *.fts *.fits.gz *.hdr);;All files (*)"
ROW = 24


class OverlaysPanel(QWidget):
    """The list of overlays and, under it, the parts of the chosen one."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        # Work of its own: neither the chart's stars nor an export take its place.
        self.jobs = Jobs(self)
        self._chart: ChartWidget | None = None
        self._filling = False
        self._seen: object = None
        self._make()
        self._lay_out()
        desk.changed.connect(lambda transient: None if transient else self.refresh())
        desk.themed.connect(self.refresh)
        self.refresh()

    def _make(self) -> None:
        self.table = QTableWidget(0, 2, self)
        self.table.setHorizontalHeaderLabels(["file", "holds"])
        self.table.setAccessibleName("Overlays")
        self.table.verticalHeader().hide()
        self.table.verticalHeader().setDefaultSectionSize(ROW)
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setTabKeyNavigation(False)
        self.table.setShowGrid(False)
        self.table.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        header = self.table.horizontalHeader()
        header.setHighlightSections(False)
        header.setSectionResizeMode(0, QHeaderView.ResizeMode.Stretch)
        header.setSectionResizeMode(1, QHeaderView.ResizeMode.ResizeToContents)
        self.table.itemChanged.connect(self._ticked)
        self.table.itemSelectionChanged.connect(self._show_chosen)
        self.empty = QLabel(EMPTY, self)
        self.empty.setObjectName("muted")
        self.empty.setWordWrap(True)
        self.open_button = self._button("Open…", "Open a table or an image header as an overlay", self.open)
        self.remove_button = self._button("Remove", "Remove the chosen overlay", self.remove)
        self.colour_button = self._button("Colour", "Change the colour of the chosen overlay", self.recolour)
        self.frame = Entry("Declared frame of the overlay", self._typed_frame, self)
        self.frames = QComboBox(self)
        self.frames.setLineEdit(self.frame)
        self.frames.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
        self.frames.setCompleter(None)  # type: ignore[arg-type]
        self.frames.setAccessibleName("Frames that an overlay may be declared in")
        self.frames.addItems([*FRAMES, "ecliptic/mean/B1950"])
        self.frames.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        self.frames.setMinimumContentsLength(8)
        self.frames.textActivated.connect(self._picked_frame)
        self.epoch = Entry("Epoch of the overlay, a Julian year; empty for none", self._typed_epoch, self)
        self.epoch.setPlaceholderText("nobody said")
        self.rule = labels.lines(self, "Which rule decided the frame", "muted")
        self.state = labels.lines(self, "State of the overlay")
        self.again_button = self._button("Look again", "Look for the missing file again", self.look_again)
        self.match_button = self._button("Match", "Match the chosen overlay to the star catalogue", self.match)
        self.names = QCheckBox("names", self)
        self.names.clicked.connect(lambda on: self._change("name an overlay's rows", names_shown=on))
        self.arrows = QCheckBox("residuals", self)
        self.arrows.setToolTip("Arrows from the rows to the stars of the catalogue, after a match")
        self.arrows.clicked.connect(lambda on: self._change("show or hide residuals", arrows=on))
        self.enlarge = QComboBox(self)
        for value in FACTORS:
            self.enlarge.addItem(f"× {format_number(value, 0)}", value)
        self.enlarge.setAccessibleName("How far the residuals are enlarged")
        self.enlarge.activated.connect(
            lambda _at: self._change("enlarge residuals", enlarge=self.enlarge.currentData())
        )
        self.result = labels.lines(self, "What the match to the catalogue says")

    def _button(self, text: str, name: str, act: Callable[[], object]) -> QPushButton:
        button = QPushButton(text, self)
        button.setAccessibleName(name)
        button.setToolTip(name)
        button.clicked.connect(lambda _checked=False: act())
        return button

    def _lay_out(self) -> None:
        buttons = QHBoxLayout()
        buttons.setSpacing(4)
        for button in (self.open_button, self.remove_button, self.colour_button):
            buttons.addWidget(button)
        self.parts = QWidget(self)
        form = QGridLayout(self.parts)
        form.setContentsMargins(0, 0, 0, 0)
        form.setHorizontalSpacing(6)
        form.setVerticalSpacing(4)
        for row, (text, part) in enumerate((("frame", self.frames), ("epoch", self.epoch))):
            label = QLabel(text, self)
            label.setBuddy(part)
            form.addWidget(label, row, 0)
            form.addWidget(part, row, 1)
        form.addWidget(self.rule, 2, 0, 1, 2)
        form.addWidget(self.state, 3, 0, 1, 2)
        form.addWidget(self.again_button, 4, 0, 1, 2)
        line = QHBoxLayout()
        line.setSpacing(6)
        for shown in (self.match_button, self.arrows, self.enlarge):
            line.addWidget(shown)
        form.addLayout(line, 5, 0, 1, 2)
        form.addWidget(self.names, 6, 0, 1, 2)
        form.addWidget(self.result, 7, 0, 1, 2)
        form.setColumnStretch(1, 1)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        column.addWidget(self.empty)
        column.addWidget(self.table)
        column.addLayout(buttons)
        column.addWidget(self.parts)

    def attach(self, chart: ChartWidget) -> None:
        """Let a chart be composed anew when files have changed."""
        self._chart = chart

    # Showing

    @property
    def row(self) -> int:
        """The chosen row, or −1."""
        rows = self.table.selectionModel().selectedRows()
        return rows[0].row() if rows else -1

    @property
    def overlay(self) -> Overlay | None:
        """The chosen overlay, or None."""
        overlays = self._desk.session.overlays
        return overlays[self.row] if 0 <= self.row < len(overlays) else None

    def refresh(self) -> None:
        """Fill the list from the session."""
        overlays = self._desk.session.overlays
        if overlays and self._chart is not None:
            # Files are read when the chart is composed: only then is it known which are missing.
            _ = self._chart.current
        key = (overlays, self._desk.theme.name, stored.generation() if overlays else 0)
        if self._seen == key:
            return
        self._seen = key
        chosen = min(max(self.row, 0), len(overlays) - 1)
        self._filling = True
        self.table.setRowCount(len(overlays))
        for row, overlay in enumerate(overlays):
            fault = stored.fault(overlay)
            swatch = QPixmap(14, 4)
            swatch.fill(QColor(self._desk.theme.line("overlay", overlay.colour_at(row))))
            for column, text in enumerate((overlay.title, "missing" if fault else stored.holds(overlay))):
                item = QTableWidgetItem(text)
                item.setToolTip(fault or f"{overlay.path}\n{overlay.frame}: {overlay.rule}")
                item.setFlags(Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable)
                if column == 0:
                    item.setIcon(QIcon(swatch))
                    item.setFlags(item.flags() | Qt.ItemFlag.ItemIsUserCheckable)
                    item.setCheckState(Qt.CheckState.Checked if overlay.visible else Qt.CheckState.Unchecked)
                elif fault:
                    item.setForeground(QColor(self._desk.theme.colour("fault")))
                self.table.setItem(row, column, item)
        self._filling = False
        shown = min(max(len(overlays), 1), 6)
        self.table.setFixedHeight(shown * ROW + self.table.horizontalHeader().sizeHint().height() + 4)
        self.table.setVisible(bool(overlays))
        self.empty.setVisible(not overlays)
        if overlays and self.row != chosen:
            self.table.selectRow(chosen)
        self._show_chosen()

    def _show_chosen(self) -> None:
        overlay = self.overlay
        self.parts.setVisible(overlay is not None)
        self.remove_button.setEnabled(overlay is not None)
        self.colour_button.setEnabled(overlay is not None)
        if overlay is None:
            return
        fault = stored.fault(overlay)
        self.frame.show_value(overlay.frame)
        self.epoch.show_value("" if overlay.epoch is None else f"{overlay.epoch:.8g}".replace("-", "−"))
        self.rule.setText(f"Decided by: {overlay.rule}" if overlay.rule else "")
        self.rule.setVisible(bool(overlay.rule))
        labels.dress(self.state, "notice" if fault else "")
        self.state.setText(fault or stored.state(overlay))
        self.again_button.setVisible(bool(fault))
        is_table = overlay.kind == "table"
        for part in (self.match_button, self.arrows, self.enlarge, self.result):
            part.setVisible(is_table and not fault)
        self.names.setVisible(bool(overlay.name) and is_table and not fault)
        self.names.setChecked(overlay.names_shown)
        self.arrows.setChecked(overlay.arrows)
        self.enlarge.setCurrentIndex(max(self.enlarge.findData(overlay.enlarge), 0))
        self.enlarge.setEnabled(overlay.arrows)
        found = stored.match(overlay)
        self.arrows.setEnabled(found is not None or overlay.arrows)
        stale = " Its residuals need a match in this frame and epoch: match it again." if overlay.arrows else ""
        self.result.setText(
            "Not matched to the catalogue." + stale if found is None else "\n".join(matched.lines(found))
        )
        labels.dress(self.result, "muted" if found is None else "")

    # Acting

    def _change(self, what: str, at: int | None = None, **changes: Any) -> str | None:
        row = self.row if at is None else at

        def make(s: Session) -> Session:
            overlays = list(s.overlays)
            overlays[row] = replace(overlays[row], **changes)
            return replace(s, overlays=tuple(overlays))

        return self._desk.edit(make, what) if 0 <= row < len(self._desk.session.overlays) else None

    def _ticked(self, item: QTableWidgetItem) -> None:
        if not self._filling and item.column() == 0:
            on = item.checkState() == Qt.CheckState.Checked
            self._change("show or hide an overlay", item.row(), visible=on)

    def _picked_frame(self, _text: str) -> None:
        self.frame.setModified(True)
        self.frame.commit()

    def _typed_frame(self, text: str) -> str | None:
        overlay = self.overlay
        if overlay is None:
            return None
        rule = overlay.rule
        if not rule.startswith("declared by the user"):
            rule = f"declared by the user; opened as {overlay.frame} ({rule})"
        return self._change("declare a frame", frame=text.strip().replace("−", "-"), rule=rule)

    def _typed_epoch(self, text: str) -> str | None:
        from colure.errors import ColureError
        from colure_viewer.panels.asking import parse_epoch

        try:
            return self._change("declare an epoch", epoch=parse_epoch(text))
        except ColureError as fault:
            return str(fault)

    def open(self) -> None:
        """Ask for a file and open it."""
        from PySide6.QtWidgets import QFileDialog

        folder = str(self._desk.path.parent) if self._desk.path else ""
        name, _ = QFileDialog.getOpenFileName(self.window(), "Open overlay", folder, FILES)
        if name:
            self.open_path(Path(name))

    def open_path(self, path: Path) -> None:
        """Open a file beside the window's own work; what it leaves out is asked for."""
        from colure.overlays import opening

        def work() -> tuple[Any, Overlay | None]:
            found = opening.inspect(path)
            return found, opening.declare(found) if found.complete else None

        def done(answer: tuple[Any, Overlay | None]) -> None:
            found, overlay = answer
            if overlay is not None:
                self.add(overlay)
            else:
                self.ask(found)

        self.jobs.run(f"Reading {path.name}", work, done, self._desk.faulted.emit)

    def ask(self, found: Any) -> QDialog:
        """Ask for what a file leaves out; the form stays open until its answers do."""
        from colure.overlays import opening
        from colure_viewer.panels.asking import AskDialog

        def take(dialog: AskDialog, answers: dict[str, Any]) -> None:
            def done(overlay: Overlay) -> None:
                dialog.accept()
                self.add(overlay)

            work = partial(opening.declare, found, **answers)
            self.jobs.run(f"Reading {Path(found.path).name}", work, done, dialog.refuse)

        dialog = AskDialog(found, take, self.window())
        dialog.open()
        return dialog

    def add(self, overlay: Overlay) -> None:
        """Lay an overlay on the chart."""
        reason = self._desk.edit(lambda s: replace(s, overlays=(*s.overlays, overlay)), f"open {overlay.title}")
        if reason is not None:
            self._desk.faulted.emit(reason)
            return
        self.table.selectRow(self.table.rowCount() - 1)
        self._desk.noted.emit(f"Opened {overlay.title}: {overlay.frame}, {stored.state(overlay)}")

    def remove(self) -> None:
        """Remove the chosen overlay."""
        row, overlay = self.row, self.overlay
        if overlay is not None:
            kept = partial(_without, row)
            self._desk.edit(kept, f"remove {overlay.title}")

    def recolour(self) -> None:
        """Ask for a colour."""
        overlay = self.overlay
        if overlay is None:
            return
        chosen = QColorDialog.getColor(QColor(overlay.colour_at(self.row)), self, "Colour of the overlay")
        if chosen.isValid():
            self._change("recolour an overlay", colour=chosen.name().upper())

    def look_again(self) -> None:
        """Look for missing files again."""
        from colure.overlays.store import STORE

        STORE.retry()
        self._renew()

    def match(self) -> None:
        """Match the chosen overlay to the catalogue beside the window's own work, and show its residuals."""
        from colure.overlays import matching

        overlay = self.overlay
        if overlay is None:
            return

        def done(_found: object) -> None:
            now = self._desk.session.overlays
            if overlay in now and not overlay.arrows:
                self._change("match to the catalogue", now.index(overlay), arrows=True)
            self._renew()

        self.jobs.run(f"Matching {overlay.title}", partial(matching.match, overlay), done, self._desk.faulted.emit)

    def _renew(self) -> None:
        """Show what the store holds now."""
        if self._chart is not None:
            self._chart.renew()
        self._seen = None
        self.refresh()


def _without(row: int, session: Session) -> Session:
    return replace(session, overlays=session.overlays[:row] + session.overlays[row + 1 :])

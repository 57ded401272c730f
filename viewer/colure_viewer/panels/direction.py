"""The selected direction in every frame, with copy; and what was measured."""

import re

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
    QComboBox,
    QHBoxLayout,
    QHeaderView,
    QLabel,
    QPushButton,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from colure import everyframe
from colure.errors import ColureError
from colure_viewer.desk import Desk
from colure_viewer.panels import apart

EMPTY = "Click a star, a body or any point of the chart, or search for a name, to see its direction in every frame."


def frame_words(name: str) -> str:
    """Return a frame's name as words, years before 0 with a true minus."""
    return re.sub(r" -(?=\d)", " −", name.replace("/", " "))


class DirectionPanel(QWidget):
    """A table of frames, longitudes and latitudes of the selected direction."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self.rows: tuple[everyframe.Row, ...] = ()
        self.title = QLabel(self)
        self.title.setObjectName("heading")
        self.title.setWordWrap(True)
        self.detail = QLabel(self)
        self.detail.setObjectName("muted")
        self.detail.setWordWrap(True)
        self.table = QTableWidget(0, 3, self)
        self.table.setHorizontalHeaderLabels(["frame", "longitude", "latitude"])
        self.table.setAccessibleName("This direction in every frame")
        self.table.verticalHeader().hide()
        self.table.verticalHeader().setDefaultSectionSize(22)
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setTabKeyNavigation(False)
        self.table.setShowGrid(False)
        self.table.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.table.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        header = self.table.horizontalHeader()
        header.setHighlightSections(False)
        header.setSectionResizeMode(0, QHeaderView.ResizeMode.Stretch)
        header.setSectionResizeMode(1, QHeaderView.ResizeMode.ResizeToContents)
        header.setSectionResizeMode(2, QHeaderView.ResizeMode.ResizeToContents)
        header.setMinimumSectionSize(40)
        self.degrees = QCheckBox("decimal degrees", self)
        self.degrees.clicked.connect(self.refresh)
        self.copy_button = QPushButton("Copy", self)
        self.copy_button.setAccessibleName("Copy the direction in every frame")
        self.copy_button.setToolTip("Copy the direction in every frame")
        self.copy_button.clicked.connect(self.copy)
        self.against = QComboBox(self)
        self.against.addItem("positions", None)
        for name in everyframe.FRAMES:
            self.against.addItem(f"apart from {frame_words(name)}", name)
        self.against.setAccessibleName("Show positions, or how far every frame's numbers are from one frame's")
        self.against.setToolTip("Positions, or how far every frame's numbers are from those of one frame")
        self.against.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        self.against.setMinimumContentsLength(16)
        self.against.activated.connect(self.refresh)
        self.apart: tuple[apart.Line, ...] = ()
        foot = QHBoxLayout()
        foot.addWidget(self.degrees)
        foot.addStretch(1)
        foot.addWidget(self.copy_button)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        column.addWidget(self.title)
        column.addWidget(self.detail)
        column.addWidget(self.against)
        column.addWidget(self.table)
        column.addLayout(foot)
        desk.selected.connect(self.refresh)
        self.refresh()

    def refresh(self) -> None:
        """Fill the table for the selection and the moment."""
        selection, session = self._desk.selection, self._desk.session
        for part in (self.table, self.degrees, self.copy_button, self.against):
            part.setVisible(selection is not None)
        if selection is None:
            self.rows = ()
            self.title.setText("This direction in every frame")
            self.detail.setText(EMPTY)
            return
        # The circles on the chart are frames that the user works in.
        also = tuple(circle.frame for circle in session.circles)
        self.rows = everyframe.table(
            np.array(selection.direction),
            session.moment,
            site=session.site,
            sigma_arcsec=selection.sigma_arcsec,
            degrees=self.degrees.isChecked(),
            also=also,
        )
        self.title.setText(selection.name)
        self.detail.setText("\n".join(part for part in (selection.detail, f"{session.place} place") if part))
        self.apart = self._apart(also)
        self.degrees.setVisible(not self.apart)
        names = ["frame", "Δ lon cos lat", "Δ lat"] if self.apart else ["frame", "longitude", "latitude"]
        self.table.setHorizontalHeaderLabels(names)
        lines = [(line.frame, line.lon, line.lat, line.tip) for line in self.apart] or [
            (
                row.frame,
                row.lon_text,
                row.lat_text,
                row.fault or f"{row.label}\n{row.lon_name} {row.lon_text}  {row.lat_name} {row.lat_text}",
            )
            for row in self.rows
        ]
        self.table.setRowCount(len(lines))
        for number, (name, lon, lat, tip) in enumerate(lines):
            for column, text in enumerate((frame_words(name), lon, lat)):
                item = QTableWidgetItem(text)
                item.setToolTip(tip)
                if column:
                    item.setTextAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
                self.table.setItem(number, column, item)
        self.table.setFixedHeight(len(lines) * 22 + self.table.horizontalHeader().sizeHint().height() + 4)

    def _apart(self, also: tuple[str, ...]) -> tuple[apart.Line, ...]:
        """Return the differences from the chosen frame, or nothing where positions are shown or it has no answer."""
        chosen, selection = self.against.currentData(), self._desk.selection
        if chosen is None or selection is None:
            return ()
        try:
            return apart.lines(selection, self._desk.session, chosen, also)
        except ColureError as fault:
            self.detail.setText(str(fault))
            return ()

    def copy(self) -> None:
        """Put the table on the clipboard as text."""
        selection, session = self._desk.selection, self._desk.session
        if selection is None:
            return
        heading = f"{selection.name}\t{session.moment.text()}\t{session.place} place\t{session.site}"
        text = everyframe.as_text(self.rows, heading)
        if self.apart:
            chosen = f"what each frame's numbers are off by, read as {self.against.currentData()}"
            listed = (f"{line.frame}\t{line.lon}\t{line.lat}" for line in self.apart)
            text = "\n".join([heading, chosen, "frame\tΔlon cos lat\tΔlat", *listed])
        QGuiApplication.clipboard().setText(text)
        self._desk.noted.emit("Copied the direction in every frame")


class MeasurePanel(QWidget):
    """Separation and position angle of the last measurement."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self.text = QLabel(self)
        self.text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.text.setWordWrap(True)
        self.text.setAccessibleName("Measured separation and position angle")
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(self.text)
        self.show_text("")

    def show_text(self, text: str) -> None:
        """Show a measurement, or how to make one."""
        self.text.setObjectName("" if text else "muted")
        self.text.setText(text or "Shift-click two points, or drag with Shift held, to measure between them.")
        self.text.style().polish(self.text)

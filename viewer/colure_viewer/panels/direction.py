"""The selected direction in every frame, with copy; and what was measured."""

import re

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
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
from colure_viewer.desk import Desk

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
        foot = QHBoxLayout()
        foot.addWidget(self.degrees)
        foot.addStretch(1)
        foot.addWidget(self.copy_button)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        column.addWidget(self.title)
        column.addWidget(self.detail)
        column.addWidget(self.table)
        column.addLayout(foot)
        desk.selected.connect(self.refresh)
        self.refresh()

    def refresh(self) -> None:
        """Fill the table for the selection and the moment."""
        selection, session = self._desk.selection, self._desk.session
        for part in (self.table, self.degrees, self.copy_button):
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
        self.table.setRowCount(len(self.rows))
        for number, row in enumerate(self.rows):
            cells = (frame_words(row.frame), row.lon_text, row.lat_text)
            for column, text in enumerate(cells):
                item = QTableWidgetItem(text)
                position = f"{row.lon_name} {row.lon_text}  {row.lat_name} {row.lat_text}"
                item.setToolTip(row.fault or f"{row.label}\n{position}")
                if column:
                    item.setTextAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
                self.table.setItem(number, column, item)
        self.table.setFixedHeight(len(self.rows) * 22 + self.table.horizontalHeader().sizeHint().height() + 4)

    def copy(self) -> None:
        """Put the table on the clipboard as text."""
        selection, session = self._desk.selection, self._desk.session
        if selection is None:
            return
        heading = f"{selection.name}\t{session.moment.text()}\t{session.place} place\t{session.site}"
        QGuiApplication.clipboard().setText(everyframe.as_text(self.rows, heading))
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

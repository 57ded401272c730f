"""The table of reference circles and, under it, the parts of the chosen one."""

from dataclasses import replace

from PySide6.QtCore import QItemSelectionModel, Qt
from PySide6.QtGui import QColor, QIcon, QPixmap
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
    QColorDialog,
    QComboBox,
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

from colure import angles, precession
from colure.framenames import KINDS, PLANES
from colure.frames import Frame
from colure.session import Circle, Session
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry
from colure_viewer.themes import PALETTE

NONE = "—"
MODELS = ("auto", *precession.SPANS)


def frame_text(plane: str, kind: str, equinox: str, model: str) -> str:
    """Return the frame's name for the parts that the panel shows; a part that the plane has not is left out."""
    parts = [plane]
    if kind not in ("", NONE):
        parts.append(kind)
    if equinox.strip() not in ("", NONE):
        parts.append(equinox.strip().replace("−", "-"))
    text = "/".join(parts)
    return text if model in ("", MODELS[0], NONE) else f"{text}@{model}"


class CirclesPanel(QWidget):
    """Circles: add, remove, recolour, show, graduate, and set plane, kind, equinox, model and latitude."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self._filling = False
        self.table = QTableWidget(0, 4, self)
        self.table.setHorizontalHeaderLabels(["plane", "kind", "equinox", "°"])
        graduated = QTableWidgetItem("°")
        graduated.setToolTip("Graduated: ticks and figures along the circle")
        self.table.setHorizontalHeaderItem(3, graduated)
        self.table.setAccessibleName("Circles")
        self.table.verticalHeader().hide()
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setTabKeyNavigation(False)
        self.table.setShowGrid(False)
        self.table.verticalHeader().setDefaultSectionSize(24)
        self.table.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        header = self.table.horizontalHeader()
        header.setHighlightSections(False)
        header.setSectionResizeMode(0, QHeaderView.ResizeMode.Stretch)
        header.setSectionResizeMode(1, QHeaderView.ResizeMode.Fixed)
        header.setSectionResizeMode(2, QHeaderView.ResizeMode.Fixed)
        header.setSectionResizeMode(3, QHeaderView.ResizeMode.Fixed)
        header.setMinimumSectionSize(20)
        for number, width in ((1, 50), (2, 56), (3, 26)):
            self.table.setColumnWidth(number, width)
        self.table.itemChanged.connect(self._ticked)
        self.table.itemSelectionChanged.connect(self._chosen)
        self.add_button = self._button("Add", "Add a circle", self.add)
        self.remove_button = self._button("Remove", "Remove the chosen circle", self.remove)
        self.colour_button = self._button("Colour", "Change the colour of the chosen circle", self.recolour)
        self.plane = self._combo("Plane", PLANES)
        self.kind = self._combo("Kind", ())
        self.model = self._combo("Precession model", MODELS)
        self.equinox = Entry("Equinox: date, J2000, B1950, or a year", self._typed_equinox, self)
        self.lat = Entry("Latitude of the circle in its frame", self._typed_lat, self)
        self.label = Entry("Label along the curve; empty for the frame's own", self._typed_label, self)
        self.graduated = QCheckBox("graduated", self)
        self.graduated.clicked.connect(lambda on: self._change("graduate a circle", graduated=on))
        buttons = QHBoxLayout()
        buttons.setSpacing(4)
        for button in (self.add_button, self.remove_button, self.colour_button):
            buttons.addWidget(button)
        form = QGridLayout()
        form.setHorizontalSpacing(6)
        form.setVerticalSpacing(4)
        for row, (text, part) in enumerate(
            (
                ("plane", self.plane),
                ("kind", self.kind),
                ("equinox", self.equinox),
                ("model", self.model),
                ("latitude", self.lat),
                ("label", self.label),
            )
        ):
            name = QLabel(text, self)
            name.setBuddy(part)
            form.addWidget(name, row, 0)
            form.addWidget(part, row, 1)
        form.addWidget(self.graduated, 6, 1)
        form.setColumnStretch(1, 1)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(5)
        column.addWidget(self.table)
        column.addLayout(buttons)
        column.addLayout(form)
        desk.changed.connect(self._show)
        desk.themed.connect(self._show)
        self._seen: tuple[object, ...] | None = None
        self._show()
        if self.table.rowCount():
            self.table.selectRow(0)

    def _button(self, text: str, name: str, act: object) -> QPushButton:
        button = QPushButton(text, self)
        button.setAccessibleName(name)
        button.setToolTip(name)
        button.clicked.connect(act)
        return button

    def _combo(self, name: str, items: tuple[str, ...]) -> QComboBox:
        combo = QComboBox(self)
        combo.addItems(list(items))
        combo.setAccessibleName(name)
        combo.setToolTip(name)
        combo.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        combo.setMinimumContentsLength(6)
        combo.activated.connect(self._parts)
        return combo

    @property
    def row(self) -> int:
        """The chosen row, or −1."""
        rows = self.table.selectionModel().selectedRows()
        return rows[0].row() if rows else -1

    @property
    def circle(self) -> Circle | None:
        """The chosen circle, or None."""
        circles = self._desk.session.circles
        return circles[self.row] if 0 <= self.row < len(circles) else None

    def _show(self) -> None:
        circles, theme = self._desk.session.circles, self._desk.theme
        # Running time changes the session at every frame and the circles at none.
        if self._seen == (circles, theme.name):
            return
        self._seen = (circles, theme.name)
        chosen = min(max(self.row, 0), len(circles) - 1)
        self._filling = True
        self.table.setRowCount(len(circles))
        for row, circle in enumerate(circles):
            frame = Frame.parse(circle.frame)
            swatch = QPixmap(14, 4)
            swatch.fill(QColor(theme.line("circle", circle.colour)))
            name = frame.plane if circle.lat_deg == 0.0 else f"{frame.plane} {angles.format_number(circle.lat_deg, 1)}°"
            for column, text in enumerate((name, frame.kind or NONE, (frame.equinox or NONE).replace("-", "−"), "")):
                item = QTableWidgetItem(text)
                item.setToolTip(circle.name)
                item.setFlags(Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable)
                if column == 0:
                    item.setIcon(QIcon(swatch))
                if column in (0, 3):
                    item.setFlags(item.flags() | Qt.ItemFlag.ItemIsUserCheckable)
                    on = circle.visible if column == 0 else circle.graduated
                    item.setCheckState(Qt.CheckState.Checked if on else Qt.CheckState.Unchecked)
                self.table.setItem(row, column, item)
        self._filling = False
        shown = min(max(len(circles), 3), 8)
        self.table.setFixedHeight(shown * 24 + self.table.horizontalHeader().sizeHint().height() + 4)
        if chosen >= 0:
            self.table.selectRow(chosen)
        self._chosen()

    def _chosen(self) -> None:
        circle = self.circle
        for part in (self.plane, self.kind, self.equinox, self.model, self.lat, self.label, self.graduated,
                     self.remove_button, self.colour_button):  # fmt: skip
            part.setEnabled(circle is not None)
        if circle is None:
            return
        frame = Frame.parse(circle.frame)
        self.plane.setCurrentText(frame.plane)
        kinds = KINDS.get(frame.plane, ())
        self.kind.clear()
        self.kind.addItems(list(kinds) or [NONE])
        self.kind.setCurrentText(frame.kind or NONE)
        self.kind.setEnabled(bool(kinds))
        self.equinox.setEnabled(frame.equinox is not None)
        self.equinox.show_value((frame.equinox or NONE).replace("-", "−"))
        self.model.setEnabled(frame.plane in ("equator", "ecliptic"))
        if frame.model and self.model.findText(frame.model) < 0:
            self.model.addItem(frame.model)
        self.model.setCurrentText(frame.model or MODELS[0])
        self.lat.show_value(angles.format_degrees(circle.lat_deg, 3).replace(".000", ""))
        self.label.show_value(circle.label or "")
        self.label.setPlaceholderText(circle.name)
        self.graduated.setChecked(circle.graduated)

    def _change(self, what: str, at: int | None = None, **changes: object) -> str | None:
        row = self.row if at is None else at

        def make(s: Session) -> Session:
            circles = list(s.circles)
            circles[row] = replace(circles[row], **changes)  # type: ignore[arg-type]
            return replace(s, circles=tuple(circles))

        return self._desk.edit(make, what)

    def _ticked(self, item: QTableWidgetItem) -> None:
        if self._filling:
            return
        on = item.checkState() == Qt.CheckState.Checked
        if item.column() == 0:
            self._change("show or hide a circle", item.row(), visible=on)
        elif item.column() == 3:
            self._change("graduate a circle", item.row(), graduated=on)

    def _parts(self) -> None:
        """Take the combos; where the old kind does not fit the new plane, its first kind and its own equinox do."""
        circle = self.circle
        if circle is None:
            return
        old, plane = Frame.parse(circle.frame), self.plane.currentText()
        model = self.model.currentText()
        kinds = KINDS.get(plane, ())
        kind = self.kind.currentText() if plane == old.plane else (kinds[0] if kinds else NONE)
        if (plane, kind) == (old.plane, old.kind or NONE):
            text = frame_text(plane, kind, old.equinox or NONE, model)
        else:
            # An equinox goes over from kind to kind where both take any; the others have their own by default.
            free = kind in ("mean", "true")
            kept = old.equinox if old.kind in ("mean", "true") and old.equinox else "date"
            text = frame_text(plane, kind, kept if free else NONE, MODELS[0])
        reason = self._change("change a circle", frame=text)
        if reason is not None:
            self._desk.faulted.emit(reason)
            self._chosen()

    def _typed_equinox(self, text: str) -> str | None:
        circle = self.circle
        if circle is None:
            return None
        old = Frame.parse(circle.frame)
        name = frame_text(old.plane, old.kind or NONE, text, old.model or MODELS[0])
        return self._change("set the equinox of a circle", frame=name)

    def _typed_lat(self, text: str) -> str | None:
        def make(s: Session) -> Session:
            circles = list(s.circles)
            circles[self.row] = replace(circles[self.row], lat_deg=angles.parse_angle(text, "latitude"))
            return replace(s, circles=tuple(circles))

        return self._desk.edit(make, "set the latitude of a circle")

    def _typed_label(self, text: str) -> str | None:
        return self._change("name a circle", label=text.strip() or None)

    def add(self) -> None:
        """Add an ecliptic of date in the first colour of the palette that no circle has."""
        used = {circle.colour for circle in self._desk.session.circles}
        colour = next((c for c in PALETTE.values() if c not in used), next(iter(PALETTE.values())))
        new = Circle("ecliptic/mean/date", colour=colour)
        reason = self._desk.edit(lambda s: replace(s, circles=(*s.circles, new)), "add a circle")
        if reason is not None:
            self._desk.faulted.emit(reason)
            return
        self.table.selectRow(self.table.rowCount() - 1)
        self.plane.setFocus()

    def remove(self) -> None:
        """Remove the chosen circle."""
        row = self.row
        if row < 0:
            return
        self._desk.edit(lambda s: replace(s, circles=s.circles[:row] + s.circles[row + 1 :]), "remove a circle")

    def recolour(self) -> None:
        """Ask for a colour, offering the palette first."""
        circle = self.circle
        if circle is None:
            return
        for place, colour in enumerate(PALETTE.values()):
            QColorDialog.setCustomColor(place, QColor(colour))
        chosen = QColorDialog.getColor(QColor(circle.colour or "#000000"), self, "Colour of the circle")
        if chosen.isValid():
            self._change("recolour a circle", colour=chosen.name().upper())

    def select(self, row: int) -> None:
        """Choose a row."""
        flags = QItemSelectionModel.SelectionFlag.ClearAndSelect | QItemSelectionModel.SelectionFlag.Rows
        self.table.selectionModel().select(self.table.model().index(row, 0), flags)

"""The table of a ledger's steps: two lines a step, with a box that leaves it out, redrawn at the pointer's pace."""

import math
from dataclasses import dataclass
from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QPersistentModelIndex, QRect, Qt, Signal
from PySide6.QtGui import QKeyEvent, QPainter, QPalette
from PySide6.QtWidgets import (
    QAbstractItemView,
    QHeaderView,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QTableView,
    QWidget,
)

from colure.angles import UNKNOWN, format_degrees
from colure.ledger import Entry, Ledger
from colure.ledger.doubt import IN_EPHEMERIS
from colure.ledger.printing import direction_texts, sigma_text, size_text
from colure.stepnames import STEPS
from colure_viewer.panels.direction import frame_words

Index = QModelIndex | QPersistentModelIndex
ROW, BOX, PAD = 36, 21, 4
"""Height of a row, and where its text begins with and without a box."""
COLUMNS = ("step\nnumber, ± 1σ", "shift\nangle", "running\nvalue")
SHORT = {"precession of the equator": "precession, equator", "precession of the ecliptic": "precession, ecliptic"}
ROLE = Qt.ItemDataRole


@dataclass(frozen=True, slots=True)
class Line:
    """A step as texts: what stands in the three columns, two lines each, and the words of its tip."""

    step: str
    cells: tuple[str, str, str]
    tip: str
    omitted: bool
    optional: bool


def lines(found: Ledger) -> tuple[Line, ...]:
    """Return the steps of a ledger as texts, each figure with the digits that its uncertainty supports."""
    out = []
    sum2 = 0.0
    for number, entry in enumerate(found.entries, 1):
        if math.isfinite(entry.uncertainty_arcsec):
            sum2 += entry.uncertainty_arcsec**2
        running = math.sqrt(sum2)
        lon, lat = direction_texts(entry, running)
        angle = f"{round(entry.pa_deg, 1) % 360.0:.1f}°" if math.isfinite(entry.pa_deg) else ""
        # The parallax of a body is as good as its ephemeris, whose doubt stands in the first line.
        digits = running if (entry.uncertainty_arcsec, entry.source) == IN_EPHEMERIS else entry.uncertainty_arcsec
        # A turn of degrees changes the axes altogether: whole arcseconds are enough here, the tip has them all.
        least = 1.0 if entry.size_arcsec >= 3600.0 else 0.0
        size = "left out" if entry.omitted else size_text(entry.size_arcsec, max(digits, least))
        sigma = f"± {sigma_text(entry)}" if not entry.omitted else ""
        name = SHORT.get(entry.step, entry.step)
        cells = (f"{name}\n{number}  {sigma}".rstrip(), f"{size}\n{angle}", f"{lon}\n{lat}")
        optional = entry.step in STEPS
        out.append(Line(entry.step, cells, _tip(entry), entry.omitted, optional))
    return tuple(out)


def _tip(entry: Entry) -> str:
    angle = format_degrees(entry.pa_deg, 3) if math.isfinite(entry.pa_deg) else UNKNOWN
    size = size_text(entry.size_arcsec, entry.uncertainty_arcsec)
    parts = [entry.step, f"axes after it: {frame_words(entry.frame)}", f"model: {entry.model}"]
    parts.append(f"shift {size}, position angle {angle}, from the north of the axes before it")
    parts.append(f"1σ: {sigma_text(entry)} ({entry.source})")
    if entry.step in STEPS:
        parts.append("untick it to leave it out of the whole chart")
    return "\n".join(parts)


class StepsModel(QAbstractTableModel):
    """The steps of one ledger. `ticked` says that a step is wanted, or to be left out."""

    ticked = Signal(str, bool)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.lines: tuple[Line, ...] = ()

    def show(self, found: Ledger | None) -> None:
        """Show a ledger; where the steps are the same only the figures are drawn anew."""
        new = () if found is None else lines(found)
        same = tuple(line.step for line in new) == tuple(line.step for line in self.lines)
        if same and new:
            self.lines = new
            self.dataChanged.emit(self.index(0, 0), self.index(len(new) - 1, len(COLUMNS) - 1))
            return
        self.beginResetModel()
        self.lines = new
        self.endResetModel()

    def rowCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        """One row for each step."""
        return 0 if parent.isValid() else len(self.lines)

    def columnCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        """Step, shift, running value."""
        return 0 if parent.isValid() else len(COLUMNS)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = ROLE.DisplayRole) -> Any:
        """The names of the columns."""
        if orientation != Qt.Orientation.Horizontal:
            return None
        if role == ROLE.DisplayRole:
            return COLUMNS[section]
        if role == ROLE.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if section else Qt.AlignmentFlag.AlignLeft
            return side | Qt.AlignmentFlag.AlignVCenter
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        """A step that can be left out has a box."""
        flags = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable
        if index.column() == 0 and self.lines[index.row()].optional:
            flags |= Qt.ItemFlag.ItemIsUserCheckable
        return flags

    def data(self, index: Index, role: int = ROLE.DisplayRole) -> Any:
        """Texts, boxes and tips."""
        line = self.lines[index.row()]
        if role == ROLE.DisplayRole:
            return line.cells[index.column()]
        if role == ROLE.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if index.column() else Qt.AlignmentFlag.AlignLeft
            return side | Qt.AlignmentFlag.AlignVCenter
        if role == ROLE.CheckStateRole and index.column() == 0 and line.optional:
            return Qt.CheckState.Unchecked if line.omitted else Qt.CheckState.Checked
        if role == ROLE.ToolTipRole:
            return line.tip
        if role == ROLE.AccessibleTextRole:
            return f"{COLUMNS[index.column()]}: {line.cells[index.column()]}".replace("\n", ", ")
        return None

    def setData(self, index: Index, value: Any, role: int = ROLE.EditRole) -> bool:
        """A box was clicked."""
        line = self.lines[index.row()]
        if role != ROLE.CheckStateRole or not line.optional:
            return False
        self.ticked.emit(line.step, Qt.CheckState(value) == Qt.CheckState.Checked)
        return True


class TwoLines(QStyledItemDelegate):
    """Draws a cell of two lines, each cut by itself where it is too long."""

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        """Draw ground and box as usual, then the lines."""
        self.initStyleOption(option, index)
        text, option.text = option.text, ""
        widget = option.widget
        widget.style().drawControl(QStyle.ControlElement.CE_ItemViewItem, option, painter, widget)
        boxed = index.data(ROLE.CheckStateRole) is not None
        whole: QRect = option.rect.adjusted(BOX if boxed else PAD, 1, -PAD, -1)
        palette: QPalette = option.palette
        metrics = option.fontMetrics
        upper, _, lower = text.replace("\u2028", "\n").partition("\n")
        side = option.displayAlignment & Qt.AlignmentFlag.AlignHorizontal_Mask
        half = whole.height() // 2
        painter.save()
        painter.setPen(palette.color(QPalette.ColorGroup.Active, QPalette.ColorRole.Text))
        for line, top in ((upper, 0), (lower, half)):
            place = QRect(whole.left(), whole.top() + top, whole.width(), half)
            shown = metrics.elidedText(line, Qt.TextElideMode.ElideRight, place.width())
            painter.drawText(place, side | Qt.AlignmentFlag.AlignVCenter, shown)
        painter.restore()


class StepsView(QTableView):
    """The view of the steps: as high as they are many, Space leaves the current one out, `chosen` follows the row."""

    chosen = Signal()

    def __init__(self, model: StepsModel, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._steps = model
        self._step: str | None = None
        self.setModel(model)
        self.setItemDelegate(TwoLines(self))
        self.setAccessibleName("Steps of the reduction")
        self.verticalHeader().hide()
        self.verticalHeader().setDefaultSectionSize(ROW)
        self.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.setTabKeyNavigation(False)
        self.setShowGrid(False)
        self.setAlternatingRowColors(True)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        header = self.horizontalHeader()
        header.setHighlightSections(False)
        header.setMinimumSectionSize(40)
        header.setSectionResizeMode(0, QHeaderView.ResizeMode.Stretch)
        for column in (1, 2):
            header.setSectionResizeMode(column, QHeaderView.ResizeMode.Fixed)
        self.selectionModel().currentRowChanged.connect(self._moved)
        model.modelReset.connect(self._again)

    @property
    def step(self) -> str | None:
        """The chosen step, or None."""
        return self._step

    def fit(self) -> None:
        """Be as high as the steps, and keep the columns of figures wide enough in the font in use."""
        for column, sample in ((1, "22′36.1206″"), (2, "+00°00′00.00″")):
            texts = [text for line in self._steps.lines for text in line.cells[column].split("\n")]
            widest = max(self.fontMetrics().horizontalAdvance(text) for text in (sample, *texts))
            if self.columnWidth(column) != widest + 2 * PAD + 2:
                self.setColumnWidth(column, widest + 2 * PAD + 2)
        self.setFixedHeight(len(self._steps.lines) * ROW + self.horizontalHeader().sizeHint().height() + 4)

    def _moved(self, current: QModelIndex, _previous: QModelIndex) -> None:
        self._step = self._steps.lines[current.row()].step if current.isValid() else None
        self.chosen.emit()

    def _again(self) -> None:
        """Keep the step chosen where another ledger has it too."""
        names = [line.step for line in self._steps.lines]
        wanted, self._step = self._step, None
        if wanted in names:
            self.selectRow(names.index(wanted))
            self._step = wanted

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Space leaves the current step out, or takes it in; Escape chooses none."""
        index = self.currentIndex()
        if event.key() == Qt.Key.Key_Space and index.isValid():
            line = self._steps.lines[index.row()]
            if line.optional:
                self._steps.ticked.emit(line.step, line.omitted)
            return
        if event.key() == Qt.Key.Key_Escape:
            self.clearSelection()
            self.setCurrentIndex(QModelIndex())
            return
        super().keyPressEvent(event)

"""Search by name: a field that completes, and selects and shows what was found."""

from collections.abc import Callable
from threading import Thread

from PySide6.QtCore import QEvent, QObject, QStringListModel, Qt
from PySide6.QtWidgets import QCompleter, QHBoxLayout, QLabel, QWidget

from colure import lookup
from colure.errors import ColureError
from colure.session import Session
from colure.targets import Target
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry

MOST = 12


class SearchBar(QWidget):
    """The field; `found` gets what a name stands for."""

    def __init__(self, desk: Desk, found: Callable[[Target], None], parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self._found = found
        self.field = Entry("Find a star, body, object or constellation by name", self._typed, self)
        self.field.setPlaceholderText("name or number")
        self.field.setMinimumWidth(110)
        self._names = QStringListModel(self)
        completer = QCompleter(self._names, self)
        completer.setCaseSensitivity(Qt.CaseSensitivity.CaseInsensitive)
        completer.setCompletionMode(QCompleter.CompletionMode.UnfilteredPopupCompletion)
        completer.setMaxVisibleItems(MOST)
        self.field.setCompleter(completer)
        completer.activated.connect(self._picked)
        self.field.textEdited.connect(self._complete)
        self._reading: Thread | None = None
        self.field.installEventFilter(self)
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(4)
        label = QLabel("F&ind", self)
        label.setBuddy(self.field)
        label.setObjectName("bar")
        row.addWidget(label)
        row.addWidget(self.field, 1)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Read the tables of names beside the window as soon as the field is entered, before the first letter."""
        if event.type() == QEvent.Type.FocusIn and self._reading is None:
            self._reading = Thread(target=lookup.prepare, daemon=True)
            self._reading.start()
        return False

    def _complete(self, text: str) -> None:
        if self._reading is not None and self._reading.is_alive():
            return
        self._names.setStringList([target.name for target in lookup.search(text, most=MOST)] if text.strip() else [])

    def _picked(self, text: str) -> None:
        self.field.setText(text)
        self.field.setModified(True)
        self.field.commit()

    def _typed(self, text: str) -> str | None:
        if not text.strip():
            return None
        try:
            session = self._desk.session
            found = lookup.find(text, frame=_frame(session), year=float(session.moment.julian_year))
        except ColureError as fault:
            return str(fault)
        self.field.show_value(text.strip())
        self._found(found)
        return None


def _frame(session: Session) -> str:
    """Return the frame in which a bare position is meant: that of the chart's centre."""
    return session.view.centre.frame

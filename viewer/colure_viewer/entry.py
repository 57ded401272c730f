"""A line of typed text that marks a bad entry in place, with the reason, while the old value stays in force."""

from collections.abc import Callable

from PySide6.QtCore import QEvent, QObject, QPoint, Qt
from PySide6.QtGui import QFocusEvent, QHideEvent, QKeyEvent
from PySide6.QtWidgets import QLabel, QLineEdit, QWidget

NOTE_WIDTH, PADDING = 380, 8


class FaultNote(QLabel):
    """The reason why an entry was refused, shown right under it."""

    def __init__(self, field: QWidget) -> None:
        super().__init__(field.window())
        self._field = field
        self.setObjectName("fault")
        self.setWordWrap(True)
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)

    def show_text(self, text: str) -> None:
        """Show a reason under the field, inside the window."""
        self.setText(text)
        window = self._field.window()
        width = min(NOTE_WIDTH, window.width() - 16)
        self.setFixedWidth(width)
        # The style sheet's padding and rule are not in what the label reckons for its text.
        self.setFixedHeight(self.heightForWidth(width - 2 * PADDING) + 2 * PADDING)
        at = self._field.mapTo(window, QPoint(0, self._field.height() + 3))
        x = max(8, min(at.x(), window.width() - width - 8))
        y = at.y()
        if y + self.height() > window.height() - 8:
            y = max(8, at.y() - self._field.height() - self.height() - 6)
        self.move(x, max(8, min(y, window.height() - self.height() - 8)))
        self.show()
        self.raise_()


class Entry(QLineEdit):
    """A text field over one value of the session.

    `apply` gets the typed text and returns the reason of a refusal, or None. The field shows what `show_value` gave it
    last; Escape brings that back.
    """

    def __init__(self, name: str, apply: Callable[[str], str | None], parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setAccessibleName(name)
        self.setToolTip(name)
        self._name = name
        self._apply = apply
        self._value = ""
        self._note: FaultNote | None = None
        self.fault: str | None = None
        self.returnPressed.connect(self.commit)
        self.textEdited.connect(self._edited)

    @property
    def value(self) -> str:
        """The value in force, as text."""
        return self._value

    def show_value(self, text: str) -> None:
        """Show the value in force, unless the user is in the middle of typing or has a refused entry to mend."""
        self._value = text
        if self.fault is None:
            # A narrow field may not show all of its value.
            self.setToolTip(f"{self._name}\n{text}" if text else self._name)
        if not self.isModified() and self.fault is None and self.text() != text:
            self.setText(text)
            self.setCursorPosition(0)

    def commit(self) -> None:
        """Hand over what was typed."""
        if not self.isModified() and self.fault is None:
            return
        reason = self._apply(self.text())
        if reason is None:
            self.setModified(False)
            self._clear()
            self.show_value(self._value)
        else:
            self._mark(reason)

    def revert(self) -> None:
        """Bring back the value in force."""
        self._clear()
        self.setModified(False)
        self.setText(self._value)
        self.setCursorPosition(0)

    def _edited(self) -> None:
        if self.fault is not None:
            self._clear()
            # Still unsaid: leaving the field tries again.
            self.setModified(True)

    def _mark(self, reason: str) -> None:
        self.fault = reason
        kept = f"\nKept: {self._value}" if self._value else ""
        if self._note is None:
            self._note = FaultNote(self)
            self.window().installEventFilter(self)
        self._note.show_text(reason + kept)
        self.setToolTip(reason)
        self.setAccessibleDescription(f"Refused: {reason}.{kept}")
        self._restyle(True)

    def _clear(self) -> None:
        if self.fault is None:
            return
        self.fault = None
        if self._note is not None:
            self._note.hide()
        self.setToolTip(f"{self._name}\n{self._value}" if self._value else self._name)
        self.setAccessibleDescription("")
        self._restyle(False)

    def _restyle(self, fault: bool) -> None:
        self.setProperty("fault", fault)
        self.style().unpolish(self)
        self.style().polish(self)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Escape brings back the value in force; all else edits."""
        if event.key() == Qt.Key.Key_Escape and (self.isModified() or self.fault is not None):
            self.revert()
            event.accept()
            return
        super().keyPressEvent(event)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """Leaving the field hands over what was typed."""
        super().focusOutEvent(event)
        if event.reason() != Qt.FocusReason.PopupFocusReason and self.isModified() and self.fault is None:
            self.commit()

    def hideEvent(self, event: QHideEvent) -> None:
        """A note does not outlive the sight of its field."""
        super().hideEvent(event)
        if self._note is not None:
            self._note.hide()

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Keep the note under the field when the window changes its size."""
        if event.type() == QEvent.Type.Resize and self.fault is not None and self._note is not None:
            self._note.show_text(self._note.text())
        return False

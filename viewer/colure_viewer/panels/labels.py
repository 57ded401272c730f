"""Labels of panels: what a label is for decides its look, and may change while the window runs."""

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QWidget


def lines(parent: QWidget, what: str, name: str = "") -> QLabel:
    """Return a label for lines of plain text that can be selected; `what` is its accessible name."""
    label = QLabel(parent)
    label.setObjectName(name)
    label.setWordWrap(True)
    label.setTextFormat(Qt.TextFormat.PlainText)
    label.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
    label.setAccessibleName(what)
    return label


def dress(label: QLabel, name: str) -> None:
    """Give a label the look of a name of the style sheet ("", "muted", "notice", "fault", "heading")."""
    if label.objectName() != name:
        label.setObjectName(name)
        label.style().unpolish(label)
        label.style().polish(label)

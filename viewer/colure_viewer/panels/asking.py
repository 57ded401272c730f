"""The form that asks what a file opened as an overlay does not say of itself; nothing is chosen beforehand."""

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QComboBox, QDialog, QDialogButtonBox, QLabel, QLayout, QVBoxLayout, QWidget

from colure.errors import ColureError
from colure.frames import Frame
from colure.overlays.opening import FRAMES_OF, UNITS, Found, Missing
from colure_viewer.entry import Entry

CHOOSE = "choose…"
SHOWN = 5
"""Remarks on a file that are listed: a form must fit the screen."""
WIDTH, PADDING = 440, 8
NAMES = {
    "lon": "column of longitudes",
    "lat": "column of latitudes",
    "lon_unit": "unit of the longitudes",
    "lat_unit": "unit of the latitudes",
    "frame": "frame of the numbers",
    "epoch": "epoch of the positions",
}


def parse_epoch(text: str) -> float | None:
    """Return a Julian year, or None for an empty text; raise ColureError for anything else."""
    plain = text.strip().replace("−", "-")
    if not plain:
        return None
    try:
        return float(plain.removeprefix("J"))
    except ValueError:
        raise ColureError(f"epoch '{plain[:40]}': expected a Julian year such as 2015.5, or nothing") from None


def parse_frame(text: str) -> str:
    """Return the canonical spelling of a frame."""
    return str(Frame.parse(text.strip().replace("−", "-")))


@dataclass(slots=True)
class _Answers:
    frame: str | None = None
    epoch: float | None = None
    picks: dict[str, QComboBox] = field(default_factory=dict)


class AskDialog(QDialog):
    """Asks for everything in `found.missing`; `take` gets the answers and a function to call with a refusal."""

    def __init__(
        self,
        found: Found,
        take: Callable[["AskDialog", dict[str, Any]], None],
        parent: QWidget | None = None,
    ) -> None:
        super().__init__(parent)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        name = Path(found.path).name
        self.setWindowTitle(f"Open {name}")
        self.found = found
        self._take = take
        self._answers = _Answers()
        self._needed = tuple(one.key for one in found.missing)
        column = QVBoxLayout(self)
        column.setSpacing(4)
        column.setSizeConstraint(QLayout.SizeConstraint.SetMinimumSize)
        self._say(column, f"{name} does not say all that is needed", "heading")
        for missing in found.missing:
            self._ask(column, missing)
        if "lon" in self._needed or "lat" in self._needed:
            # Units and frame can be found out only from the columns: they may be said here already.
            for key in ("lon_unit", "lat_unit", "frame"):
                if key not in self._needed:
                    choices = FRAMES_OF[""] if key == "frame" else UNITS
                    self._ask(column, Missing(key, f"{NAMES[key]}, where the file does not say it", choices))
        if "epoch" not in found.rules or found.epoch is None:
            self._say(column, f"{NAMES['epoch']}, a Julian year; empty where nobody knows it")
            self.epoch = Entry("Epoch of the positions, a Julian year", self._typed_epoch, self)
            column.addWidget(self.epoch)
        said = [f"{NAMES.get(key, key)}: {rule}" for key, rule in found.rules.items() if key not in self._needed]
        said += found.doubts[:SHOWN]
        if len(found.doubts) > SHOWN:
            said.append(f"… and {len(found.doubts) - SHOWN} more remarks")
        if said:
            self._say(column, "What it says", "heading")
            self._say(column, "\n".join(said), "muted")
        self.refusal = QLabel(self)
        self.refusal.setObjectName("fault")
        self.refusal.setWordWrap(True)
        self.refusal.hide()
        column.addWidget(self.refusal)
        column.addStretch(1)
        buttons = QDialogButtonBox.StandardButton
        self.buttons = QDialogButtonBox(buttons.Open | buttons.Cancel, self)
        self.buttons.accepted.connect(self._accept)
        self.buttons.rejected.connect(self.reject)
        column.addWidget(self.buttons)
        self._ready()

    def _say(self, column: QVBoxLayout, text: str, name: str = "") -> QLabel:
        label = QLabel(text, self)
        label.setTextFormat(Qt.TextFormat.PlainText)
        label.setObjectName(name)
        label.setWordWrap(True)
        label.setMinimumWidth(WIDTH)
        column.addWidget(label)
        return label

    def _ask(self, column: QVBoxLayout, missing: Missing) -> None:
        label = self._say(column, missing.question)
        pick = QComboBox(self)
        pick.setAccessibleName(NAMES.get(missing.key, missing.key))
        pick.setAccessibleDescription(missing.question)
        pick.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        pick.setMinimumContentsLength(20)
        if missing.key == "frame":
            entry = Entry("Frame of the numbers", self._typed_frame, self)
            entry.setPlaceholderText("choose or type a frame")
            pick.setLineEdit(entry)
            pick.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
            pick.setCompleter(None)  # type: ignore[arg-type]
            pick.addItems(list(missing.choices))
            pick.setCurrentIndex(-1)
            pick.textActivated.connect(self._picked_frame)
            self.frame = entry
        else:
            pick.addItem(CHOOSE, None)
            for choice in missing.choices:
                pick.addItem(choice, choice)
            pick.activated.connect(self._ready)
        label.setBuddy(pick)
        self._answers.picks[missing.key] = pick
        column.addWidget(pick)

    def pick(self, key: str) -> QComboBox:
        """The field of a question."""
        return self._answers.picks[key]

    @property
    def answers(self) -> dict[str, Any]:
        """What was answered so far, as arguments of `declare`."""
        said: dict[str, Any] = {
            key: pick.currentData() for key, pick in self._answers.picks.items() if key != "frame"
        } | {"frame": self._answers.frame, "epoch": self._answers.epoch}
        return {key: value for key, value in said.items() if value is not None}

    def _picked_frame(self, _text: str) -> None:
        self.frame.setModified(True)
        self.frame.commit()

    def _typed_frame(self, text: str) -> str | None:
        self._answers.frame = None
        try:
            if text.strip():
                self._answers.frame = parse_frame(text)
                self.frame.show_value(self._answers.frame)
        except ColureError as fault:
            return str(fault)
        finally:
            self._ready()
        return None

    def _typed_epoch(self, text: str) -> str | None:
        try:
            self._answers.epoch = parse_epoch(text)
        except ColureError as fault:
            return str(fault)
        self.epoch.show_value(text.strip())
        return None

    def _ready(self) -> None:
        """What is missing must be answered before the file can be opened."""
        if not hasattr(self, "buttons"):
            return
        said = self.answers
        self.buttons.button(QDialogButtonBox.StandardButton.Open).setEnabled(all(key in said for key in self._needed))
        self.refusal.hide()

    def _accept(self) -> None:
        self._take(self, self.answers)

    def refuse(self, reason: str) -> None:
        """Show why the answers do not do; the form stays."""
        self.refusal.setText(reason)
        # The style sheet's padding and rule are not in what the label reckons for its text.
        self.refusal.setFixedHeight(self.refusal.heightForWidth(WIDTH - 2 * PADDING) + 2 * PADDING)
        self.refusal.show()

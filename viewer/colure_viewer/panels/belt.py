"""The belt: its ecliptic, half-width, divisions and the constellations' edges."""

from dataclasses import replace

from PySide6.QtWidgets import QCheckBox, QGridLayout, QLabel, QWidget

from colure import angles
from colure.session import Session
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry


class BeltPanel(QWidget):
    """The controls of the belt."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self.visible = self._check("show the belt", "visible")
        self.half_width = Entry("Half-width of the belt in degrees", self._typed_width, self)
        self.frame = Entry("Ecliptic of the belt, such as ecliptic/mean/date", self._typed_frame, self)
        self.divisions = self._check("divisions of 30° from ♈", "divisions")
        self.crossings = self._check("constellation crossings", "crossings")
        grid = QGridLayout(self)
        grid.setContentsMargins(0, 0, 0, 0)
        grid.setHorizontalSpacing(6)
        grid.setVerticalSpacing(4)
        grid.addWidget(self.visible, 0, 0, 1, 2)
        for row, (text, part) in enumerate((("half-width", self.half_width), ("ecliptic", self.frame)), 1):
            label = QLabel(text, self)
            label.setBuddy(part)
            grid.addWidget(label, row, 0)
            grid.addWidget(part, row, 1)
        grid.addWidget(self.divisions, 3, 0, 1, 2)
        grid.addWidget(self.crossings, 4, 0, 1, 2)
        grid.setColumnStretch(1, 1)
        desk.changed.connect(self._show)
        self._show()

    def _check(self, text: str, key: str) -> QCheckBox:
        box = QCheckBox(text, self)
        box.clicked.connect(lambda on: self._desk.edit(lambda s: _belt(s, **{key: on}), f"change the belt: {text}"))
        return box

    def _show(self) -> None:
        belt = self._desk.session.belt
        self.visible.setChecked(belt.visible)
        self.divisions.setChecked(belt.divisions)
        self.crossings.setChecked(belt.crossings)
        self.half_width.show_value(angles.format_degrees(belt.half_width_deg, 1))
        self.frame.show_value(belt.frame)

    def _typed_width(self, text: str) -> str | None:
        return self._desk.edit(
            lambda s: _belt(s, half_width_deg=angles.parse_extent(text, "half-width")), "set the width of the belt"
        )

    def _typed_frame(self, text: str) -> str | None:
        return self._desk.edit(lambda s: _belt(s, frame=text.strip()), "set the ecliptic of the belt")


def _belt(session: Session, **changes: object) -> Session:
    return replace(session, belt=replace(session.belt, **changes))  # type: ignore[arg-type]

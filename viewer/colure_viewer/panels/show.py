"""What is shown: bodies, and the layers of the chart."""

from dataclasses import replace
from typing import Any

from PySide6.QtWidgets import QCheckBox, QGridLayout, QHBoxLayout, QLabel, QWidget

from colure.session import DEMO_BODIES, Session
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry

SIGNS = {
    "sun": "☉",
    "moon": "☽",
    "mercury": "☿",
    "venus": "♀",
    "mars": "♂",
    "jupiter": "♃",
    "saturn": "♄",
    "uranus": "♅",
    "neptune": "♆",
    "pluto": "♇",
}
LAYERS = (
    ("stars", "stars"),
    ("star_names", "star names"),
    ("deep_sky", "deep sky"),
    ("milky_way", "Milky Way"),
    ("constellation_names", "constellations"),
    ("edges", "their edges"),
    ("bodies", "bodies"),
    ("points", "equinoxes, poles"),
)


class BodiesPanel(QWidget):
    """A box for each body."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        grid = QGridLayout(self)
        grid.setContentsMargins(0, 0, 0, 0)
        grid.setHorizontalSpacing(6)
        grid.setVerticalSpacing(2)
        self.boxes: dict[str, QCheckBox] = {}
        for place, name in enumerate(DEMO_BODIES):
            box = QCheckBox(f"{SIGNS[name]} {name.capitalize()}", self)
            box.setAccessibleName(name.capitalize())
            box.clicked.connect(lambda on, name=name: self._toggle(name, on))
            grid.addWidget(box, place % 5, place // 5)
            self.boxes[name] = box
        desk.changed.connect(self._show)
        self._show()

    def _show(self) -> None:
        bodies = self._desk.session.bodies
        for name, box in self.boxes.items():
            box.setChecked(name in bodies)

    def _toggle(self, name: str, on: bool) -> None:
        def make(s: Session) -> Session:
            # The order of the panel is kept, whatever the order of the clicks; bodies it does not list stay.
            wanted = set(s.bodies) ^ {name} if (name in s.bodies) != on else set(s.bodies)
            listed = [body for body in DEMO_BODIES if body in wanted]
            return replace(s, bodies=(*listed, *(b for b in s.bodies if b in wanted and b not in listed)))

        self._desk.edit(make, f"{'show' if on else 'hide'} {name.capitalize()}")


class LayersPanel(QWidget):
    """A box for each layer, and the frame of the grid."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        grid = QGridLayout(self)
        grid.setContentsMargins(0, 0, 0, 0)
        grid.setHorizontalSpacing(6)
        grid.setVerticalSpacing(2)
        self.boxes: dict[str, QCheckBox] = {}
        for place, (key, text) in enumerate(LAYERS):
            box = QCheckBox(text, self)
            box.clicked.connect(lambda on, key=key, text=text: self._toggle(key, text, on))
            grid.addWidget(box, place // 2, place % 2)
            self.boxes[key] = box
        self.grid = Entry("Frame of the grid; empty for no grid", self._typed_grid, self)
        self.grid.setPlaceholderText("no grid")
        label = QLabel("grid", self)
        label.setBuddy(self.grid)
        line = QHBoxLayout()
        line.setSpacing(6)
        line.addWidget(label)
        line.addWidget(self.grid, 1)
        grid.addLayout(line, (len(LAYERS) + 1) // 2, 0, 1, 2)
        desk.changed.connect(self._show)
        self._show()

    def _show(self) -> None:
        layers = self._desk.session.layers
        for key, box in self.boxes.items():
            box.setChecked(getattr(layers, key))
        self.grid.show_value(layers.grid or "")

    def _toggle(self, key: str, text: str, on: bool) -> None:
        changes: dict[str, Any] = {key: on}

        def make(s: Session) -> Session:
            return replace(s, layers=replace(s.layers, **changes))

        self._desk.edit(make, f"{'show' if on else 'hide'} {text}")

    def _typed_grid(self, text: str) -> str | None:
        name = text.strip() or None
        return self._desk.edit(lambda s: replace(s, layers=replace(s.layers, grid=name)), "set the grid")

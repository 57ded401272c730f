"""The view: projection, centre, up, handedness, width, faintest star and place."""

from dataclasses import replace

from PySide6.QtWidgets import QComboBox, QHBoxLayout, QLabel, QToolButton, QWidget

from colure import angles, everyframe, lookup
from colure.errors import SessionError
from colure.framenames import PLANES
from colure.frames import Frame
from colure.session import BODIES, PLACES, PROJECTIONS, Centre, Session
from colure_viewer.desk import Desk
from colure_viewer.entry import Entry

UPS = (
    ("ecliptic of date", "ecliptic/mean/date"),
    ("ecliptic J2000", "ecliptic/mean/J2000"),
    ("equator of date", "equator/mean/date"),
    ("ICRS", "icrs"),
    ("galactic", "galactic"),
    ("zenith", "zenith"),
)
AUTO = "auto"


def centre_text(centre: Centre) -> str:
    """Return a centre as text that `parse_centre` reads back: a body's name, or a position and its frame."""
    if centre.body is not None:
        return centre.body.capitalize()
    frame = Frame.parse(centre.frame)
    lon, lat = everyframe.texts(centre.lon_deg, centre.lat_deg, frame, 1.0)
    return f"{lon} {lat} {centre.frame}"


def parse_centre(text: str, now: Centre) -> Centre:
    """Return the centre that a text names: a body, or `[FRAME] LON LAT`, by default in the frame of the one before."""
    words = text.split()
    if len(words) == 1 and words[0].casefold() in BODIES:
        return replace(now, body=words[0].casefold())
    name = now.frame
    if len(words) > 2 and ("/" in words[-1] or words[-1] in PLANES):
        # The frame may stand last, as the field itself shows it, or first, as everywhere.
        name = str(Frame.parse(words[-1]))
        text = " ".join(words[:-1])
    frame, lon, lat = lookup.position(text, name)
    return Centre(str(frame), lon, lat)


class ViewBar(QWidget):
    """The controls of the view in one row."""

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self.projection = self._combo("Projection", [(p.replace("-", " "), p) for p in PROJECTIONS], self._project)
        self.centre = Entry("Centre of the chart: a body, or LON LAT FRAME", self._typed_centre, self)
        self.centre.setMinimumWidth(150)
        self.up = self._combo("Which way is up", list(UPS), self._turn_up)
        self.east = QToolButton(self)
        self.east.setToolTip("East to the left, as on the sky, or to the right, as on a map")
        self.east.clicked.connect(self._flip)
        self.width_field = Entry("Width of the map in degrees", self._typed_width, self)
        self.width_field.setFixedWidth(66)
        self.limit = Entry("Faintest star: a magnitude, or auto", self._typed_limit, self)
        self.limit.setFixedWidth(48)
        self.place = self._combo("Place: how far directions are reduced", [(p, p) for p in PLACES], self._set_place)
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(4)
        for text, part, stretch in (
            ("Vie&w", self.projection, 0),
            ("&Centre", self.centre, 1),
            ("&Up", self.up, 0),
            ("", self.east, 0),
            ("Wi&dth", self.width_field, 0),
            ("Ma&g", self.limit, 0),
            ("&Place", self.place, 0),
        ):
            if text:
                label = QLabel(text, self)
                label.setBuddy(part)
                if text == "Vie&w":
                    label.setObjectName("bar")
                row.addWidget(label)
            row.addWidget(part, stretch)
        desk.changed.connect(self._show)
        self._show()

    def _combo(self, name: str, items: list[tuple[str, str]], act: object) -> QComboBox:
        combo = QComboBox(self)
        for text, data in items:
            combo.addItem(text, data)
        combo.setAccessibleName(name)
        combo.setToolTip(name)
        # Long names may be cut in the closed box, never in the list.
        combo.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        combo.setMinimumContentsLength(9)
        combo.view().setTextElideMode(combo.view().textElideMode().ElideNone)
        combo.activated.connect(act)
        return combo

    def _show(self) -> None:
        view = self._desk.session.view
        self.projection.setCurrentIndex(self.projection.findData(view.projection))
        at = self.up.findData(view.up)
        if at < 0:
            self.up.addItem(view.up, view.up)
            at = self.up.count() - 1
        self.up.setCurrentIndex(at)
        self.east.setText("east left" if view.east_left else "east right")
        self.east.setAccessibleName(f"Mirror the chart: now {self.east.text()}")
        self.centre.show_value(centre_text(view.centre))
        self.width_field.show_value(width_text(view.width_deg))
        self.limit.show_value(AUTO if view.limit_mag is None else angles.format_number(view.limit_mag, 1))
        self.place.setCurrentIndex(self.place.findData(self._desk.session.place))

    def _view(self, what: str, **changes: object) -> str | None:
        def make(s: Session) -> Session:
            return replace(s, view=replace(s.view, **changes))  # type: ignore[arg-type]

        return self._desk.edit(make, what)

    def _say(self, reason: str | None) -> None:
        if reason is not None:
            self._desk.faulted.emit(reason)
            self._show()

    def _project(self) -> None:
        self._say(self._view("change the projection", projection=self.projection.currentData()))

    def _turn_up(self) -> None:
        self._say(self._view("turn the chart", up=self.up.currentData()))

    def _flip(self) -> None:
        self._say(self._view("mirror the chart", east_left=not self._desk.session.view.east_left))

    def _set_place(self) -> None:
        place = self.place.currentData()
        self._say(self._desk.edit(lambda s: replace(s, place=place), f"show {place} places"))

    def _typed_centre(self, text: str) -> str | None:
        def make(s: Session) -> Session:
            return replace(s, view=replace(s.view, centre=parse_centre(text, s.view.centre)))

        return self._desk.edit(make, "centre the chart")

    def _typed_width(self, text: str) -> str | None:
        def make(s: Session) -> Session:
            return replace(s, view=replace(s.view, width_deg=angles.parse_extent(text, "width")))

        return self._desk.edit(make, "zoom")

    def _typed_limit(self, text: str) -> str | None:
        def make(s: Session) -> Session:
            return replace(s, view=replace(s.view, limit_mag=parse_limit(text)))

        return self._desk.edit(make, "set the faintest star")


def width_text(degrees: float) -> str:
    """Return a field width with the unit that suits it."""
    if degrees >= 2.0:
        return angles.format_degrees(degrees, 0 if degrees >= 20.0 and degrees == round(degrees) else 1)
    return angles.format_number(degrees * 60.0, 1) + "′"


def parse_limit(text: str) -> float | None:
    """Return a magnitude, or None for `auto` and for nothing."""
    plain = text.strip().replace("−", "-")
    if plain.casefold() in ("", AUTO):
        return None
    try:
        return float(plain)
    except ValueError:
        raise SessionError(f"faintest star '{plain[:20]}': expected a magnitude from −2 to 20, or {AUTO}") from None

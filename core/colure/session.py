"""A session: everything that is on screen, as frozen values; a user's action makes a new one and changes nothing.

Angles in a session are degrees, because a session is what people read and write; everything past it is radians.
"""

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache
from types import MappingProxyType
from typing import Any

from colure import stepnames
from colure.errors import BodyError, ColureError, FrameError, SessionError, near_names
from colure.frames import Frame
from colure.moment import Moment
from colure.overlays.model import Overlay
from colure.sites import DEMO, Site

FORMAT = 1
PLACES = ("geometric", "astrometric", "apparent", "observed")
PROJECTIONS = (
    "stereographic",
    "gnomonic",
    "azimuthal-equidistant",
    "azimuthal-equal-area",
    "orthographic",
    "hammer",
    "plate-carree",
    "mercator",
)
UNROLLED = ("hammer", "plate-carree", "mercator")
"""Projections laid out along the equator of the frame that is up, the others about their centre."""

WIDEST = {
    "stereographic": 320.0,
    "gnomonic": 150.0,
    "azimuthal-equidistant": 360.0,
    "azimuthal-equal-area": 360.0,
    "orthographic": 180.0,
    "hammer": 360.0,
    "plate-carree": 360.0,
    "mercator": 360.0,
}
"""The widest field in degrees that each projection is asked to show across the map."""
NARROWEST = 1.0 / 60.0

BODIES = ("sun", "moon", "mercury", "venus", "earth", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto", "emb")
DEMO_BODIES = ("sun", "moon", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto")

_COLOUR = re.compile(r"#[0-9A-Fa-f]{6}\Z")


def _number(where: str, value: float, low: float, high: float) -> float:
    """Return a finite number between two limits, or raise SessionError naming place, value and limits."""
    if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
        raise SessionError(f"{where}: {value!r} is not a finite number; expected {low:g} to {high:g}")
    if not low <= value <= high:
        raise SessionError(f"{where}: {value:g} is out of range; expected {low:g} to {high:g}")
    return float(value)


def _one_of(where: str, value: str, known: tuple[str, ...]) -> str:
    if value not in known:
        raise SessionError(
            f"{where}: {value!r} is unknown; expected one of {', '.join(known)}{near_names(str(value), known)}"
        )
    return value


@cache
def _canonical(text: str) -> str:
    return str(Frame.parse(text))


@cache
def _frame_label(text: str) -> str:
    return Frame.parse(text).label()


def _frame(where: str, text: str) -> str:
    """Return the canonical spelling of a frame."""
    if not isinstance(text, str):
        raise SessionError(f"{where}: {text!r} is not text; expected a frame such as ecliptic/mean/date")
    try:
        return _canonical(text)
    except FrameError as fault:
        raise SessionError(f"{where}: {fault}") from fault


def _colour(where: str, value: str | None) -> str | None:
    if value is not None and not (isinstance(value, str) and _COLOUR.match(value)):
        raise SessionError(f"{where}: {value!r} is no colour; expected #RRGGBB")
    return value


def _no_extras() -> Mapping[str, Any]:
    return MappingProxyType({})


@dataclass(frozen=True, slots=True)
class Centre:
    """What the chart is centred on: a body, or a longitude and latitude in degrees in a frame."""

    frame: str = "ecliptic/mean/date"
    lon_deg: float = 0.0
    lat_deg: float = 0.0
    body: str | None = None

    def __post_init__(self) -> None:
        """Check ranges and bring the longitude into 0…360."""
        object.__setattr__(self, "frame", _frame("view.centre.frame", self.frame))
        lon = _number("view.centre.lon_deg", self.lon_deg, -1e6, 1e6) % 360.0
        object.__setattr__(self, "lon_deg", 0.0 if lon == 360.0 else lon)
        object.__setattr__(self, "lat_deg", _number("view.centre.lat_deg", self.lat_deg, -90.0, 90.0))
        if self.body is not None and self.body not in BODIES:
            raise BodyError(
                f"view.centre.body: {self.body!r} is unknown; expected one of {', '.join(BODIES)}"
                + near_names(str(self.body), BODIES)
            )


@dataclass(frozen=True, slots=True)
class View:
    """How the sky is laid on the page.

    `up` is a frame whose north is up, or `"zenith"`. `width_deg` is the angle across the map: the separation of the
    two ends of its horizontal middle line, for the unrolled projections the longitude between them. `rotation_deg`
    turns the picture anticlockwise. `limit_mag` is the faintest star, or None to follow the width.
    """

    projection: str = "stereographic"
    centre: Centre = field(default_factory=Centre)
    up: str = "ecliptic/mean/date"
    east_left: bool = True
    width_deg: float = 110.0
    rotation_deg: float = 0.0
    limit_mag: float | None = None

    def __post_init__(self) -> None:
        """Check names and ranges; a width beyond what the projection can show is cut to its widest."""
        _one_of("view.projection", self.projection, PROJECTIONS)
        if self.up != "zenith":
            object.__setattr__(self, "up", _frame("view.up", self.up))
        width = _number("view.width_deg", self.width_deg, NARROWEST, 360.0)
        object.__setattr__(self, "width_deg", min(width, WIDEST[self.projection]))
        turned = _number("view.rotation_deg", self.rotation_deg, -1e6, 1e6) % 360.0
        object.__setattr__(self, "rotation_deg", 0.0 if turned == 360.0 else turned)
        if self.limit_mag is not None:
            object.__setattr__(self, "limit_mag", _number("view.limit_mag", self.limit_mag, -2.0, 20.0))


@dataclass(frozen=True, slots=True)
class Circle:
    """A great circle, or a small one at a latitude, of a frame; `extras` are unknown keys kept from a file."""

    frame: str
    lat_deg: float = 0.0
    colour: str | None = None
    visible: bool = True
    graduated: bool = True
    label: str | None = None
    extras: Mapping[str, Any] = field(default_factory=_no_extras, compare=False)

    def __post_init__(self) -> None:
        """Check the frame, the latitude and the colour."""
        object.__setattr__(self, "frame", _frame("circles.frame", self.frame))
        object.__setattr__(self, "lat_deg", _number("circles.lat_deg", self.lat_deg, -89.999, 89.999))
        _colour("circles.colour", self.colour)

    @property
    def name(self) -> str:
        """The label drawn along the curve: the user's own, or the frame's, with the latitude of a small circle."""
        if self.label:
            return self.label
        text = _frame_label(self.frame)
        return text if self.lat_deg == 0.0 else f"{text}, {self.lat_deg:+g}°".replace("-", "\N{MINUS SIGN}")


@dataclass(frozen=True, slots=True)
class Belt:
    """The zone of ±half-width in latitude about an ecliptic, cut in divisions of 30° from its equinox."""

    visible: bool = True
    frame: str = "ecliptic/mean/date"
    half_width_deg: float = 9.0
    divisions: bool = True
    crossings: bool = False

    def __post_init__(self) -> None:
        """Check the frame and the half-width."""
        object.__setattr__(self, "frame", _frame("belt.frame", self.frame))
        object.__setattr__(self, "half_width_deg", _number("belt.half_width_deg", self.half_width_deg, 0.1, 60.0))


@dataclass(frozen=True, slots=True)
class Layers:
    """Which layers are shown."""

    stars: bool = True
    star_names: bool = True
    deep_sky: bool = True
    milky_way: bool = True
    edges: bool = False
    constellation_names: bool = True
    bodies: bool = True
    grid: str | None = "ecliptic/mean/date"
    points: bool = True

    def __post_init__(self) -> None:
        """Check the frame of the grid."""
        if self.grid is not None:
            object.__setattr__(self, "grid", _frame("layers.grid", self.grid))


@dataclass(frozen=True, slots=True)
class Session:
    """Everything on screen. `extras` are the keys of a session file that this version does not know, kept as read.

    `omitted` names the steps of a reduction that everything on the chart does without, in their order.
    """

    moment: Moment
    site: Site
    view: View = field(default_factory=View)
    place: str = "astrometric"
    from_site: bool = True
    circles: tuple[Circle, ...] = ()
    belt: Belt = field(default_factory=Belt)
    bodies: tuple[str, ...] = DEMO_BODIES
    layers: Layers = field(default_factory=Layers)
    overlays: tuple[Overlay, ...] = ()
    omitted: tuple[str, ...] = ()
    extras: Mapping[str, Any] = field(default_factory=_no_extras, compare=False)

    def __post_init__(self) -> None:
        """Check the place and the bodies."""
        _one_of("place", self.place, PLACES)
        for body in self.bodies:
            if body not in BODIES:
                raise BodyError(
                    f"bodies: {body!r} is unknown; expected one of {', '.join(BODIES)}{near_names(str(body), BODIES)}"
                )
        if len(set(self.bodies)) != len(self.bodies):
            raise SessionError(f"bodies: {list(self.bodies)} names a body twice; expected each once")
        if self.omitted:
            try:
                left_out = stepnames.checked(self.omitted)
            except ColureError as fault:
                raise SessionError(f"omitted: {fault}") from fault
            object.__setattr__(self, "omitted", tuple(step for step in stepnames.STEPS if step in left_out))

    @classmethod
    def demo(cls) -> "Session":
        """Return the session that an empty start opens: the evening belt at an invented site."""
        return cls(
            moment=Moment.parse("2026-12-01 21:36:00 UTC"),
            site=DEMO,
            view=View(centre=Centre("ecliptic/mean/date", 75.0, 6.0)),
            circles=(
                Circle("equator/mean/date", colour="#0072B2"),
                Circle("ecliptic/mean/date", colour="#D55E00"),
                Circle("ecliptic/mean/-1000", colour="#CC79A7", graduated=False),
                Circle("galactic", colour="#009E73", graduated=False),
                Circle("horizon", colour="#8A7A5C", graduated=True),
                Circle("invariable", colour="#B08A00", visible=False, graduated=False),
            ),
        )

"""What can be asked for and shown: a body, star, deep-sky object, constellation, point or position, with its place."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from colure import constellations, deepsky, names, stars
from colure.arrays import DEG, Float, spherical
from colure.framenames import Frame

Kind = Literal["body", "point", "constellation", "star", "deepsky", "position"]
KINDS: tuple[Kind, ...] = ("body", "star", "deepsky", "constellation", "point", "position")
"""Every kind of target, in the order in which equally good answers are given."""
BODY_NAMES = {
    "sun": ("Sun",),
    "moon": ("Moon",),
    "mercury": ("Mercury",),
    "venus": ("Venus",),
    "mars": ("Mars",),
    "jupiter": ("Jupiter",),
    "saturn": ("Saturn",),
    "uranus": ("Uranus",),
    "neptune": ("Neptune",),
    "pluto": ("Pluto",),
    "earth": ("Earth",),
    "emb": ("Earth–Moon barycentre", "EMB", "Earth-Moon barycenter"),
}
"""The bodies by the name that the ephemeris knows, each with the names that it may be asked for."""

POINTS = (
    (("March equinox", "vernal equinox", "First Point of Aries"), "ecliptic/mean/date", 0.0, 0.0),
    (("June solstice",), "ecliptic/mean/date", 90.0, 0.0),
    (("September equinox", "autumnal equinox"), "ecliptic/mean/date", 180.0, 0.0),
    (("December solstice",), "ecliptic/mean/date", 270.0, 0.0),
    (("opposition point", "antisolar point", "gegenschein"), "ecliptic/sun/date", 180.0, 0.0),
    (("north ecliptic pole", "NEP"), "ecliptic/mean/date", 0.0, 90.0),
    (("south ecliptic pole", "SEP"), "ecliptic/mean/date", 0.0, -90.0),
    (("north celestial pole", "NCP"), "equator/mean/date", 0.0, 90.0),
    (("south celestial pole", "SCP"), "equator/mean/date", 0.0, -90.0),
    (("galactic centre", "galactic center"), "galactic", 0.0, 0.0),
    (("galactic anticentre", "galactic anticenter"), "galactic", 180.0, 0.0),
    (("north galactic pole", "NGP"), "galactic", 0.0, 90.0),
    (("south galactic pole", "SGP"), "galactic", 0.0, -90.0),
    (("zenith",), "horizon", 0.0, 90.0),
)
"""Points that can be asked for by name: names, frame, longitude and latitude in degrees."""


@dataclass(frozen=True, slots=True)
class Target:
    """What a text means. `ref` tells it apart within its kind.

    `ref` is the name of a body for the ephemeris, the row of a star or of a deep-sky object, the abbreviation of a
    constellation, the name of a point, or the text of a position. `name` is what to print, `detail` what more there
    is to say in a few words. `frame`, `lon_deg` and `lat_deg` say where it is; None for a body, which moves.
    """

    kind: Kind
    ref: str | int
    name: str
    detail: str
    frame: str | None = None
    lon_deg: float | None = None
    lat_deg: float | None = None


def make(kind: Kind, ref: str | int, name: str, year: float = 2000.0) -> Target:
    """Return the target of any kind but a position; `name` is what to call it, `year` the Julian year of a star."""
    return _MAKERS[kind](ref, name, year)


def _body(ref: str | int, name: str, year: float) -> Target:
    return Target("body", ref, BODY_NAMES[str(ref)][0], "body")


def _point(ref: str | int, name: str, year: float) -> Target:
    _, frame, lon, lat = next(point for point in POINTS if point[0][0] == ref)
    return Target("point", ref, str(ref), f"point, {Frame.parse(frame).label()}", frame, lon, lat)


def _constellation(ref: str | int, name: str, year: float) -> Target:
    entry = constellations.find(str(ref))
    anchors = constellations.anchors()
    # Serpens has two anchors, the larger part's first.
    lon, lat = _degrees(anchors.points[np.flatnonzero(anchors.codes == entry.code)[0]])
    return Target("constellation", entry.code, entry.name, f"constellation, {entry.code}", "icrs", lon, lat)


def _star(ref: str | int, name: str, year: float) -> Target:
    star = stars.catalogue().rows([int(ref)])
    known = names.identify(int(ref))
    if name not in known.every:  # a spelling as typed
        name = known.best
    direction = star.directions(year)[0]
    lon, lat = _degrees(direction)
    held = str(constellations.of(direction))
    others = [other for other in known.every[:3] if other != name]
    detail = ", ".join([*others[:1], f"V {star.vmag[0]:.1f}", f"star in {held}"])
    return Target("star", int(ref), name, detail, "icrs", lon, lat)


def _deepsky_object(ref: str | int, name: str, year: float) -> Target:
    row = int(ref)
    known = deepsky.names(row)
    if name not in known:
        name = known[0]
    thing = deepsky.everything().take(np.array([row]))
    lon, lat = _degrees(thing.vectors[0])
    magnitude = float(thing.magnitude[0])
    others = [other for other in known[:2] if other != name]
    light = [f"mag {magnitude:.1f}"] if np.isfinite(magnitude) else []
    detail = ", ".join([*others[:1], *light, f"{deepsky.type_of(row)} in {constellations.of(thing.vectors[0])}"])
    return Target("deepsky", row, name, detail, "icrs", lon, lat)


_MAKERS: dict[Kind, Callable[[str | int, str, float], Target]] = {
    "body": _body,
    "point": _point,
    "constellation": _constellation,
    "star": _star,
    "deepsky": _deepsky_object,
}


def _degrees(direction: Float) -> tuple[float, float]:
    lon, lat = spherical(direction)
    return float(lon) / DEG, float(lat) / DEG

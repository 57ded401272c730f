"""Read and write a session as one readable TOML file (`format = 1`); untrusted input, checked key by key.

A key that this version does not know is kept, written back by `dumps`, and named in the report of `read`.

    format = 1
    place = "astrometric"
    [moment]  tt_jd = [2461376.5, 0.9]  scale = "UTC"  calendar = "mixed"  text = "2026-12-01 21:36:00 UTC"
    [site]    name = "Quern Hill"  lon_deg = 129.4  lat_deg = -25.9  height_m = 710.0
    [view]    projection, up, east_left, width_deg, rotation_deg, limit_mag
    [view.centre]  frame, lon_deg, lat_deg   or   body
    [[circles]]    frame, lat_deg, colour, visible, graduated, label
    [[overlays]]   path, sha256, frame, kind, epoch, lon, lat, …: the rows stay in their file
    [belt]    [layers]    bodies = ["sun", …]
"""

import math
import os
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import fields
from pathlib import Path
from types import MappingProxyType
from typing import Any, TypeVar

import tomli_w

from colure.errors import ColureError, SessionError
from colure.files import atomic_write, read_bounded
from colure.moment import Moment
from colure.overlays.model import Overlay
from colure.session import FORMAT, Belt, Centre, Circle, Layers, Session, View
from colure.sites import Site

LARGEST = 1_000_000
"""Largest session file in bytes: a real one has a few thousand."""
MOST_CIRCLES = 200
MOST_OVERLAYS = 50

T = TypeVar("T")

_MOMENT_KEYS = ("text", "tt_jd", "scale", "calendar")
_CIRCLE_KEYS = tuple(f.name for f in fields(Circle) if f.name != "extras")
_OVERLAY_KEYS = tuple(f.name for f in fields(Overlay) if f.name != "extras")
_TOP_KEYS = (
    "format",
    "moment",
    "site",
    "view",
    "place",
    "from_site",
    "circles",
    "belt",
    "bodies",
    "layers",
    "omitted",
    "overlays",
)


def dumps(session: Session) -> str:
    """Return a session as TOML text; unknown keys that were read are written back."""
    jd1, jd2 = session.moment.tt
    document: dict[str, Any] = {
        "format": FORMAT,
        "place": session.place,
        "from_site": session.from_site,
        "bodies": list(session.bodies),
        "moment": {
            # The text is for the reader; the pair of numbers is the moment, to the nanosecond.
            "text": str(session.moment.text()),
            "tt_jd": [float(jd1), float(jd2)],
            "scale": session.moment.scale,
            "calendar": session.moment.calendar,
        },
        "site": _site(session.site),
        "view": {
            **{k: v for k, v in _plain(session.view).items() if k != "centre"},
            "centre": _plain(session.view.centre),
        },
        "belt": _plain(session.belt),
        "layers": _plain(session.layers),
        "circles": [{**circle.extras, **_plain(circle)} for circle in session.circles],
    }
    if session.overlays:
        document["overlays"] = [{**overlay.extras, **_plain(overlay)} for overlay in session.overlays]
    if session.omitted:
        document["omitted"] = list(session.omitted)
    if session.layers.grid is None:
        document["layers"]["grid"] = ""
    _merge(document, session.extras)
    return tomli_w.dumps(document)


def _site(site: Site) -> dict[str, Any]:
    """Return a site's fields, its horizon as a list of pairs."""
    table = _plain(site)
    if site.horizon is not None:
        table["horizon"] = [list(pair) for pair in site.horizon]
    return table


def _plain(value: Any) -> dict[str, Any]:
    """Return the fields of a dataclass that TOML can hold; None is written by leaving the key out."""
    return {
        f.name: getattr(value, f.name)
        for f in fields(value)
        if isinstance(getattr(value, f.name), str | bool | int | float)
    }


def _merge(document: dict[str, Any], extras: Mapping[str, Any]) -> None:
    """Put unknown keys back where they stood, never over a known one."""
    for key, value in extras.items():
        if key not in document:
            document[key] = value
        elif isinstance(value, Mapping) and isinstance(document[key], dict):
            _merge(document[key], value)


def loads(text: str) -> tuple[Session, tuple[str, ...]]:
    """Return the session in a TOML text and the dotted names of keys that are not known; raise SessionError."""
    try:
        document = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError, ValueError) as fault:
        raise SessionError(f"session: not readable as TOML: {fault}") from fault
    return _Reader(document).session()


def read(path: str | os.PathLike[str]) -> tuple[Session, tuple[str, ...]]:
    """Return the session in a file and the names of unknown keys; raise SessionError that names the file."""
    where = Path(path)
    try:
        return loads(read_bounded(where, LARGEST).decode("utf-8"))
    except UnicodeDecodeError as fault:
        raise SessionError(f"session '{where}': not UTF-8 text (byte {fault.start})") from fault
    except ColureError as fault:
        raise SessionError(f"session '{where}': {fault}") from fault


def write(session: Session, path: str | os.PathLike[str]) -> None:
    """Write a session to a temporary neighbour and rename it, so that an interrupted save leaves the old file whole."""
    atomic_write(Path(path), dumps(session))


class _Reader:
    """Turns a parsed document into a session, and collects what it did not know."""

    def __init__(self, document: dict[str, Any]) -> None:
        self.document = document
        self.unknown: list[str] = []
        self.extras: dict[str, Any] = {}

    def session(self) -> tuple[Session, tuple[str, ...]]:
        """Return the session and the names of unknown keys."""
        top = self.document
        if top.get("format") != FORMAT or isinstance(top.get("format"), bool):
            raise SessionError(f"format: {top.get('format')!r}; expected {FORMAT}")
        self._note("", top, _TOP_KEYS)
        values: dict[str, Any] = {"moment": self._moment(), "site": self._site(), "view": self._view()}
        if "place" in top:
            values["place"] = self._typed("place", top["place"], str, "text")
        if "from_site" in top:
            values["from_site"] = self._typed("from_site", top["from_site"], bool, "true or false")
        if "circles" in top:
            values["circles"] = self._circles(top["circles"])
        if "belt" in top:
            values["belt"] = self._table("belt", Belt)
        if "layers" in top:
            values["layers"] = self._layers()
        if "overlays" in top:
            values["overlays"] = self._overlays(top["overlays"])
        if "bodies" in top:
            bodies = self._typed("bodies", top["bodies"], list, "a list of names")
            values["bodies"] = tuple(self._typed(f"bodies[{i}]", b, str, "text") for i, b in enumerate(bodies))
        if "omitted" in top:
            steps = self._typed("omitted", top["omitted"], list, "a list of steps")
            values["omitted"] = tuple(self._typed(f"omitted[{i}]", s, str, "text") for i, s in enumerate(steps))
        session = self._made("session", lambda: Session(extras=MappingProxyType(self.extras), **values))
        return session, tuple(self.unknown)

    def _note(self, where: str, table: Mapping[str, Any], known: tuple[str, ...]) -> None:
        """Keep the keys of a table that are not known, and report them."""
        for key, value in table.items():
            if key in known:
                continue
            path = [*where.split("."), key] if where else [key]
            self.unknown.append(".".join(path))
            at = self.extras
            for part in path[:-1]:
                at = at.setdefault(part, {})
            at[key] = value

    @staticmethod
    def _typed(where: str, value: Any, kind: type | tuple[type, ...], expected: str) -> Any:
        allowed = kind if isinstance(kind, tuple) else (kind,)
        if not isinstance(value, kind) or (isinstance(value, bool) and bool not in allowed):
            raise SessionError(f"{where}: {_shown(value)}; expected {expected}")
        if isinstance(value, float) and not math.isfinite(value):
            raise SessionError(f"{where}: {value}; expected a finite number")
        return value

    @staticmethod
    def _made(where: str, make: Callable[[], T]) -> T:
        """Call a constructor and turn whatever it objects to into a SessionError."""
        try:
            return make()
        except SessionError:
            raise
        except (ColureError, TypeError, ValueError, OverflowError) as fault:
            raise SessionError(f"{where}: {fault}") from fault

    def _section(self, name: str) -> Mapping[str, Any]:
        value: Mapping[str, Any] = self._typed(name, self.document.get(name), dict, "a table")
        return value

    def _fields(self, where: str, table: Mapping[str, Any], kind: type) -> dict[str, Any]:
        """Return those keys of a table that are fields of a dataclass, each of the type of the field."""
        annotations = {f.name: f.type if isinstance(f.type, str) else _name(f.type) for f in fields(kind)}
        annotations.pop("extras", None)
        found: dict[str, Any] = {}
        for key, value in table.items():
            if key not in annotations:
                continue
            text = annotations[key]
            path = f"{where}.{key}"
            if text.startswith("bool"):
                found[key] = self._typed(path, value, bool, "true or false")
            elif text == "int":
                found[key] = self._typed(path, value, int, "a whole number")
            elif text.startswith("float"):
                found[key] = float(self._typed(path, value, (int, float), "a number"))
            elif text.startswith("str"):
                found[key] = self._typed(path, value, str, "text")
        if kind not in (Circle, Overlay):
            self._note(where, table, tuple(annotations))
        return found

    def _table(self, name: str, kind: Callable[..., T]) -> T:
        values = self._fields(name, self._section(name), kind)  # type: ignore[arg-type]
        return self._made(name, lambda: kind(**values))

    def _layers(self) -> Layers:
        values = self._fields("layers", self._section("layers"), Layers)
        if values.get("grid") == "":
            values["grid"] = None
        return self._made("layers", lambda: Layers(**values))

    def _site(self) -> Site:
        table = self._section("site")
        values = self._fields("site", table, Site)
        if "horizon" in table:
            pairs = self._typed("site.horizon", table["horizon"], list, "a list of pairs")
            values["horizon"] = tuple(self._pair(f"site.horizon[{i}]", pair) for i, pair in enumerate(pairs))
        return self._made("site", lambda: Site(**values))

    def _pair(self, where: str, value: Any) -> tuple[float, float]:
        pair = self._typed(where, value, list, "two numbers")
        if len(pair) != 2:
            raise SessionError(f"{where}: {_shown(pair)}; expected two numbers")
        a, b = (float(self._typed(where, part, (int, float), "two numbers")) for part in pair)
        return a, b

    def _moment(self) -> Moment:
        table = self._section("moment")
        self._note("moment", table, _MOMENT_KEYS)
        scale = self._typed("moment.scale", table.get("scale", "UTC"), str, "text")
        calendar = self._typed("moment.calendar", table.get("calendar", "mixed"), str, "text")
        if "tt_jd" in table:
            pair = table["tt_jd"]
            a, b = self._pair("moment.tt_jd", pair)
            return self._made("moment", lambda: Moment(a, b, scale, calendar))
        text = self._typed("moment.text", table.get("text"), str, "a date or a pair tt_jd")
        return self._made("moment", lambda: Moment.parse(text))

    def _view(self) -> View:
        table = self._section("view")
        values = self._fields("view", {k: v for k, v in table.items() if k != "centre"}, View)
        if "centre" in table:
            centre = self._typed("view.centre", table["centre"], dict, "a table")
            inner = self._fields("view.centre", centre, Centre)
            values["centre"] = self._made("view.centre", lambda: Centre(**inner))
        return self._made("view", lambda: View(**values))

    def _circles(self, value: Any) -> tuple[Circle, ...]:
        rows = self._typed("circles", value, list, "a list of tables")
        if len(rows) > MOST_CIRCLES:
            raise SessionError(f"circles: {len(rows)} of them; expected at most {MOST_CIRCLES}")
        circles = []
        for i, row in enumerate(rows):
            where = f"circles[{i}]"
            inner = self._fields(where, self._typed(where, row, dict, "a table"), Circle)
            # Unknown keys stay with their circle, which may be moved or removed before the session is written.
            inner["extras"] = MappingProxyType({key: row[key] for key in row if key not in _CIRCLE_KEYS})
            self.unknown += [f"{where}.{key}" for key in inner["extras"]]
            circles.append(self._made(where, lambda inner=inner: Circle(**inner)))  # type: ignore[misc]
        return tuple(circles)

    def _overlays(self, value: Any) -> tuple[Overlay, ...]:
        rows = self._typed("overlays", value, list, "a list of tables")
        if len(rows) > MOST_OVERLAYS:
            raise SessionError(f"overlays: {len(rows)} of them; expected at most {MOST_OVERLAYS}")
        overlays = []
        for i, row in enumerate(rows):
            where = f"overlays[{i}]"
            inner = self._fields(where, self._typed(where, row, dict, "a table"), Overlay)
            for key in ("path", "sha256", "frame"):
                if key not in inner:
                    raise SessionError(f"{where}.{key}: missing; expected text")
            inner["extras"] = MappingProxyType({key: row[key] for key in row if key not in _OVERLAY_KEYS})
            self.unknown += [f"{where}.{key}" for key in inner["extras"]]
            overlays.append(self._made(where, lambda inner=inner: Overlay(**inner)))  # type: ignore[misc]
        return tuple(overlays)


def _name(kind: Any) -> str:
    """Return the written form of a type such as `float | None`."""
    return kind.__name__ if isinstance(kind, type) else str(kind)


def _shown(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "…"

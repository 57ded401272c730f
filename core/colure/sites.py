"""Places on the Earth: typed coordinates, the Minor Planet Center's codes, the user's own file, the demo site."""

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, NamedTuple

from colure import angles, resources
from colure.errors import AngleError, SiteError, near_names
from colure.wording import one_line

EXPECTED = "expected a name, an MPC code, or LON LAT HEIGHT such as '129.40° E 25.90° S 710 m'"
FILE_LIMIT = 1_000_000
"""The most bytes that a file of sites may have."""

_KEYS = {
    "name": "name",
    "longitude_deg": "lon_deg",
    "latitude_deg": "lat_deg",
    "height_m": "height_m",
    "pressure_hpa": "pressure_hpa",
    "temperature_c": "temperature_c",
    "code": "code",
    "note": "note",
    "horizon": "horizon",
}
_NEEDED = ("name", "longitude_deg", "latitude_deg", "height_m")
_HEIGHT = re.compile(r"(?P<rest>.*\S)[\s,]+(?P<height>[+-]?\d+(?:\.\d+)?)\s*m?\Z", re.ASCII)
_SIDES = re.compile(r"(?P<a>.+?)\s*(?P<x>[EWNSewn])[\s,]+(?P<b>.+?)\s*(?P<y>[EWNSewn])\Z")


@dataclass(frozen=True, slots=True)
class Site:
    """A place on the WGS84 ellipsoid: degrees (east and north positive) and metres above it.

    `pressure_hpa` and `temperature_c` are the air's there, None where they are not known. `horizon` is a profile of
    (azimuth, altitude) in degrees by growing azimuth. Raises SiteError for values that are no place.
    """

    name: str
    lon_deg: float
    lat_deg: float
    height_m: float
    pressure_hpa: float | None = None
    temperature_c: float | None = None
    code: str | None = None
    note: str = ""
    horizon: tuple[tuple[float, float], ...] | None = None

    def __post_init__(self) -> None:
        """Check every value and bring the longitude to −180…180."""
        limits = (
            ("longitude", self.lon_deg, -360.0, 360.0),
            ("latitude", self.lat_deg, -90.0, 90.0),
            ("height in m", self.height_m, -500.0, 10000.0),
            ("pressure in hPa", self.pressure_hpa, 0.0, 1200.0),
            ("temperature in °C", self.temperature_c, -90.0, 60.0),
        )
        for what, value, low, high in limits:
            if value is None:
                continue
            if isinstance(value, bool) or not isinstance(value, int | float) or not low <= value <= high:
                shown = f"{value:g}" if isinstance(value, int | float) else repr(value)
                raise SiteError(f"site '{one_line(self.name)}': {what} {shown}; expected {low:g} to {high:g}")
        if not -180.0 <= self.lon_deg <= 180.0:
            object.__setattr__(self, "lon_deg", (self.lon_deg + 180.0) % 360.0 - 180.0)
        if self.horizon is not None:
            azimuths = [azimuth for azimuth, _ in self.horizon]
            sound = all(0.0 <= az <= 360.0 and -90.0 <= alt <= 90.0 for az, alt in self.horizon)
            if not sound or azimuths != sorted(azimuths) or len(azimuths) < 2:
                raise SiteError(
                    f"site '{one_line(self.name)}': horizon; expected two or more pairs of azimuth (0 to 360, growing) "
                    "and altitude (−90 to 90)"
                )

    @classmethod
    def parse(cls, text: str, *, path: Path | None = None) -> "Site":
        """Return the site that a text names; `path` is the user's file of sites if not the usual one.

        A name (the demo's, one of the user's file, an observatory's), an MPC code, or `LON LAT HEIGHT` in degrees and
        metres with east positive, or with the letters E, W, N, S. Raises SiteError, suggesting near names.
        """
        plain = " ".join(text.split())
        if not plain:
            raise SiteError(f"site: nothing was given; {EXPECTED}")
        wanted = plain.casefold()
        mine = user_sites(path)
        for site in (*mine, DEMO):
            if wanted in (site.name.casefold(), (site.code or "").casefold()):
                return site
        row = _row(plain)
        if row is not None:
            return _observatory(row)
        if re.match(r"[-+−.\d]", plain) and len(plain) > 3:
            return _typed(plain)
        raise SiteError(f"site '{one_line(plain)}': unknown{_suggest(plain, mine)}; {EXPECTED}")

    def coordinates(self) -> str:
        """Return `129.40° E 25.90° S 710 m`, which `parse` reads back."""
        parts = []
        for value, sides in ((self.lon_deg, "EW"), (self.lat_deg, "NS")):
            parts.append(f"{_figures(abs(value), 2, 6)}° {sides[value < 0.0]}")
        height = _figures(abs(self.height_m), 0, 1)
        return f"{parts[0]} {parts[1]} {angles.MINUS if self.height_m < 0.0 else ''}{height} m"

    def __str__(self) -> str:
        where = self.coordinates()
        return where if self.name == where else f"{self.name}, {where}"


def _figures(value: float, least: int, most: int) -> str:
    """Return a number with as many decimals as it has, from `least` to `most`."""
    text = f"{value:.{most}f}"
    while most > least and text.endswith("0"):
        text, most = text[:-1], most - 1
    return text.removesuffix(".")


DEMO = Site("Quern Hill", 129.40, -25.90, 710.0, note="invented: no observatory is near")
"""The site of the demo session."""


class _Row(NamedTuple):
    """One line of the shipped list; `decimals` is how finely its constants were given, or why it has no place."""

    code: str
    name: str
    place: tuple[float, float] | None
    height: float | None
    decimals: str


@cache
def _rows() -> dict[str, _Row]:
    """Return the shipped observatory codes; read at the first look-up."""
    rows = {}
    for line in resources.path("sites/obscodes.tsv").read_text(encoding="utf-8").splitlines():
        if line.startswith("#"):
            continue
        code, name, lon, lat, height, decimals = line.split("\t")
        rows[code] = _Row(
            code, name, (float(lon), float(lat)) if lon else None, float(height) if height else None, decimals
        )
    return rows


@cache
def _codes_by_name() -> Mapping[str, str]:
    """Return the code of each observatory name that only one code has, by its name in one case."""
    found: dict[str, str] = {}
    twice = set()
    for row in _rows().values():
        key = row.name.casefold()
        if key in found:
            twice.add(key)
        found[key] = row.code
    return {key: code for key, code in found.items() if key not in twice}


def _row(text: str) -> _Row | None:
    by_code = _rows().get(text.upper()) if len(text) == 3 else None
    if by_code is not None:
        return by_code
    code = _codes_by_name().get(text.casefold())
    return _rows()[code] if code else None


def _observatory(row: _Row) -> Site:
    """Return the site of a code, its note saying how good the place is; SiteError for one without a place."""
    label = f"site '{row.code}' ({row.name})"
    if row.place is None:
        why = "the Earth's centre" if row.decimals == "geocentric" else "without a fixed place on the ground"
        raise SiteError(f"{label}: {why}; {EXPECTED}")
    places = int(row.decimals)
    error = 0.5 * 6378137.0 * 10.0**-places
    if row.height is None:
        note = f"height unknown, 0 m taken: the MPC's constants are good to {error:.0f} m"
    else:
        note = f"from the MPC's constants, good to {error:.0f} m"
    return Site(row.name, *row.place, row.height or 0.0, code=row.code, note=note)


def observatories() -> tuple[tuple[str, str], ...]:
    """Return (code, name) of every observatory code that has a place on the ground, by code."""
    return tuple((row.code, row.name) for row in _rows().values() if row.place is not None)


def search(text: str, *, path: Path | None = None, most: int = 20) -> tuple[str, ...]:
    """Return what `parse` understands and that contains the text: names of the user and demo, then `CODE name`."""
    wanted = text.casefold().strip()
    names = [site.name for site in (*user_sites(path), DEMO) if wanted in site.name.casefold()]
    codes = [row for row in _rows().values() if row.place is not None]
    exact = [row for row in codes if row.code.casefold() == wanted]
    within = [row for row in codes if wanted in row.name.casefold() and row not in exact]
    return tuple([*names, *(f"{row.code} {row.name}" for row in (*exact, *within))][:most])


def _suggest(text: str, mine: tuple[Site, ...]) -> str:
    names = [*(site.name for site in (*mine, DEMO)), *(row.name for row in _rows().values())]
    within = [row for row in _rows().values() if len(text) > 2 and text.casefold() in row.name.casefold()][:4]
    if within:
        return "; names that contain it: " + ", ".join(f"{row.code} {row.name}" for row in within)
    return near_names(text, names)


def _typed(text: str) -> Site:
    """Return the site at typed coordinates, named by them."""

    def fail(reason: str) -> SiteError:
        return SiteError(f"site '{one_line(text)}': {reason}; {EXPECTED}")

    found = _HEIGHT.match(text.replace(angles.MINUS, "-"))
    if found is None:
        raise fail("no height")
    rest, height = found["rest"].rstrip(" ,"), float(found["height"])
    try:
        if sides := _SIDES.match(rest):
            pair = {sides["x"].upper(): sides["a"], sides["y"].upper(): sides["b"]}
            east = [side for side in pair if side in "EW"]
            north = [side for side in pair if side in "NS"]
            if len(east) != 1 or len(north) != 1:
                raise fail("one of E and W and one of N and S belong to it")
            lon, lat = (_unsigned(pair[side], side) for side in (east[0], north[0]))
        else:
            lon, lat = angles.parse_position(rest, equatorial=False)
    except AngleError as fault:
        raise fail(str(fault)) from None
    lon = lon - 360.0 if lon > 180.0 else lon
    site = Site(text, lon, lat, height)
    return Site(site.coordinates(), lon, lat, height)


def _unsigned(text: str, side: str) -> float:
    value = angles.parse_angle(text, "longitude" if side in "EW" else "latitude")
    if value < 0.0:
        raise AngleError(f"'{one_line(text)} {side}' has both a sign and a letter")
    return -value if side in "WS" else value


# The user's own sites


def user_file() -> Path:
    """Return the file of the user's sites: $COLURE_SITES, else `colure/sites.toml` in the configuration folder."""
    named = os.environ.get("COLURE_SITES")
    if named:
        return Path(named).expanduser()
    base = os.environ.get("XDG_CONFIG_HOME")
    return (Path(base) if base else Path.home() / ".config") / "colure" / "sites.toml"


def user_sites(path: Path | None = None) -> tuple[Site, ...]:
    """Return the sites of a TOML file: tables `[[site]]` with name, longitude_deg, latitude_deg, height_m and more.

    Optional keys: pressure_hpa, temperature_c, code, note, horizon (pairs of azimuth and altitude). The usual file
    need not exist; one that was named must. Raises SiteError with the file, the table and the key.
    """
    where = path or user_file()
    if path is None and not os.environ.get("COLURE_SITES") and not where.exists():
        return ()
    try:
        stat = where.stat()
        return _read_sites(where, stat.st_mtime_ns, stat.st_size)
    except OSError as fault:
        raise SiteError(f"file of sites '{where}': {fault.strerror or fault}") from None


@cache
def _read_sites(where: Path, changed: int, size: int) -> tuple[Site, ...]:
    """Read a file of sites; kept until its time of change or its size differs."""
    del changed
    if size > FILE_LIMIT:
        raise SiteError(f"file of sites '{where}': {size} bytes; expected at most {FILE_LIMIT}")
    import tomllib  # late: most sessions read no file of sites

    try:
        data = tomllib.loads(where.read_text(encoding="utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, RecursionError) as fault:
        raise SiteError(f"file of sites '{where}': {one_line(str(fault), 120)}") from None
    tables = data.get("site", [])
    if not isinstance(tables, list) or not all(isinstance(table, dict) for table in tables):
        raise SiteError(f"file of sites '{where}': 'site'; expected tables [[site]]")
    return tuple(_from_table(table, f"file of sites '{where}', site {i}") for i, table in enumerate(tables, 1))


def _from_table(table: dict[str, Any], where: str) -> Site:
    for key in table:
        if key not in _KEYS:
            raise SiteError(f"{where}: unknown key '{one_line(key)}'{near_names(key, _KEYS)}")
    for key in _NEEDED:
        if key not in table:
            raise SiteError(f"{where}: no '{key}'")
    values = {_KEYS[key]: value for key, value in table.items()}
    for key in ("name", "code", "note"):
        if not isinstance(values.get(key, ""), str) or (key == "name" and not values[key].strip()):
            raise SiteError(f"{where}: '{key}' is {values[key]!r:.40}; expected text")
    if "horizon" in values:
        try:
            profile = tuple((float(az), float(alt)) for az, alt in values["horizon"])
        except (TypeError, ValueError):
            raise SiteError(f"{where}: 'horizon'; expected pairs [azimuth, altitude]") from None
        values["horizon"] = profile
    try:
        return Site(**values)
    except SiteError as fault:
        raise SiteError(f"{where}: {fault}") from None

"""Which columns of a table are its positions, their units and their plane: by UCD first, then by well-known names."""

import re
from dataclasses import dataclass

import numpy as np

from colure.tables import Column, Table
from colure.wording import one_line

UCD_PAIRS = (
    ("pos.eq.ra", "pos.eq.dec", "equator"),
    ("pos.ecliptic.lon", "pos.ecliptic.lat", "ecliptic"),
    ("pos.galactic.lon", "pos.galactic.lat", "galactic"),
    ("pos.supergalactic.lon", "pos.supergalactic.lat", "supergalactic"),
)
"""UCD1+ words of positions (IVOA) and the plane they name."""
_OLD_WORDS = {
    "POS_EQ_RA": "pos.eq.ra", "POS_EQ_DEC": "pos.eq.dec", "POS_EC_RA": "pos.ecliptic.lon", "POS_EC_DEC":
    "pos.ecliptic.lat", "POS_EC_LON": "pos.ecliptic.lon", "POS_EC_LAT": "pos.ecliptic.lat", "POS_GAL_LON":
    "pos.galactic.lon", "POS_GAL_LAT": "pos.galactic.lat", "POS_SG_LON": "pos.supergalactic.lon", "POS_SG_LAT":
    "pos.supergalactic.lat",
}  # fmt: skip
"""UCD1 words, which old tables carry."""

NAME_PAIRS = (
    (r"_?ra_?icrs(?:_deg)?", r"_?de(?:c)?_?icrs(?:_deg)?", "equator", "icrs"),
    (r"_?ra_?j2000(?:_deg)?", r"_?de(?:c)?_?j2000(?:_deg)?", "equator", "FK5 2000"),
    (r"_?ra_?b1950(?:_deg)?", r"_?de(?:c)?_?b1950(?:_deg)?", "equator", "FK4 1950"),
    (r"(?:glon|gal_?lon)(?:_deg)?|l_gal", r"(?:glat|gal_?lat)(?:_deg)?|b_gal", "galactic", "galactic"),
    (r"sglon", r"sglat", "supergalactic", "supergalactic"),
    (r"(?:elon|ecl_?lon|lambda)(?:_deg)?", r"(?:elat|ecl_?lat|beta)(?:_deg)?", "ecliptic", ""),
    (r"ra(?:_?deg)?|r\.a\.|alpha|right[_ ]ascension", r"de(?:c)?(?:_?deg)?|decl|delta|declination", "equator", ""),
    (r"lon(?:gitude)?(?:_?deg)?", r"lat(?:itude)?(?:_?deg)?", "", ""),
)
"""Patterns of names of longitude and latitude, their plane, and the system that the name itself states."""
_LABELS = re.compile(r"name|main_id|id|object|star|designation|source_?id|hip|label", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Pair:
    """A pair of columns: longitude and latitude by name, their plane ("" if unknown), and why they were taken.

    `system` is what their names state of the system ("icrs", "FK5 2000", …), "" where they state none.
    """

    lon: str
    lat: str
    plane: str
    rule: str
    system: str = ""


def words(ucd: str) -> tuple[str, frozenset[str]]:
    """Return the first word of a UCD in its new form, and the other words."""
    parts = [part.strip() for part in ucd.split(";") if part.strip()]
    if not parts:
        return "", frozenset()
    first = parts[0]
    if "_" in first and first.upper() == first:
        main = first.endswith("_MAIN")
        first = _OLD_WORDS.get(first.removesuffix("_MAIN"), first)
        return first, frozenset([*parts[1:], *(["meta.main"] if main else [])])
    return first.lower(), frozenset(part.lower() for part in parts[1:])


def pairs(table: Table) -> tuple[Pair, ...]:
    """Return the pairs of columns that can be positions, the best first: UCD with meta.main, UCD, names."""
    found: list[Pair] = []
    tagged = [(column.name, *words(column.ucd)) for column in table]
    for main in (True, False):
        for lon_word, lat_word, plane in UCD_PAIRS:
            lons = [
                n
                for n, first, rest in tagged
                if first == lon_word and ("meta.main" in rest) == main and _is_place(rest)
            ]
            lats = [
                n
                for n, first, rest in tagged
                if first == lat_word and ("meta.main" in rest) == main and _is_place(rest)
            ]
            for lon, lat in zip(lons, lats, strict=False):
                rule = f"UCD {lon_word}{';meta.main' if main else ''}"
                found.append(Pair(lon, lat, plane, rule, stated(lon)))
    for lon_pattern, lat_pattern, plane, system in NAME_PAIRS:
        lon = _named(table, lon_pattern)
        lat = _named(table, lat_pattern)
        if lon and lat and not any((pair.lon, pair.lat) == (lon, lat) for pair in found):
            found.append(Pair(lon, lat, plane, f"names '{one_line(lon, 30)}' and '{one_line(lat, 30)}'", system))
    return tuple(found)


def _is_place(rest: frozenset[str]) -> bool:
    """Whether the other words of a UCD leave it a position, and not the error or the rate of one."""
    return not any(word.startswith(("stat.", "pos.pm", "arith.", "obs.", "instr.", "meta.code")) for word in rest)


def _named(table: Table, pattern: str) -> str:
    whole = re.compile(rf"(?:{pattern})\Z", re.IGNORECASE)
    return next((name for name in table.names if whole.match(name)), "")


def stated(name: str) -> str:
    """Return the system that a column's name states, or an empty text."""
    for lon_pattern, _, _, system in NAME_PAIRS:
        if system and re.match(rf"(?:{lon_pattern})\Z", name, re.IGNORECASE):
            return system
    return ""


def plane_of(column: Column) -> str:
    """Return the plane that one longitude column names by its UCD or its name, or an empty text."""
    word, _ = words(column.ucd)
    for lon_word, _, plane in UCD_PAIRS:
        if word == lon_word:
            return plane
    for pattern, _, plane, _ in NAME_PAIRS:
        if re.match(rf"(?:{pattern})\Z", column.name, re.IGNORECASE):
            return plane
    return ""


def label_column(table: Table) -> str:
    """Return the column that names the rows, or an empty text."""
    for wanted in ("meta.id;meta.main", "meta.id"):
        for column in table:
            first, rest = words(column.ucd)
            if first == "meta.id" and (wanted == "meta.id" or "meta.main" in rest):
                return column.name
    return next((name for name in table.names if _LABELS.fullmatch(name)), "")


def unit_of(column: Column, equatorial: bool, longitude: bool) -> tuple[str | None, str]:
    """Return the unit to be declared for a column that carries none, and the rule; None where a user must say.

    An empty unit means that the column needs no other than it has. Numbers beyond 24 (or below zero) are no hours; a
    name that ends in `deg` states its unit; a latitude without a unit is in degrees, as nothing else is usual.
    """
    if column.unit.strip():
        return "", f"unit {one_line(column.unit, 20)}"
    if column.is_text:
        cells = [cell for cell in column.values[:1000].tolist() if cell]
        if not (equatorial and longitude) or all(re.search(r"[hHdD°]", cell) for cell in cells):
            return "", "text with its units" if equatorial and longitude else "sexagesimal degrees"
        return None, "sexagesimal numbers without a unit: hours or degrees?"
    if re.search(r"deg\Z", column.name, re.IGNORECASE):
        return "deg", f"name '{one_line(column.name, 30)}'"
    if not longitude:
        return "deg", "a latitude without a unit, in degrees"
    if not equatorial:
        return "deg", "a longitude without a unit, in degrees"
    values = column.values.astype(np.float64)
    finite = values[np.isfinite(values)]
    if len(finite) and (finite.max() > 24.0 or finite.min() < 0.0):
        far = finite.max() if finite.max() > 24.0 else finite.min()
        return "deg", f"no unit, but the value {far:.6g} is no hour"
    return None, "numbers from 0 to 24 without a unit: hours or degrees?"

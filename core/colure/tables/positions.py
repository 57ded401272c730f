"""Find the pair of coordinates in a table, turn it into degrees and refuse the rows that hold none."""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from colure.angles import MINUS, parse_latitude, parse_longitude
from colure.arrays import Bool, Float
from colure.errors import AngleError, TableError
from colure.tables.model import Column, Read, Table, screen, settle
from colure.tables.reading import read
from colure.wording import one_line

LONGITUDES = ("lon_deg", "lon", "ra_deg", "ra", "raj2000", "_raj2000", "ra_icrs", "lambda", "l", "elon", "glon")
LATITUDES = ("lat_deg", "lat", "dec_deg", "dec", "dej2000", "_dej2000", "de_icrs", "beta", "b", "elat", "glat")
"""Names by which the columns are known, in order of preference."""

_TO_DEGREES = {
    "": 1.0,
    "deg": 1.0,
    "degree": 1.0,
    "degrees": 1.0,
    "°": 1.0,
    "rad": 180.0 / np.pi,
    "radian": 180.0 / np.pi,
    "h": 15.0,
    "hr": 15.0,
    "hour": 15.0,
    "hourangle": 15.0,
    "arcmin": 1.0 / 60.0,
    "arcsec": 1.0 / 3600.0,
    "mas": 1.0 / 3.6e6,
}
_HOURS = re.compile(r'"?h[: ]m[: ]s"?\Z', re.IGNORECASE)
_DEGREES = re.compile(r'"?d[: ]m[: ]s"?\Z', re.IGNORECASE)


@dataclass(frozen=True, slots=True, eq=False)
class Positions:
    """The good rows of a table with their longitudes (0 to 360) and latitudes (rows,) in degrees.

    `lon_name` and `lat_name` are the columns used; `rejected` lists the rows left out, one line each.
    """

    table: Table
    lon_deg: Float
    lat_deg: Float
    lon_name: str
    lat_name: str
    rejected: tuple[str, ...]
    notes: tuple[str, ...]


def read_positions(
    path: Path | str,
    *,
    lon: str | None = None,
    lat: str | None = None,
    longitudes: Sequence[str] = LONGITUDES,
    latitudes: Sequence[str] = LATITUDES,
    equatorial: bool = False,
    skip_bad: bool = False,
) -> Positions:
    """Return the positions of a table file.

    The columns are those named by `lon` and `lat`, else the first of `longitudes` and `latitudes` that are there, in
    any case. Numbers are degrees unless the column's unit says hours, radians or arcseconds; text is read as typed
    angles are, so that a sexagesimal right ascension (`equatorial`) needs its unit, in the cell or for the column
    (`h:m:s`). Rows without a finite position in range are refused: TableError lists the first of them, or with
    `skip_bad` they are left out and listed.
    """
    where = f"table '{path}'"
    found = read(path, skip_bad=skip_bad)
    return pick(found, where, lon, lat, longitudes, latitudes, equatorial, skip_bad)


def pick(
    found: Read,
    where: str,
    lon: str | None,
    lat: str | None,
    longitudes: Sequence[str],
    latitudes: Sequence[str],
    equatorial: bool,
    skip_bad: bool,
) -> Positions:
    """Return the positions of a table already read; see `read_positions`."""
    lon_column = _choose(found.table, lon, longitudes, "longitudes", "--lon", where)
    lat_column = _choose(found.table, lat, latitudes, "latitudes", "--lat", where)
    lon_deg, lon_why = _degrees(
        lon_column, where, lambda text: parse_longitude(text, equatorial=equatorial, what=lon_column.name)
    )
    lat_deg, lat_why = _degrees(lat_column, where, lambda text: parse_latitude(text, what=lat_column.name))
    faults: list[tuple[Bool, Callable[[int], str]]] = []
    for column, degrees, why, limit in ((lon_column, lon_deg, lon_why, 360.0), (lat_column, lat_deg, lat_why, 90.0)):
        faults.append((~np.isfinite(degrees), _Unfit(column, why)))
        with np.errstate(invalid="ignore"):
            faults.append((np.abs(degrees) > limit, _Beyond(column, degrees, limit)))
    left = screen(
        Read(found.table.with_columns({_LON: (lon_deg, ""), _LAT: (lat_deg, "")}), found.rows, found.rejected), faults
    )
    left = settle(left, where, skip_bad)
    values = {name: left.table.column(name).values for name in (_LON, _LAT)}
    table = Table(left.table.columns[:-2], left.table.meta)
    lines = tuple(str(rejected) for rejected in left.rejected)
    lon_left = values[_LON] % 360.0
    lon_left[lon_left >= 360.0] = 0.0
    return Positions(table, lon_left, values[_LAT], lon_column.name, lat_column.name, lines, found.notes)


# Names that no file has: they carry the degrees through the screening of rows.
_LON, _LAT = "\x00lon", "\x00lat"


@dataclass(frozen=True, slots=True)
class _Unfit:
    """Words why a cell is no angle."""

    column: Column
    why: dict[int, str]

    def __call__(self, index: int) -> str:
        cell = self.column.values[index]
        if index in self.why:
            return self.why[index]
        empty = str(cell) == "" or cell != cell
        return f"{one_line(self.column.name)} {'is missing' if empty else f'{cell} is not finite'}"


@dataclass(frozen=True, slots=True)
class _Beyond:
    """Words how far a value is out of range."""

    column: Column
    degrees: Float
    limit: float

    def __call__(self, index: int) -> str:
        value = f"{self.degrees[index]:.10g}".replace("-", MINUS)
        return f"{one_line(self.column.name)} {value}° is outside {MINUS}{self.limit:g}° to {self.limit:g}°"


def _choose(table: Table, name: str | None, known: Sequence[str], what: str, option: str, where: str) -> Column:
    if name is not None:
        try:
            return table.column(name)
        except TableError as fault:
            raise TableError(f"{where}: {fault}") from None
    for candidate in known:
        if (found := table.find(candidate)) is not None:
            return found
    names = ", ".join(one_line(name, 30) for name in table.names[:12])
    raise TableError(f"{where}: no column of {what} is known by its name; it has {names}; name it with {option}")


def _degrees(column: Column, where: str, parse: Callable[[str], float]) -> tuple[Float, dict[int, str]]:
    """Return degrees (rows,), NaN where there are none, and the reasons by index for text that is no angle."""
    unit = column.unit.strip().casefold()
    if not column.is_text:
        if _HOURS.match(column.unit) or unit not in _TO_DEGREES:
            raise TableError(
                f"{where}: column '{one_line(column.name)}' is in '{one_line(column.unit)}'; "
                "expected deg, h, rad or arcsec"
            )
        return column.values.astype(np.float64) * _TO_DEGREES[unit], {}
    # The unit of the column stands for the one that each cell leaves out.
    suffix = "h" if _HOURS.match(column.unit) or _TO_DEGREES.get(unit) == 15.0 else ""
    if not suffix and (_DEGREES.match(column.unit) or unit in ("deg", "degree", "degrees", "°")):
        suffix = "°"
    out = np.full(len(column.values), np.nan)
    why: dict[int, str] = {}
    for index, cell in enumerate(column.values.tolist()):
        if not cell:
            continue
        try:
            out[index] = parse(_with_unit(cell, suffix))
        except AngleError as fault:
            why[index] = str(fault)
    return out, why


def _with_unit(cell: str, suffix: str) -> str:
    """Return a cell with its column's unit: after the first number unless the cell names one itself."""
    if not suffix or re.search(r"[hdms°′″'\"]", cell, re.IGNORECASE):
        return cell
    return re.sub(r"\d+(\.\d*)?", lambda found: found[0] + suffix, cell, count=1).replace(":", " ")

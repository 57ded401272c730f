"""ECSV, VOTable and FITS tables through astropy, which is imported only when one of them is met.

Before astropy sees a file, what could reach beyond it is refused: entities and document types in XML, streams that
name another address, compressed data of unknown size.
"""

import io
import re
import warnings
from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure.errors import ColureError, TableError
from colure.tables.csvfile import MOST_COLUMNS, MOST_ROWS
from colure.tables.model import Column, Read, Table
from colure.wording import one_line

_STREAM = re.compile(rb"<\s*(?:[\w.-]+:)?(?:STREAM|FITS)\b[^>]*\bhref", re.IGNORECASE)
_ENTITY = re.compile(rb"<!\s*(ENTITY|DOCTYPE(?=[^>]*\[))", re.IGNORECASE)
"""Entities, and document types that declare something; one that only names its DTD is harmless, as none is fetched."""


def _guard_xml(data: bytes, where: str) -> None:
    if data[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\x00" in data[:200]:
        raise TableError(f"{where}: not in UTF-8; expected a VOTable in UTF-8")
    if found := _ENTITY.search(data):
        raise TableError(
            f"{where}: has a {found[1].decode().upper()} declaration, which is not read; expected plain VOTable"
        )
    if _STREAM.search(data):
        raise TableError(f"{where}: its data lie elsewhere (href), which is not followed; expected them in the file")


def read_foreign(data: bytes, form: str, where: str) -> Read:
    """Return the table in the bytes of an `ecsv`, `votable` or `fits` file; the first table if there are more.

    Raises TableError in one line for whatever is wrong with it. Columns whose cells are arrays are left out, with a
    note.
    """
    readers: dict[str, Callable[[bytes, str], tuple[Any, list[str]]]] = {
        "ecsv": _ecsv,
        "votable": _votable,
        "fits": _fits,
    }
    if form == "votable":
        _guard_xml(data, where)
    name = {"ecsv": "ECSV", "votable": "VOTable", "fits": "FITS table"}[form]
    try:
        with warnings.catch_warnings(record=True) as caught:
            warnings.simplefilter("always")
            astropy_table, notes = readers[form](data, where)
    except ColureError:
        raise
    except MemoryError:
        raise TableError(f"{where}: its {name} does not fit into memory") from None
    except Exception as fault:  # whatever astropy meets in a damaged file, a user gets one line
        raise TableError(f"{where}: no readable {name}, {one_line(str(fault) or type(fault).__name__, 160)}") from None
    for warning in caught:
        if "truncated" in str(warning.message).casefold():
            raise TableError(f"{where}: the file is cut short; expected a whole {name}")
    return _from_astropy(astropy_table, where, notes)


def _ecsv(data: bytes, where: str) -> tuple[Any, list[str]]:
    from astropy.table import Table as AstropyTable

    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise TableError(f"{where}: not UTF-8 text; expected ECSV") from None
    return AstropyTable.read(text.splitlines(), format="ascii.ecsv"), []


def _votable(data: bytes, where: str) -> tuple[Any, list[str]]:
    from astropy.io import votable

    file = votable.parse(io.BytesIO(data), verify="ignore")
    tables = [table for table in file.iter_tables() if not table.is_empty()]
    if not tables:
        raise TableError(f"{where}: no table with rows in it")
    notes = [] if len(tables) == 1 else [f"the first of {len(tables)} tables was read"]
    rows = len(tables[0].array)  # `nrows` is an attribute of the file, which may lack it
    if rows > MOST_ROWS:
        raise TableError(f"{where}: {rows:,} rows; expected at most {MOST_ROWS:,}")
    return tables[0].to_table(use_names_over_ids=True), notes


def _fits(data: bytes, where: str) -> tuple[Any, list[str]]:
    from astropy.io import fits
    from astropy.table import Table as AstropyTable

    with fits.open(io.BytesIO(data), memmap=False, lazy_load_hdus=False, ignore_missing_simple=False) as units:
        tables = [unit for unit in units if isinstance(unit, fits.BinTableHDU | fits.TableHDU)]
        tables = [unit for unit in tables if not isinstance(unit, fits.CompImageHDU)]
        if not tables:
            raise TableError(f"{where}: a FITS file without a table")
        first = tables[0]
        rows, width = int(first.header["NAXIS2"]), int(first.header["NAXIS1"])
        if rows > MOST_ROWS:
            raise TableError(f"{where}: {rows:,} rows; expected at most {MOST_ROWS:,}")
        if rows * width > len(data):
            raise TableError(f"{where}: the file is cut short; its header promises {rows} rows of {width} bytes")
        notes = [] if len(tables) == 1 else [f"the first of {len(tables)} tables was read"]
        return AstropyTable.read(first), notes


def _from_astropy(source: Any, where: str, notes: list[str]) -> Read:
    if len(source.colnames) > MOST_COLUMNS:
        raise TableError(f"{where}: {len(source.colnames)} columns; expected at most {MOST_COLUMNS}")
    if len(source) > MOST_ROWS:
        raise TableError(f"{where}: {len(source):,} rows; expected at most {MOST_ROWS:,}")
    columns = []
    meta = {str(key): one_line(str(value), 200) for key, value in dict(source.meta).items() if isinstance(value, str)}
    for name in source.colnames:
        column = source[name]
        if type(column).__name__ == "SkyCoord":
            lon, lat, frame = _taken_apart(str(name), column)
            columns += [lon, lat]
            if frame:
                meta.setdefault("frame", frame)
            continue
        values = _plain(column)
        if values is None:
            notes.append(f"column '{one_line(str(name))}' was left out: its cells are arrays or objects")
            continue
        unit = "" if getattr(column, "unit", None) is None else str(column.unit)
        own = getattr(column, "meta", {}) or {}
        description = one_line(str(getattr(column, "description", "") or ""), 200)
        columns.append(Column(str(name), values, unit, str(own.get("ucd", "")), description))
    try:
        table = Table(tuple(columns), meta)
    except TableError as fault:
        raise TableError(f"{where}: {fault}") from None
    return Read(table, np.arange(1, len(table) + 1), (), tuple(notes))


def _taken_apart(name: str, column: Any) -> tuple[Column, Column, str]:
    """Return longitude and latitude of a column of astropy's coordinates, and their frame, empty if it has no name."""
    spherical = column.spherical
    words = {"galactic": "pos.galactic", "supergalactic": "pos.supergalactic"}.get(column.frame.name)
    ucds = (f"{words}.lon", f"{words}.lat") if words else ("pos.eq.ra", "pos.eq.dec")
    equinox: Any = getattr(column, "equinox", None)
    match column.frame.name:
        case "icrs" | "galactic" | "supergalactic":
            frame = column.frame.name
        case "fk5":
            frame = f"equator/mean/J{equinox.jyear:.10g}@iau1976"
        case "fk4":
            frame = f"equator/fk4/B{equinox.byear:.10g}"
        case _:
            frame, ucds = "", ("", "")
    lon, lat = (np.asarray(angle.deg, dtype=np.float64) for angle in (spherical.lon, spherical.lat))
    return Column(f"{name}.lon", lon, "deg", ucds[0]), Column(f"{name}.lat", lat, "deg", ucds[1]), frame


def _plain(column: Any) -> NDArray[Any] | None:
    """Return the cells as float64, int64, bool or text with missing ones as NaN or empty; None for arrays, objects."""
    data = getattr(column, "value", column)
    mask = np.asarray(getattr(column, "mask", False))
    array = np.asarray(getattr(data, "filled", lambda: data)()) if np.ma.isMaskedArray(data) else np.asarray(data)
    if array.ndim != 1:
        return None
    missing = bool(np.any(mask))
    kind = array.dtype.kind
    if kind == "b" and not missing:
        return array.astype(np.bool_)
    if kind in "iu" and not missing and (kind == "i" or array.dtype.itemsize < 8):
        return array.astype(np.int64)
    if kind in "iufb":
        numbers = array.astype(np.float64)
        if missing:
            numbers[np.broadcast_to(mask, numbers.shape)] = np.nan
        return numbers
    if kind == "S":
        array = np.char.decode(array, "utf-8", "replace")
    elif kind == "O":
        if not all(item is None or isinstance(item, str | bytes) for item in array):
            return None
        array = np.array([i.decode("utf-8", "replace") if isinstance(i, bytes) else i or "" for i in array], dtype=str)
    if array.dtype.kind != "U":
        return None
    text = np.char.strip(array.astype(np.str_))
    if missing:
        text[np.broadcast_to(mask, text.shape)] = ""
    return np.asarray(text)


def write_foreign(table: Table, form: str) -> bytes:
    """Return a table as the bytes of an `ecsv`, `votable` (1.4, text cells) or `fits` file."""
    from astropy.table import Column as AstropyColumn
    from astropy.table import Table as AstropyTable

    target = AstropyTable(meta={str(key): str(value) for key, value in table.meta.items()})
    for column in table:
        made = AstropyColumn(_sent(column.values, form), name=column.name, description=column.description or None)
        if column.unit:
            made.unit = column.unit
        if column.ucd:
            made.meta["ucd"] = column.ucd
        target.add_column(made)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # units that the format does not know are written as they stand
        if form == "ecsv":
            text = io.StringIO()
            target.write(text, format="ascii.ecsv", delimiter=",")
            return text.getvalue().encode()
        out = io.BytesIO()
        if form == "votable":
            return _votable_bytes(target, table, out)
        from astropy.io import fits

        unit = fits.table_to_hdu(AstropyTable(target, meta={}))
        for key, value in table.meta.items():
            for start in range(0, max(len(str(value)), 1), 60):
                unit.header.add_comment(_ascii(f"{key} = {str(value)[start : start + 60]}"))
        fits.HDUList([fits.PrimaryHDU(), unit]).writeto(out)
        return out.getvalue()


def _votable_bytes(target: Any, table: Table, out: io.BytesIO) -> bytes:
    from astropy.io.votable import from_table
    from astropy.io.votable.tree import Info

    file = from_table(target)
    first = file.get_first_table()
    for made, column in zip(first.fields, table, strict=True):
        if column.ucd:
            made.ucd = column.ucd
    for key, value in table.meta.items():
        first.infos.append(Info(name=str(key), value=str(value)))
    file.to_xml(out)
    return out.getvalue()


def _sent(values: NDArray[Any], form: str) -> NDArray[Any]:
    """Return what the format can hold: FITS and VOTable text cells are ASCII with escapes as needed."""
    if values.dtype.kind == "U" and form == "fits":
        return (
            np.array([_ascii(str(value)) for value in values], dtype="S") if len(values) else np.array([], dtype="S1")
        )
    return values


def _ascii(text: str) -> str:
    plain = text.replace("−", "-").replace("°", " deg").replace("′", "'").replace("″", '"')
    return plain.encode("ascii", "backslashreplace").decode()

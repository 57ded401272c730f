"""Write a table as CSV, ECSV, VOTable or FITS."""

from pathlib import Path

from colure.errors import TableError, near_names
from colure.files import atomic_write
from colure.tables.csvfile import write_csv
from colure.tables.foreign import write_foreign
from colure.tables.model import Table
from colure.tables.reading import FORMATS, form_of


def dumps(table: Table, form: str) -> bytes:
    """Return a table as the bytes of a file in one of `FORMATS`."""
    if form not in FORMATS:
        raise TableError(f"table format '{form}': unknown{near_names(form, FORMATS)}; expected {', '.join(FORMATS)}")
    return write_csv(table) if form == "csv" else write_foreign(table, form)


def write(table: Table, path: Path | str, form: str | None = None) -> None:
    """Write a table to a file, whole or not at all; the format is that of its ending unless named."""
    chosen = form or form_of(path)
    if chosen is None:
        raise TableError(f"table '{path}': its ending names no format; expected .csv, .ecsv, .vot, .xml or .fits")
    atomic_write(path, dumps(table, chosen))

"""Read a table file of any of the four formats, told by its content and bounded in size."""

from pathlib import Path

from colure.errors import TableError
from colure.files import FileError, read_bounded
from colure.tables.csvfile import read_csv
from colure.tables.foreign import read_foreign
from colure.tables.model import Read, settle

FORMATS = ("csv", "ecsv", "votable", "fits")
MOST_BYTES = 512_000_000
"""The largest table file that is read."""

_ENDINGS = {
    ".csv": "csv",
    ".tsv": "csv",
    ".txt": "csv",
    ".ecsv": "ecsv",
    ".vot": "votable",
    ".votable": "votable",
    ".xml": "votable",
    ".fits": "fits",
    ".fit": "fits",
    ".fts": "fits",
}
_PACKED = {b"\x1f\x8b": "gzip", b"BZh": "bzip2", b"PK\x03\x04": "zip", b"\xfd7zXZ": "xz"}


def form_of(path: Path | str) -> str | None:
    """Return the format that a file's ending stands for, or None."""
    return _ENDINGS.get(Path(path).suffix.casefold())


def _sniff(data: bytes, where: str) -> str:
    """Return the format that the first bytes show; anything that is none of the others is taken for CSV."""
    for magic, name in _PACKED.items():
        if data.startswith(magic):
            raise TableError(f"{where}: compressed by {name}; unpack it first")
    start = data[:2000].lstrip(b"\xef\xbb\xbf \t\r\n")
    if data.startswith(b"SIMPLE  ="):
        return "fits"
    if start.startswith(b"# %ECSV"):
        return "ecsv"
    if start.startswith(b"<") or data[:2] in (b"\xff\xfe", b"\xfe\xff"):
        return "votable"
    return "csv"


def read_bytes(data: bytes, where: str = "table", *, skip_bad: bool = False) -> Read:
    """Return the table in the bytes of a file; see `read`."""
    if not data.strip():
        raise TableError(f"{where}: empty; expected a table in CSV, ECSV, VOTable or FITS")
    form = _sniff(data, where)
    found = read_csv(data, where) if form == "csv" else read_foreign(data, form, where)
    return settle(found, where, skip_bad)


def read(path: Path | str, *, skip_bad: bool = False, limit: int = MOST_BYTES) -> Read:
    """Return the table of a file of at most `limit` bytes, its format told by its content.

    Raises TableError in one line: what is wrong, in which file and row, and what was expected. With `skip_bad` the
    rows that cannot be read are left out and listed in the answer.
    """
    where = f"table '{path}'"
    try:
        data = read_bounded(path, limit)
    except FileError as fault:
        raise TableError(f"table {str(fault).removeprefix('file ')}") from None
    return read_bytes(data, where, skip_bad=skip_bad)

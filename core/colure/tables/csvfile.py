"""Read CSV: one header line, any of the usual delimiters, comments, quotes; sizes are bounded, bad rows are listed."""

import contextlib
import csv
import io
import re
from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure.errors import TableError
from colure.tables.model import Column, Read, Rejected, Table
from colure.wording import one_line

MOST_ROWS = 5_000_000
MOST_COLUMNS = 1000
LONGEST_CELL = 10_000

_MISSING = frozenset(("", "nan", "null", "none", "--", "n/a", "na"))
_UNIT = re.compile(r"(?P<name>.*?\S)\s*[\[(](?P<unit>[^\])]*)[\])]\Z")
_REMARK = re.compile(r"#\s*(?P<key>[A-Za-z_][\w .-]{0,60}?)\s*[=:]\s*(?P<value>.*)")
_WHOLE = re.compile(r"[+-]?(0|[1-9]\d{0,18})\Z", re.ASCII)


def read_csv(data: bytes, where: str) -> Read:
    """Return the table in the bytes of a CSV file; `where` names it in errors.

    The first line that is no comment (`#`) holds the names, with a unit in brackets where there is one:
    `ra [deg]`. Empty cells are missing. A row of another number of cells is refused and listed.
    """
    text = _text(data, where)
    remarks: dict[str, str] = {}
    lines = _lines(text, remarks)
    header = next(lines, None)
    if header is None:
        raise TableError(f"{where}: empty; expected a header line and rows")
    delimiter = _delimiter(header)
    csv.field_size_limit(LONGEST_CELL)
    names = _cells(header, delimiter, where)
    if len(names) > MOST_COLUMNS:
        raise TableError(f"{where}: {len(names)} columns; expected at most {MOST_COLUMNS}")
    if all(_number(name) for name in names):
        raise TableError(f"{where}: the first line has only numbers; expected a header line with the columns' names")
    heads = [_head(name.strip(), i) for i, name in enumerate(names)]
    good, numbers, rejected = _body(lines, delimiter, len(names), where)
    cells: list[Any] = list(zip(*good, strict=True)) if good else [()] * len(names)
    columns = tuple(Column(name, typed(list(column)), unit) for (name, unit), column in zip(heads, cells, strict=True))
    try:
        table = Table(columns, remarks)
    except TableError as fault:
        raise TableError(f"{where}: {fault}") from None
    return Read(table, np.array(numbers, dtype=np.int64), tuple(rejected))


def _text(data: bytes, where: str) -> str:
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as fault:
        line = data[: fault.start].count(b"\n") + 1
        raise TableError(
            f"{where}: line {line} is not UTF-8 text; expected a table in CSV, ECSV, VOTable or FITS"
        ) from None
    if "\x00" in text:
        raise TableError(f"{where}: holds null characters; expected a table in CSV, ECSV, VOTable or FITS")
    return text


def _lines(text: str, remarks: dict[str, str]) -> Iterator[str]:
    """Give the lines that are no comment, and keep the remarks of those before the header."""
    began = False
    for line in io.StringIO(text, newline=""):
        if not began:
            if line.startswith("#"):
                if found := _REMARK.match(line.strip()):
                    remarks[found["key"]] = found["value"].strip()
                continue
            if not line.strip():
                continue
            began = True
        elif line.startswith("#"):
            continue
        yield line


def _delimiter(header: str) -> str:
    counts = {mark: header.count(mark) for mark in (",", "\t", ";", "|")}
    best = max(counts, key=lambda mark: counts[mark])
    return best if counts[best] else ","


def _cells(line: str, delimiter: str, where: str) -> list[str]:
    try:
        return next(csv.reader([line], delimiter=delimiter, skipinitialspace=True))
    except csv.Error as fault:
        raise TableError(f"{where}: header line: {fault}") from None


def _head(text: str, index: int) -> tuple[str, str]:
    """Return the name and unit of a column; a column without a name gets its number."""
    found = _UNIT.match(text)
    name, unit = (found["name"], found["unit"].strip()) if found else (text, "")
    return name or f"column{index + 1}", unit


def _body(
    lines: Iterator[str], delimiter: str, width: int, where: str
) -> tuple[list[list[str]], list[int], list[Rejected]]:
    reader = csv.reader(lines, delimiter=delimiter, skipinitialspace=True)
    good: list[list[str]] = []
    numbers: list[int] = []
    rejected: list[Rejected] = []
    number = 0
    while True:
        try:
            row = next(reader, None)
        except csv.Error as fault:
            number += 1
            rejected.append(Rejected(number, f"{fault}"))
            continue
        if row is None:
            return good, numbers, rejected
        if not row or (len(row) == 1 and not row[0].strip() and width > 1):
            continue  # a blank line
        number += 1
        if number > MOST_ROWS:
            raise TableError(f"{where}: more than {MOST_ROWS:,} rows; expected at most that many")
        if len(row) == width:
            good.append(row)
            numbers.append(number)
        else:
            rejected.append(Rejected(number, f"{len(row)} cells; the header has {width}"))


def _number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def typed(cells: list[str]) -> NDArray[Any]:
    """Return text cells as int64 if all are whole numbers, float64 if all are numbers or missing, else text.

    Whole numbers with leading zeros or beyond 64 bits are taken for names and stay text, and so do those of more than
    15 digits in a column that has missing cells, as a float would change them.
    """
    stripped = [cell.strip() for cell in cells]
    if stripped and all(_WHOLE.match(cell) for cell in stripped):
        with contextlib.suppress(OverflowError):
            return np.array([int(cell) for cell in stripped], dtype=np.int64)
    # A name such as 007 makes its whole column text; 1_000, which Python would take for a number, too.
    if stripped and not any(_is_name(cell) for cell in stripped):
        filled = ["nan" if cell.casefold() in _MISSING else cell for cell in stripped]
        try:
            return np.array(filled, dtype=np.float64)
        except ValueError:
            pass
    return np.array(stripped, dtype=np.str_)


def _is_name(cell: str) -> bool:
    digits = cell.lstrip("+-")
    return "_" in cell or (len(digits) > 1 and digits.isdigit() and (digits[0] == "0" or len(digits) > 15))


def write_csv(table: Table) -> bytes:
    """Return a table as CSV in UTF-8: remarks as comments, a header, floats in full, missing cells empty."""
    out = io.StringIO(newline="")
    for key, value in table.meta.items():
        out.write(f"# {one_line(str(key), 60)} = {one_line(str(value), 2000)}\r\n".replace("\r\n", "\n"))
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([column.name for column in table])
    writer.writerows(zip(*(_written(column.values) for column in table), strict=True))
    return out.getvalue().encode()


def _written(values: NDArray[Any]) -> list[Any]:
    if values.dtype.kind == "f":
        return ["" if value != value else repr(value) for value in values.astype(np.float64).tolist()]
    if values.dtype.kind == "b":
        return ["true" if value else "false" for value in values.tolist()]
    listed: list[Any] = values.tolist()
    return listed

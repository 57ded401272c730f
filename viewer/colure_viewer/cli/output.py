"""What a command prints: records as text, JSON, CSV, ECSV or VOTable, on the screen or in a file."""

import json
import math
import sys
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, TypeVar

import click
import numpy as np

FORMATS = ("text", "json", "csv", "ecsv", "votable")
Record = Mapping[str, Any]
Function = TypeVar("Function", bound=Callable[..., Any])

UNITS = {
    "_deg": "deg",
    "_arcsec_h": "arcsec/h",
    "_arcsec": "arcsec",
    "_au": "au",
    "_jd": "d",
    "_s": "s",
    "magnitude": "mag",
}
"""The unit of a column, by the end of its name; longer ends stand first."""


def output_options(function: Function) -> Function:
    """Add `--format` and `-o` to a command."""
    function = click.option(
        "-o", "--output", type=click.Path(dir_okay=False, path_type=Path), help="Write to a file instead of the screen."
    )(function)
    return click.option(
        "--format", "form", type=click.Choice(FORMATS), default="text", show_default=True, help="How to print."
    )(function)


def plain(value: Any) -> Any:
    """Return a value fit for JSON: numpy scalars unwrapped, arrays as lists, NaN and infinities as None."""
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): plain(one) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [plain(one) for one in value]
    return value


@dataclass(frozen=True, slots=True)
class Answer:
    """What a command found: records for machines, and a function that words them for people."""

    records: Sequence[Record]
    text: Callable[[], str]

    def emit(self, form: str, output: Path | None) -> None:
        """Print in one of FORMATS, or write to a file whole or not at all."""
        if form == "text":
            body = self.text().encode()
        elif form == "json":
            body = json.dumps(plain(list(self.records)), ensure_ascii=False, indent=1).encode()
        else:
            body = _as_table(self.records, form)
        if not body.endswith(b"\n"):
            body += b"\n"
        if output is None:
            sys.stdout.flush()
            sys.stdout.buffer.write(body)
            sys.stdout.buffer.flush()
        else:
            from colure.files import atomic_write

            atomic_write(output, body)


def _as_table(records: Sequence[Record], form: str) -> bytes:
    from colure.tables import Column, Table, dumps

    names = list(dict.fromkeys(name for record in records for name in record))
    columns = []
    for name in names:
        values = [plain(record.get(name)) for record in records]
        filled: Any
        if all(value is None or (isinstance(value, int | float) and not isinstance(value, bool)) for value in values):
            if values and all(isinstance(value, int) for value in values):
                filled = np.array(values, dtype=np.int64)
            else:
                filled = np.array([np.nan if value is None else float(value) for value in values])
        else:
            filled = np.array(["" if value is None else _cell(value) for value in values])
        unit = next((unit for end, unit in UNITS.items() if name.endswith(end)), "")
        columns.append(Column(name, filled, unit=unit))
    return dumps(Table(tuple(columns)), form)


def _cell(value: Any) -> str:
    return value if isinstance(value, str) else json.dumps(value, ensure_ascii=False)


def aligned(header: Sequence[str], rows: Sequence[Sequence[str]], left: Sequence[int] = (0,)) -> str:
    """Return a table in fixed columns; those listed in `left` are set left, the others right."""
    widths = [max([len(title), *(len(row[at]) for row in rows)]) for at, title in enumerate(header)]

    def line(cells: Sequence[str]) -> str:
        set_out = [
            cell.ljust(width) if at in left else cell.rjust(width)
            for at, (cell, width) in enumerate(zip(cells, widths, strict=True))
        ]
        return "  ".join(set_out).rstrip()

    return "\n".join([line(header), *(line(row) for row in rows)])


def pairs(rows: Sequence[tuple[str, str]]) -> str:
    """Return names and values, one pair a line."""
    width = max(len(name) for name, _ in rows)
    return "\n".join(f"{name.ljust(width)}  {value}" for name, value in rows)


def moment_keys(moment: Any) -> dict[str, Any]:
    """Return the keys that every dated record carries; `utc` is None where UTC does not reach."""
    return {
        "utc": moment.isot("UTC") if bool(np.all(moment.has_utc)) else None,
        "tt_jd": float(moment.jd_tt),
        "ut1_jd": float(moment.ut1[0]) + float(moment.ut1[1]),
        "delta_t_s": float(moment.delta_t_s),
        "calendar": str(moment.calendar_used),
    }

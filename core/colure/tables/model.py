"""A table as columns of numpy arrays with units, and the rows of a file that were refused."""

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure.arrays import Bool, Int
from colure.errors import TableError, near_names
from colure.wording import one_line


@dataclass(frozen=True, slots=True, eq=False)
class Column:
    """A named column (rows,) of float64, int64, bool or text; NaN and the empty text stand for what is missing."""

    name: str
    values: NDArray[Any]
    unit: str = ""
    ucd: str = ""
    description: str = ""

    @property
    def is_text(self) -> bool:
        """Whether the column holds text."""
        return self.values.dtype.kind == "U"


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """Columns of one length with different names, and remarks about the whole table."""

    columns: tuple[Column, ...]
    meta: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        """Check lengths and names."""
        lengths = {len(column.values) for column in self.columns}
        if len(lengths) > 1:
            raise TableError(f"table: columns of {sorted(lengths)} rows; expected one length")
        seen: set[str] = set()
        for column in self.columns:
            if column.name in seen:
                raise TableError(f"table: two columns are named '{one_line(column.name)}'")
            seen.add(column.name)

    def __len__(self) -> int:
        return len(self.columns[0].values) if self.columns else 0

    def __iter__(self) -> Iterator[Column]:
        return iter(self.columns)

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the columns in order."""
        return tuple(column.name for column in self.columns)

    def find(self, name: str) -> Column | None:
        """Return the column of a name, exact or else in any case, or None."""
        for column in self.columns:
            if column.name == name:
                return column
        folded = [column for column in self.columns if column.name.casefold() == name.casefold()]
        return folded[0] if len(folded) == 1 else None

    def column(self, name: str) -> Column:
        """Return the column of a name; TableError suggests near ones."""
        found = self.find(name)
        if found is None:
            known = ", ".join(one_line(known, 30) for known in self.names[:12])
            more = f" and {len(self.names) - 12} more" if len(self.names) > 12 else ""
            raise TableError(
                f"column '{one_line(name)}': not in the table{near_names(name, self.names)}; it has {known}{more}"
            )
        return found

    def take(self, rows: Bool | Int) -> "Table":
        """Return the rows of a mask or of indices."""
        return replace(self, columns=tuple(replace(c, values=c.values[rows]) for c in self.columns))

    def with_columns(
        self, added: Mapping[str, tuple[NDArray[Any], str]], *, meta: Mapping[str, str] | None = None
    ) -> "Table":
        """Return the table with more columns, given as name → (values, unit), and more remarks.

        A column that already had such a name stays, as `from_` and its name.
        """
        taken = {*self.names, *added}
        old = []
        for column in self.columns:
            name = column.name
            while name in added or (name != column.name and name in taken):
                name = f"from_{name}"
            taken.add(name)
            old.append(replace(column, name=name))
        new = [Column(name, np.asarray(values), unit) for name, (values, unit) in added.items()]
        return Table((*old, *new), {**self.meta, **(meta or {})})


@dataclass(frozen=True, slots=True)
class Rejected:
    """One row that cannot be used: its number, from 1 after the header, and why."""

    row: int
    reason: str

    def __str__(self) -> str:
        return f"row {self.row}: {self.reason}"


@dataclass(frozen=True, slots=True, eq=False)
class Read:
    """A table as read: its good rows, the number in the file of each (rows,), and the rows that were refused."""

    table: Table
    rows: Int
    rejected: tuple[Rejected, ...] = ()
    notes: tuple[str, ...] = ()


def screen(read: Read, faults: Sequence[tuple[Bool, Callable[[int], str]]]) -> Read:
    """Return what is left after refusing rows: pairs of a mask (rows,) and a function from the index to the reason.

    A row is refused for the first reason that holds; what is left keeps the file's row numbers.
    """
    bad = np.zeros(len(read.table), dtype=bool)
    reasons: list[Rejected] = list(read.rejected)
    for mask, reason in faults:
        for index in np.flatnonzero(mask & ~bad):
            reasons.append(Rejected(int(read.rows[index]), reason(int(index))))
        bad |= mask
    if not bad.any():
        return read
    reasons.sort(key=lambda rejected: rejected.row)
    return Read(read.table.take(~bad), read.rows[~bad], tuple(reasons), read.notes)


def settle(read: Read, where: str, skip_bad: bool) -> Read:
    """Return the table if it may be used; raise TableError for refused rows, unless skipped, and for none left."""
    refused = read.rejected
    total = len(read.table) + len(refused)
    if refused and not (skip_bad and len(read.table)):
        listed = "; ".join(str(rejected) for rejected in refused[:3])
        more = f"; and {len(refused) - 3} more" if len(refused) > 3 else ""
        advice = "" if skip_bad else ("; the good rows can be taken with --skip-bad" if len(read.table) else "")
        raise TableError(f"{where}: {len(refused)} of {total} rows cannot be used: {listed}{more}{advice}")
    if not len(read.table):
        raise TableError(f"{where}: no rows; expected at least one below the header")
    return read

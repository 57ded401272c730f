"""Published check values: reads a topic's CSV and runs each row through the project's public functions.

A topic's test module holds one function per kind of row and calls `verify`. Rows that are not run are listed by id
with a reason; at most 5 % of a topic may be, rows whose note begins with DISAGREEMENT or SLIP aside.
"""

import csv
import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

HERE = Path(__file__).parent
UNRUN_LIMIT = 0.05


@dataclass(frozen=True)
class Row:
    """One published fact. `expected` is a number, a word or a list; `tolerance` is a number in `unit`."""

    id: str
    quantity: str
    inputs: dict[str, str]
    expected: Any
    unit: str
    tolerance: float
    source: str
    how_obtained: str
    note: str

    def number(self, key: str) -> float:
        return float(self.inputs[key])

    @property
    def is_doubtful(self) -> bool:
        return self.note.startswith(("DISAGREEMENT", "SLIP"))


def _parse(text: str) -> Any:
    try:
        return json.loads(text)
    except json.JSONDecodeError:
        return text


def load(topic: str) -> list[Row]:
    with (HERE / f"{topic}.csv").open(encoding="utf-8", newline="") as file:
        rows = []
        for raw in csv.DictReader(file):
            pairs = (part.split("=", 1) for part in raw["inputs"].split(";") if "=" in part)
            rows.append(
                Row(
                    id=raw["id"],
                    quantity=raw["quantity"],
                    inputs={key.strip(): value.strip() for key, value in pairs},
                    expected=_parse(raw["expected"]),
                    unit=raw["unit"],
                    tolerance=float(raw["tolerance"] or 0.0),
                    source=raw["source"],
                    how_obtained=raw["how_obtained"],
                    note=raw["note"],
                )
            )
    ids = [row.id for row in rows]
    assert len(ids) == len(set(ids)), f"{topic}: an id stands twice"
    return rows


def runnable(topic: str, unrun: Mapping[str, str]) -> list[Row]:
    """Return the rows to run; fail if `unrun` names no row, gives no reason or leaves out too many."""
    rows = load(topic)
    unknown = set(unrun) - {row.id for row in rows}
    assert not unknown, f"{topic}: unrun ids that are in no row: {sorted(unknown)}"
    assert all(unrun.values()), f"{topic}: an unrun row without a reason"
    sound = [row for row in rows if not row.is_doubtful]
    left_out = [row for row in sound if row.id in unrun]
    assert len(left_out) <= UNRUN_LIMIT * len(sound), f"{topic}: {len(left_out)} of {len(sound)} rows unrun"
    return [row for row in rows if row.id not in unrun]


def verify(row: Row, compute: Callable[[Row], Any]) -> None:
    """Assert that `compute(row)` meets the published value within its tolerance."""
    got = compute(row)
    if isinstance(row.expected, str):
        assert got == row.expected, f"{row.id}: got {got!r}, published {row.expected!r} ({row.source})"
        return
    expected = row.expected if isinstance(row.expected, list) else [row.expected]
    values = list(got) if hasattr(got, "__len__") else [got]
    assert len(values) == len(expected), f"{row.id}: {len(values)} values, published {len(expected)}"
    for value, want in zip(values, expected, strict=True):
        off = float(value) - float(want)
        if row.unit == "deg" and abs(abs(off) - 360.0) < 1.0:
            off -= 360.0 if off > 0 else -360.0
        assert abs(off) <= row.tolerance * (1 + 1e-12), (
            f"{row.id}: got {value!r}, published {want!r} {row.unit}, off by {off:.3g}, "
            f"tolerance {row.tolerance:g} ({row.source})"
        )

"""Published values: FK4, its E-terms and its precession."""

import pytest
from frame_rows import compute
from harness import Row, runnable, verify

UNRUN: dict[str, str] = {}


@pytest.mark.parametrize("row", runnable("fk4_b1950", UNRUN), ids=lambda row: row.id)
def test_published_value(row: Row) -> None:
    verify(row, compute)

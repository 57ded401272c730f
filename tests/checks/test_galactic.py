"""Published values: galactic coordinates."""

import pytest
from frame_rows import compute
from harness import Row, runnable, verify

UNRUN: dict[str, str] = {}


@pytest.mark.parametrize("row", runnable("galactic", UNRUN), ids=lambda row: row.id)
def test_published_value(row: Row) -> None:
    verify(row, compute)

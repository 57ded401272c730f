"""Published values: obliquity and nutation."""

import pytest
from frame_rows import compute
from harness import Row, runnable, verify

UNRUN: dict[str, str] = {
    "laskar_min": "the polynomial is refused beyond the year 12000, where its author ends it; the row asks for 12030",
}


@pytest.mark.parametrize("row", runnable("nutation_obliquity", UNRUN), ids=lambda row: row.id)
def test_published_value(row: Row) -> None:
    verify(row, compute)

import pytest
import sky_rows
from harness import Row, runnable, verify

UNRUN: dict[str, str] = {}


@pytest.mark.parametrize("row", runnable("solar_system_positions", UNRUN), ids=lambda row: row.id)
def test_solar_system_positions(row: Row) -> None:
    verify(row, sky_rows.compute)

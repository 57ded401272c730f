import pytest
import sky_rows
from harness import Row, runnable, verify

UNRUN = {
    "sun-ck-20091026-el": "the Sun is 17° below the horizon: Horizons adds 39′ of refraction there, Colure lets it fade"
}


@pytest.mark.parametrize("row", runnable("horizons_tables", UNRUN), ids=lambda row: row.id)
def test_horizons_tables(row: Row) -> None:
    verify(row, sky_rows.compute)

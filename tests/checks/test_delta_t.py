"""Published values of ΔT: the splines of 2016 and 2020, the parabola, the canon's polynomials, older tables.

Sources stand beside each row in delta_t.csv. What Colure itself uses is Table S15.2020; older tables are met within
their own errors, and where the table of 2020 moves a figure by more than that, its figure stands in the row.
"""

from typing import Any

import pytest
from harness import Row, runnable, verify

from colure import deltat, deltat_models
from colure.moment import Moment

_OLD = "superseded telescopic value; Table S15.2020 differs by more than its printed precision, as the row's note says"
UNRUN: dict[str, str] = {
    "meeus10_2": "parabola of 1984; Table S15.2020 gives 7165 s, 1019 s more",
    **{f"meeus10A_{year}": _OLD for year in (1780, 1800, 1850, 1870, 1900, 1950)},
}


def _used(row: Row) -> float:
    """ΔT as used, on the tidal acceleration of Table S15: the older tables have about the same."""
    if "date" in row.inputs:
        year = float(Moment.parse(row.inputs["date"]).julian_year)
    else:
        year = row.number("year")
    return float(deltat.delta_t(year, deltat.TIDAL["table"]))


def _by(model: str) -> Any:
    def compute(row: Row) -> float:
        return float(deltat_models.delta_t(float(row.inputs.get("decimal_year") or row.inputs["year"]), model))

    return compute


MODELS = {
    "em2006": "espenak-meeus-2006",
    "s15_2020": "s15-2020",
    "s15_2016": "s15-2016",
    "smh_parabola": "parabola-2016",
    "lod_integral": "lod-2021",
}


def _kind(row: Row) -> Any:
    if row.id == "em_join_500":
        return lambda _: float(deltat_models.delta_t(-500.0, "espenak-meeus-2006"))
    if row.quantity == "Delta T, cubic spline":
        return _by("s15-2020")
    model = MODELS.get(row.id.rsplit("_", 1)[0])
    return _by(model) if model else _used


@pytest.mark.parametrize("row", runnable("delta_t", UNRUN), ids=lambda row: row.id)
def test_delta_t(row: Row) -> None:
    verify(row, _kind(row))

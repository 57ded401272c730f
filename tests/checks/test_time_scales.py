"""Published time-scale values: leap seconds, epochs, TT−UTC, TDB−TT, ΔT from UT1−UTC.

Sources stand beside each row in time_scales.csv. Rows of UTC before 1972 are not copied: there UTC had drift and
fractional steps, and Colure uses UT1 instead.
"""

from typing import Any

import pytest
from harness import Row, runnable, verify

from colure import calendars, tdb
from colure.moment import Moment

UNRUN: dict[str, str] = {}


def _tt_minus_utc(text: str) -> float:
    moment = Moment.parse(text.replace("T", " ") + " UTC")
    (utc1, utc2), (tt1, tt2) = moment.utc, moment.tt
    return float((tt1 - utc1) + (tt2 - utc2)) * 86400.0


def _leap(row: Row) -> float:
    """TAI−UTC on the day; one second before it, it was one less (the first row starts the series)."""
    text = row.inputs["utc"]
    after = _tt_minus_utc(text) - 32.184
    if not text.startswith("1972-01-01"):
        moment = Moment.parse(text.replace("T", " ") + " UTC").shifted(-1.0 / 86400.0)
        assert moment.isot("UTC", 0).endswith("23:59:60"), f"{row.id}: no leap second before {text}"
    return round(after, 6)


def _epoch(row: Row) -> float:
    return Moment.parse(row.inputs["epoch"]).jd_tt


def _besselian(row: Row) -> float:
    return calendars.besselian_year(row.number("mjd") + 2400000.5)


def _tdb(row: Row) -> float:
    moment = Moment.from_jd(row.number("jd_tt"))
    (tdb1, tdb2), (tt1, tt2) = moment.tdb, moment.tt
    value = ((tdb1 - tt1) + (tdb2 - tt2)) * 86400.0
    assert value == pytest.approx(tdb.tdb_minus_tt(*moment.tt), abs=1e-10)
    return float(value)


def _tt_fraction(row: Row) -> float:
    return float(Moment.parse(row.inputs["utc"].replace("T", " ") + " UTC").tt2)


def _delta_t(row: Row) -> float:
    """TT−UTC − (UT1−UTC) with the UT1−UTC of the row; the shipped table (C04 of 2020) is within 10 µs of it."""
    value = _tt_minus_utc(row.inputs["utc"]) - row.number("ut1_utc")
    assert Moment.parse(row.inputs["utc"] + "Z").delta_t_s == pytest.approx(value, abs=1e-5)
    return value


KINDS: dict[str, Any] = {
    "leap": _leap,
    "j2000": lambda row: _tt_minus_utc(row.inputs["utc"]),
    "b1950": _epoch,
    "j2050": _epoch,
    "b1900": _epoch,
    "pal": _besselian,
    "novas": _tdb,
    "sofa": _tt_fraction,
    "deltat": _delta_t,
}


@pytest.mark.parametrize("row", runnable("time_scales", UNRUN), ids=lambda row: row.id)
def test_time_scales(row: Row) -> None:
    verify(row, KINDS[row.id.split("_")[0]])

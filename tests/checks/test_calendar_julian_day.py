"""Published calendar values: Julian dates, both calendars, changeovers, weekdays, days of the year, Easter.

Sources stand beside each row in calendar_julian_day.csv.
"""

import re
from typing import Any

import pytest
from harness import Row, runnable, verify

from colure import calendars

UNRUN: dict[str, str] = {}


def _calendar(row: Row) -> str:
    return row.inputs["calendar"].removeprefix("proleptic ").casefold()


def _jd(row: Row) -> float:
    return float(calendars.jd_from_date(row.number("year"), row.number("month"), row.number("day"), _calendar(row)))


def _cutover(row: Row) -> float:
    start = row.inputs["gregorian_from"]
    date = row.number("year"), row.number("month"), row.number("day")
    if start.startswith("none"):
        return float(calendars.jd_from_date(*date, "gregorian"))
    year, month, day = (int(part) for part in re.findall(r"\d+", start))
    changeover = int(calendars.day_number(year, month, day, "gregorian"))
    return float(calendars.jd_from_date(*date, "mixed", changeover=changeover))


def _epoch(row: Row) -> float:
    year, month, day, hour, minute = (int(part) for part in re.findall(r"\d+", row.inputs["date"])[:5])
    return float(calendars.jd_from_date(year, month, day + (hour + minute / 60.0) / 24.0, "gregorian"))


def _jd0(row: Row) -> str:
    year, month, day = calendars.calendar_date(int(row.number("jd")), "gregorian")
    return f"{calendars.year_text(int(year))}-{month:02d}-{day:02d} 12:00"


def _number(text: str) -> int:
    return int(calendars.day_number(*(int(part) for part in text.split("-")), "mixed"))


def _plus(row: Row) -> str:
    year, month, day = calendars.calendar_date(_number(row.inputs["from"]) + int(row.number("days")))
    return f"{year}-{month:02d}-{day:02d}"


def _easter(row: Row) -> str:
    month, day = calendars.easter(int(row.number("year")))
    return f"{month:02d}-{day:02d}"


KINDS: dict[str, Any] = {
    "meeus7": _jd,
    "prolepG": _jd,
    "prolepJ": _jd,
    "cutover": _cutover,
    "epoch": _epoch,
    "jd0": _jd0,
    "plus10000": _plus,
    "weekday": lambda row: calendars.WEEKDAYS[int(calendars.weekday(_number(row.inputs["date"])))],
    "doy": lambda row: float(
        calendars.day_of_year(row.number("year"), row.number("month"), row.number("day"), _calendar(row))
    ),
    "leapyear": lambda row: str(bool(calendars.is_leap(int(row.number("year")), _calendar(row)))),
    "easter": _easter,
}


@pytest.mark.parametrize("row", runnable("calendar_julian_day", UNRUN), ids=lambda row: row.id)
def test_calendar_julian_day(row: Row) -> None:
    verify(row, KINDS[row.id.split("_")[0]])

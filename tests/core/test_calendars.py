"""Calendars: exact both ways over ten thousand years, and impossible dates refused with the reason."""

import datetime

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from colure import calendars
from colure.errors import MomentError


@pytest.mark.parametrize("calendar", calendars.CALENDARS)
def test_every_day_number_comes_back(calendar: str) -> None:
    numbers = np.arange(-200_000, 3_800_000)  # −5260 to 5692
    year, month, day = calendars.calendar_date(numbers, calendar)
    assert np.array_equal(calendars.day_number(year, month, day, calendar), numbers)
    assert np.all(np.diff(year * 10000 + month * 100 + day) > 0)


@given(st.dates())
def test_gregorian_dates_agree_with_the_standard_library(date: datetime.date) -> None:
    number = int(calendars.day_number(date.year, date.month, date.day, "gregorian"))
    assert number == date.toordinal() + 1721425
    assert int(calendars.weekday(number)) == date.weekday()
    assert calendars.day_of_year(date.year, date.month, date.day, "gregorian") == date.timetuple().tm_yday


@given(st.integers(-(10**8), 10**8), st.sampled_from(["julian", "gregorian"]))
def test_day_numbers_come_back_far_out(number: int, calendar: str) -> None:
    date = calendars.calendar_date(number, calendar)
    assert calendars.day_number(*date, calendar) == number


def test_changeover_has_no_gap_in_days() -> None:
    assert calendars.day_number(1582, 10, 15) - calendars.day_number(1582, 10, 4) == 1
    # Britain: Wednesday 2 September 1752 was followed by Thursday 14 September.
    start = int(calendars.day_number(1752, 9, 14, "gregorian"))
    assert calendars.day_number(1752, 9, 2, "mixed", changeover=start) == start - 1
    with pytest.raises(MomentError, match=r"1752-09-02 \(Julian\) was followed by 1752-09-14 \(Gregorian\)"):
        calendars.day_number(1752, 9, 7, "mixed", changeover=start)


@pytest.mark.parametrize(
    ("date", "calendar", "reason"),
    [
        ((1582, 10, 10), "mixed", "does not exist"),
        ((1582, 10, 5), "mixed", "name the calendar"),
        ((2026, 2, 29), "mixed", "28 days in the Gregorian"),
        ((1900, 2, 29), "gregorian", "no such day"),
        ((-5, 2, 29), "julian", "28 days in the Julian"),
        ((2026, 13, 1), "mixed", "expected 1 to 12"),
        ((2026, 4, 31), "mixed", "30 days"),
        ((2026, 4, 0), "mixed", "no such day"),
        ((10**12, 1, 1), "mixed", "beyond"),
        ((float("nan"), 1, 1), "mixed", "whole number"),
        ((2026.5, 1, 1), "mixed", "whole number"),
    ],
)
def test_impossible_dates_say_why(date: tuple[int, int, int], calendar: str, reason: str) -> None:
    with pytest.raises(MomentError, match=reason):
        calendars.day_number(*date, calendar)


def test_one_bad_date_of_many_is_named() -> None:
    with pytest.raises(MomentError, match="2023-02-29"):
        calendars.day_number([2024, 2023], 2, 29)


def test_nearest_day_clips() -> None:
    assert calendars.nearest_day(2026, 2, 31) == calendars.day_number(2026, 2, 28)
    assert calendars.nearest_day(1582, 10, 10) == calendars.CHANGEOVER


def test_epochs() -> None:
    assert calendars.julian_epoch(2000.0) == 2451545.0
    assert calendars.besselian_year(calendars.besselian_epoch(1875.0)) == pytest.approx(1875.0, abs=1e-9)
    with pytest.raises(MomentError):
        calendars.easter(1500)

"""Turn Julian and Gregorian calendar dates into Julian day numbers and back, for arrays and for years before 1.

Years are astronomical: 0 is 1 BC, −1 is 2 BC. A *mixed* calendar is Julian up to a changeover and Gregorian from it
on, as almanacs print dates; the changeover is 1582-10-15 unless another is given (countries changed at their own
dates). A day number is the integer Julian day that begins at noon of the civil day, so a civil day starts at
`number − 0.5`. The arithmetic is whole-number floor division, exact for every year that fits 64 bits.
"""

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colure.arrays import Bool, Float, Int
from colure.errors import MomentError

CALENDARS = ("mixed", "julian", "gregorian")
CHANGEOVER = 2299161
"""Day number of 1582-10-15, the first day of the Gregorian calendar; 1582-10-04 was the day before."""
WEEKDAYS = ("Monday", "Tuesday", "Wednesday", "Thursday", "Friday", "Saturday", "Sunday")
YEAR_LIMIT = 10**9
"""Years beyond this are refused before they can overflow the day count."""

_LENGTHS = np.array([31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])


def _whole(what: str, value: ArrayLike) -> Int:
    """Return integers, or raise MomentError for NaN, fractions and years that would overflow."""
    array = np.asarray(value)
    if array.dtype.kind not in "iu":
        numbers = np.asarray(value, dtype=np.float64)
        bad = ~np.isfinite(numbers) | (numbers != np.floor(numbers))
        if np.any(bad):
            raise MomentError(f"{what} {numbers[bad].flat[0]:g}: expected a whole number")
        array = numbers
    if np.any(np.abs(array) > YEAR_LIMIT):
        raise MomentError(f"{what} {array[np.abs(array) > YEAR_LIMIT].flat[0]:g}: beyond ±{YEAR_LIMIT}")
    whole: Int = np.asarray(array, dtype=np.int64)
    return whole


def _check_calendar(calendar: str) -> None:
    if calendar not in CALENDARS:
        raise MomentError(f"calendar '{calendar}': unknown; expected one of {', '.join(CALENDARS)}")


def _number(year: Int, month: Int, day: Int, gregorian: bool) -> Int:
    """Return day numbers; the year is counted from March, so that the leap day is its last."""
    shift = (14 - month) // 12
    y = year + 4800 - shift
    m = month + 12 * shift - 3
    days = day + (153 * m + 2) // 5 + 365 * y + y // 4
    if gregorian:
        days = days - y // 100 + y // 400 - 32045 + 32083
    return np.asarray(days - 32083)


def _date(number: Int, gregorian: bool) -> tuple[Int, Int, Int]:
    """Return year, month, day of day numbers (Richards' algorithm, Explanatory Supplement, 3rd ed., 15.11)."""
    f = number + 1401
    if gregorian:
        f = f + (4 * number + 274277) // 146097 * 3 // 4 - 38
    e = 4 * f + 3
    h = 5 * (e % 1461 // 4) + 2
    day = h % 153 // 5 + 1
    month = (h // 153 + 2) % 12 + 1
    return e // 1461 - 4716 + (14 - month) // 12, month, day


def is_leap(year: ArrayLike, calendar: str) -> Bool:
    """Return whether years of the `julian` or `gregorian` calendar have a 29 February.

    In `mixed` the rule of the calendar in force on 29 February is used (the changeover of 1582).
    """
    _check_calendar(calendar)
    y = _whole("year", year)
    julian = y % 4 == 0
    if calendar == "julian":
        return np.asarray(julian)
    gregorian = julian & ((y % 100 != 0) | (y % 400 == 0))
    if calendar == "gregorian":
        return np.asarray(gregorian)
    return np.asarray(np.where(y > 1582, gregorian, julian))


def days_in_month(year: ArrayLike, month: ArrayLike, calendar: str) -> Int:
    """Return the number of the last day of months (28 to 31); October 1582 of `mixed` also ends with the 31st."""
    m = _whole("month", month)
    return np.asarray(_LENGTHS[m - 1] + ((m == 2) & is_leap(year, calendar)))


def day_number(
    year: ArrayLike, month: ArrayLike, day: ArrayLike, calendar: str = "mixed", *, changeover: int = CHANGEOVER
) -> Int:
    """Return the Julian day number (at noon) of calendar dates, broadcasting the three arguments.

    `changeover` is the day number of the first Gregorian day of the `mixed` calendar. Raises MomentError for a date
    that does not exist, naming the first such date and the reason.
    """
    _check_calendar(calendar)
    y, m, d = np.broadcast_arrays(_whole("year", year), _whole("month", month), _whole("day", day))
    bad = (m < 1) | (m > 12)
    if np.any(bad):
        raise MomentError(f"month {m[bad].flat[0]} in {_written(y, m, d, bad)}: expected 1 to 12")
    if calendar == "mixed":
        gregorian, julian = _number(y, m, d, True), _number(y, m, d, False)
        new = gregorian >= changeover
        gone = ~new & (julian >= changeover)
        leap = np.where(new, is_leap(y, "gregorian"), is_leap(y, "julian"))
        _check_days(y, m, d, leap, np.where(new, "Gregorian", "Julian"))
        if np.any(gone):
            last, first = _text(_date(np.asarray(changeover - 1), False)), _text(_date(np.asarray(changeover), True))
            raise MomentError(
                f"date {_written(y, m, d, gone)}: does not exist, {last} (Julian) was followed by {first} (Gregorian); "
                "name the calendar, 'julian' or 'gregorian', if one of them is meant"
            )
        return np.where(new, gregorian, julian)
    _check_days(y, m, d, is_leap(y, calendar), np.full(y.shape, calendar.capitalize()))
    return np.asarray(_number(y, m, d, calendar == "gregorian"))


def _check_days(y: Int, m: Int, d: Int, leap: Bool, name: NDArray[np.str_]) -> None:
    length = _LENGTHS[m - 1] + ((m == 2) & leap)
    bad = (d < 1) | (d > length)
    if np.any(bad):
        raise MomentError(
            f"date {_written(y, m, d, bad)}: no such day; that month has {length[bad].flat[0]} days "
            f"in the {name[bad].flat[0]} calendar"
        )


def calendar_date(number: ArrayLike, calendar: str = "mixed", *, changeover: int = CHANGEOVER) -> tuple[Int, Int, Int]:
    """Return (year, month, day) of Julian day numbers, each of the shape given."""
    _check_calendar(calendar)
    n = _whole("day number", number)
    if calendar != "mixed":
        return _date(n, calendar == "gregorian")
    new = n >= changeover
    # Almost always all days are on one side: spare the other side's arithmetic.
    if np.all(new):
        return _date(n, True)
    if not np.any(new):
        return _date(n, False)
    old, recent = _date(n, False), _date(n, True)
    year, month, day = (np.where(new, b, a) for a, b in zip(old, recent, strict=True))
    return year, month, day


def jd_from_date(
    year: ArrayLike, month: ArrayLike, day: ArrayLike, calendar: str = "mixed", *, changeover: int = CHANGEOVER
) -> Float:
    """Return Julian dates of calendar dates whose day may have a fraction (4.81 is 19:26:24 on the 4th)."""
    days = np.asarray(day, dtype=np.float64)
    if not np.all(np.isfinite(days)):
        raise MomentError("day: not a finite number")
    whole = np.floor(days)
    return np.asarray(day_number(year, month, whole, calendar, changeover=changeover) - 0.5 + (days - whole))


def nearest_day(year: ArrayLike, month: ArrayLike, day: ArrayLike, calendar: str = "mixed") -> Int:
    """Return day numbers as `day_number`, but a day past the end of its month becomes the last day of that month.

    A day that the mixed calendar left out becomes the first Gregorian day. Used to step by months and years.
    """
    y, m = _whole("year", year), _whole("month", month)
    d = np.minimum(_whole("day", day), days_in_month(y, m, calendar))
    if calendar != "mixed":
        return day_number(y, m, d, calendar)
    gregorian = np.asarray(_number(y, m, d, True))
    julian = np.minimum(_number(y, m, d, False), CHANGEOVER)
    return np.where(gregorian >= CHANGEOVER, gregorian, julian)


def day_of_year(year: ArrayLike, month: ArrayLike, day: ArrayLike, calendar: str = "mixed") -> Float:
    """Return the day of the year, 1 January being 1; a fraction of `day` is kept."""
    days = np.asarray(day, dtype=np.float64)
    return np.asarray(jd_from_date(year, month, days, calendar) - jd_from_date(year, 1, 1, calendar) + 1.0)


def weekday(number: ArrayLike) -> Int:
    """Return the weekday of day numbers, 0 = Monday to 6 = Sunday, an index of `WEEKDAYS`."""
    return np.asarray(_whole("day number", number) % 7)


def easter(year: int) -> tuple[int, int]:
    """Return month and day of Easter Sunday in the Gregorian calendar (Butcher's rule, Meeus 1998, ch. 8).

    Almanacs print it with every year; defined for years from 1583 on.
    """
    if year < 1583:
        raise MomentError(f"Easter of {year}: the Gregorian rule holds from 1583 on")
    a, b, c = year % 19, year // 100, year % 100
    h = (19 * a + b - b // 4 - (b - (b + 8) // 25 + 1) // 3 + 15) % 30
    k = (32 + 2 * (b % 4) + 2 * (c // 4) - h - c % 4) % 7
    m = (a + 11 * h + 22 * k) // 451
    month, day = divmod(h + k - 7 * m + 114, 31)
    return month, day + 1


def year_text(year: int) -> str:
    """Return a year in ISO 8601 writing: four digits, with a sign before 0 and after 9999."""
    if 0 <= year <= 9999:
        return f"{year:04d}"
    return f"{'-' if year < 0 else '+'}{abs(year):04d}"


def julian_epoch(year: float) -> float:
    """Return the Julian date (TT) of a Julian epoch: J2000.0 is 2451545.0."""
    return 2451545.0 + (year - 2000.0) * 365.25


def besselian_epoch(year: float) -> float:
    """Return the Julian date (TT) of a Besselian epoch: B1950.0 is 2433282.42345905 (Lieske 1979)."""
    return 2415020.31352 + (year - 1900.0) * 365.242198781


def besselian_year(jd: float) -> float:
    """Return the Besselian epoch of a Julian date (TT), the inverse of `besselian_epoch`."""
    if not math.isfinite(jd):
        raise MomentError(f"Julian date {jd}: not a finite number")
    return 1900.0 + (jd - 2415020.31352) / 365.242198781


def _text(date: tuple[Int, Int, Int]) -> str:
    return f"{year_text(int(date[0]))}-{int(date[1]):02d}-{int(date[2]):02d}"


def _written(y: Int, m: Int, d: Int, bad: Bool) -> str:
    """Return the first bad date as text."""
    return f"{year_text(int(y[bad].flat[0]))}-{int(m[bad].flat[0]):02d}-{int(d[bad].flat[0]):02d}"

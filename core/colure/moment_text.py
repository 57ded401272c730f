"""Read and write the text of moments: ISO 8601 with signed years, Julian dates, epochs, scale and calendar names."""

import re
from typing import Any, NamedTuple

import numpy as np

from colure import calendars
from colure.errors import MomentError
from colure.wording import one_line

EXPECTED = "expected such as 2026-12-01 21:36 UTC, -1200-03-30, JD 2455200.5 TT, J2000.0 or now"

_SCALES = {"utc": "UTC", "ut": "UT1", "ut1": "UT1", "tt": "TT", "tdb": "TDB"}
_DATE = re.compile(
    r"(?P<sign>[+-]?)(?P<year>\d{1,9})-(?P<month>\d{1,2})-(?P<day>\d{1,2})(?P<part>\.\d+)?"
    r"(?:[T ]\s*(?P<hour>\d{1,2}):(?P<minute>\d{2})(?::(?P<second>\d{2})(?P<fraction>[.,]\d+)?)?\s*"
    r"(?P<zone>Z|[+-]\d{2}:?\d{2})?)?\Z",
    re.IGNORECASE | re.ASCII,
)
_JULIAN = re.compile(r"(?P<kind>M?JD)\s*(?P<whole>[+-]?\d{1,12})(?P<part>\.\d*)?\Z", re.IGNORECASE | re.ASCII)
_EPOCH = re.compile(r"(?P<kind>[JB])\s*(?P<year>[+-]?\d{1,9}(?:\.\d*)?)\Z", re.IGNORECASE | re.ASCII)
_PLAIN_SIGNS = str.maketrans({"−": "-", "‐": "-", "‑": "-", "–": "-", "\u00a0": " ", "\u202f": " "})


class Parsed(NamedTuple):
    """What a text says, with nothing looked up yet: `kind` is civil, jd, epoch or now."""

    kind: str
    scale: str | None
    calendar: str | None
    year: int = 0
    month: int = 1
    day_of_month: int = 1
    seconds: float = 0.0
    offset: float = 0.0
    day: float = 0.0
    part: float = 0.0


def parse(text: str) -> Parsed:
    """Return the parts of a moment's text; raise MomentError that says what is wrong and what was expected."""
    shown = one_line(text)
    plain = text.translate(_PLAIN_SIGNS).strip()
    if not plain:
        raise MomentError(f"moment: nothing was given; {EXPECTED}")
    if len(plain) > 100:
        raise MomentError(f"moment '{shown}': too long; {EXPECTED}")
    body, scale, calendar = _trailing(plain, shown)
    if body.casefold() == "now":
        return Parsed("now", scale, calendar)
    if found := _JULIAN.match(body):
        day, part = float(found["whole"]), float("0" + (found["part"] or ""))
        if found["whole"].startswith("-"):
            part = -part
        if found["kind"].upper() == "MJD":
            day += 2400000.5
        return Parsed("jd", scale, calendar, day=day, part=part)
    if found := _EPOCH.match(body):
        year = float(found["year"])
        epoch = calendars.julian_epoch if found["kind"].upper() == "J" else calendars.besselian_epoch
        return Parsed("epoch", scale, calendar, day=epoch(year))
    if found := _DATE.match(body):
        return _civil(found, shown, scale, calendar)
    raise MomentError(f"moment '{shown}': not understood{_hint(body)}; {EXPECTED}")


def _hint(body: str) -> str:
    if re.match(r"[+-]?\d+(\.\d*)?\Z", body):
        return ", a bare number could be a year, a JD or an MJD"
    if re.match(r"\d{1,2}[./]\d{1,2}[./]\d+", body) or re.match(r"\d{1,2}-\d{1,2}-\d{4}", body):
        return ", write the date as year-month-day"
    last = body.split()[-1]
    if last.isalpha() and last.casefold() not in ("jd", "mjd") and len(body.split()) > 1:
        return f", '{last}' is no scale (UTC, UT1, TT, TDB) and no calendar (julian, gregorian)"
    return ""


def _trailing(plain: str, shown: str) -> tuple[str, str | None, str | None]:
    """Take scale and calendar words off the end, in either order; `(Julian calendar)` as printed is understood."""
    words = plain.replace("(", " ").replace(")", " ").split()
    scale: str | None = None
    calendar: str | None = None
    if not words:
        raise MomentError(f"moment '{shown}': not understood; {EXPECTED}")
    while len(words) > 1:
        word = words[-1].casefold()
        if word == "calendar" and words[-2].casefold() in calendars.CALENDARS:
            words.pop()
            continue
        if word in _SCALES:
            if scale is not None:
                raise MomentError(f"moment '{shown}': two time scales, {_SCALES[word]} and {scale}; expected one")
            scale = _SCALES[word]
        elif word in calendars.CALENDARS:
            if calendar is not None:
                raise MomentError(f"moment '{shown}': two calendars, {word} and {calendar}; expected one")
            calendar = word
        else:
            break
        words.pop()
    return " ".join(words), scale, calendar


def _civil(found: "re.Match[str]", shown: str, scale: str | None, calendar: str | None) -> Parsed:
    def fail(reason: str) -> MomentError:
        return MomentError(f"moment '{shown}': {reason}")

    year, digits = int(found["year"]), len(found["year"])
    if not found["sign"] and digits < 3:
        raise fail(f"year '{found['year']}' has fewer than three digits; expected four, or a sign before it")
    if found["sign"] == "-":
        year = -year
    # The first weeks of −4999 (Julian) are days of −5000 in the Gregorian calendar; Moment holds the exact limit.
    if not (-5001 if calendar == "gregorian" else -5000) < year < 5000:
        raise fail(f"year {calendars.year_text(year)} is out of reach; expected −4999 to 4999")
    seconds, offset = 0.0, 0.0
    if found["hour"] is not None:
        if found["part"]:
            raise fail("a day with a fraction and a clock time; expected one of them")
        hour, minute = int(found["hour"]), int(found["minute"])
        second = int(found["second"] or 0)
        fraction = float("0." + found["fraction"][1:]) if found["fraction"] else 0.0
        if hour > 23 and (hour, minute, second, fraction) != (24, 0, 0, 0.0):
            raise fail(f"hour {hour}; expected 0 to 23, or 24:00:00 for the end of the day")
        if minute > 59:
            raise fail(f"minute {minute}; expected 0 to 59")
        if second > 60:
            raise fail(f"second {second}; expected 0 to 59, or 60 within a leap second of UTC")
        if second == 60 and ((hour, minute) != (23, 59) or (found["zone"] or "Z").upper() != "Z"):
            raise fail("second 60; a leap second ends a UTC day, at 23:59")
        seconds = hour * 3600.0 + minute * 60.0 + second + fraction
        if zone := found["zone"]:
            if scale not in (None, "UTC", "UT1"):
                raise fail(f"a zone '{zone}' and the scale {scale}; a zone is an offset from UTC")
            if zone.upper() != "Z":
                hours, minutes = int(zone[1:3]), int(zone[-2:])
                if hours > 15 or minutes > 59:
                    raise fail(f"zone '{zone}'; expected such as +09:30")
                offset = (hours * 3600.0 + minutes * 60.0) * (-1.0 if zone[0] == "-" else 1.0)
    elif found["part"]:
        seconds = float("0" + found["part"]) * 86400.0
    day = int(found["day"])
    if found["hour"] is not None and int(found["hour"]) == 24:
        # The end of a day is the start of the next one: the same instant on every day but one with a leap second.
        offset -= 86400.0
        seconds -= 86400.0
    return Parsed("civil", scale, calendar, year, int(found["month"]), day, seconds, offset)


def _iso(fields: tuple[Any, ...], decimals: int) -> str:
    year, month, day, hour, minute, second = fields
    width = decimals + 3 if decimals else 2
    clock = f"{hour:02d}:{minute:02d}:{second:0{width}.{decimals}f}"
    return f"{calendars.year_text(year)}-{month:02d}-{day:02d}T{clock}"


def iso(fields: tuple[Any, ...], decimals: int) -> Any:
    """Return ISO 8601 text of (year … second), a str for scalars, else an array of str of their shape."""
    if all(np.ndim(part) == 0 for part in fields):
        return _iso(
            tuple(part.item() if isinstance(part, np.ndarray | np.generic) else part for part in fields), decimals
        )
    arrays = np.broadcast_arrays(*fields)
    rows = zip(*(a.ravel().tolist() for a in arrays), strict=True)
    texts = [_iso(row, decimals) for row in rows]
    return np.array(texts, dtype=np.str_).reshape(arrays[0].shape)


def human(iso_text: str, scale: str, calendar: str) -> str:
    """Return `date time scale`, naming the calendar before 1582-10-15 and for a Julian date after it."""
    date, clock = iso_text.split("T")
    text = f"{date.replace('-', '−', 1) if date.startswith('-') else date} {clock} {scale}"
    year, month, day = (int(part) for part in date.rsplit("-", 2))
    if calendar == "julian" or (year, month, day) < (1582, 10, 15):
        return f"{text} ({calendar.capitalize()} calendar)"
    return text


def shortest(text: str) -> str:
    """Return a text without the zeros that end the fraction of its seconds."""
    return re.sub(r"(:\d{2})\.(\d*?)0+(?=\D|\Z)", lambda m: m[1] + (f".{m[2]}" if m[2] else ""), text, count=1)

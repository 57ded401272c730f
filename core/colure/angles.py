"""Read and print angles: decimals are degrees, sexagesimal text says its unit, and nothing is guessed in silence.

Read: `129.4`, `-0.5°`, `12h34m56.7s`, `-00°12′03″`, `12:34:56`, `12 34 56`, `30′`; typewriter signs and the true minus
are the same. Printed: true minus, primes, a fixed number of figures, the sign of −00°, never 60.0″.
"""

import math
import re
from typing import NamedTuple

from colure.errors import AngleError
from colure.wording import one_line

MINUS = "−"
UNKNOWN = "—"
"""Printed in place of a value that is not a number."""

_LONGEST = 120
_SIGNS = str.maketrans(
    {
        **dict.fromkeys("−‐‑–﹣－", "-"),
        **dict.fromkeys("ºᵒ˚", "°"),
        **dict.fromkeys("'’ʹ‘", "′"),
        **dict.fromkeys('"”ʺ“', "″"),
        "ʰ": "h",
        "ᵐ": "m",
        "ˢ": "s",
        **dict.fromkeys("\u00a0\u2007\u2009\u202f\t\n", " "),
    }
)
_WORDS = {"degrees": "°", "degree": "°", "deg": "°", "d": "°", "arcmin": "′", "arcsec": "″", "hours": "h", "hour": "h"}
_WORD = re.compile(r"(?<![a-z])(degrees|degree|deg|d|arcmin|arcsec|hours|hour)(?![a-z])")
# "56s.7" is how almanacs print a fraction: the point after the unit.
_ALMANAC = re.compile(r"(\d)\s*([hms°′″])\.(\d+)")
_TOKEN = re.compile(
    r"\s*(?P<colon>:)?\s*(?P<sign>[+-])?\s*(?P<number>(?:\d+(?:\.\d*)?|\.\d+)(?:e[+-]?\d{1,3})?)\s*(?P<unit>[hms°′″])?",
    re.ASCII,
)
_NEXT = {"h": "m", "°": "′", "m": "s", "′": "″"}
_SIXTIETHS = {"h": 0, "°": 0, "m": 1, "′": 1, "s": 2, "″": 2}


class _Token(NamedTuple):
    colon: bool
    sign: str
    number: str
    unit: str
    start: int


class _Angle(NamedTuple):
    """One angle as written: `unit` is h, °, or empty where a sexagesimal text says neither; `value` is in it."""

    value: float
    unit: str
    parts: tuple[str, ...]
    negative: bool


def _tokens(text: str, what: str) -> tuple[str, list[_Token]]:
    """Return the normalised text and its numbers; raise AngleError at the first thing that is neither."""
    shown, length = one_line(text), len(text.strip())
    if not length:
        raise AngleError(f"{what}: nothing was given; expected an angle such as 129.4, 12h34m56s or −0°30′")
    if length > _LONGEST:
        raise AngleError(f"{what} '{shown}': {length} characters long; expected an angle")
    plain = text.strip().translate(_SIGNS).casefold().replace("′′", "″")
    plain = _WORD.sub(lambda m: _WORDS[m[1]], re.sub(r"(?<=\d)d(?=[\d\s.]|\Z)", "°", plain))
    plain = _ALMANAC.sub(r"\1.\3\2", plain)
    tokens, at = [], 0
    while at < len(plain):
        found = _TOKEN.match(plain, at)
        if found is None:
            rest = one_line(plain[at:])
            if not rest:
                break
            raise AngleError(
                f"{what} '{shown}': '{one_line(rest, 12)}' is no part of an angle; expected such as 129.4 or 12h34m56s"
            )
        tokens.append(_Token(bool(found["colon"]), found["sign"] or "", found["number"], found["unit"] or "", at))
        at = found.end()
    if not tokens:
        raise AngleError(f"{what} '{shown}': no number; expected an angle such as 129.4, 12h34m56s or −0°30′")
    return plain, tokens


def _angle(tokens: list[_Token], shown: str, what: str) -> _Angle:
    """Return the one angle that the tokens spell, with each part checked."""

    def fail(reason: str) -> AngleError:
        return AngleError(f"{what} '{shown}': {reason}")

    if len(tokens) > 3:
        raise fail(f"{len(tokens)} numbers; an angle has at most three")
    if tokens[0].colon:
        raise fail("starts with a colon")
    if any(token.sign for token in tokens[1:]):
        raise fail("a sign inside the angle; only the first number may have one")
    units = [token.unit for token in tokens]
    if len(tokens) > 1 and all(token.colon for token in tokens[1:]) and not any(units[:-1]) and units[-1] in ("h", "°"):
        # "12:34:56 h": the unit after the whole.
        units = [units[-1], *([""] * (len(units) - 1))]
    if units[0] in ("m", "s"):
        raise fail(f"'{units[0]}' without h or ° before it could be of time or of arc; write ′ ″ or 0h")
    filled: list[str] = []
    for unit in units:
        before = filled[-1] if filled else ""
        if not unit and before:
            unit = _NEXT.get(before, "")
            if not unit:
                raise fail("a number after the seconds")
        if filled and not before:
            unit = unit or ""
            if unit:
                raise fail(f"'{unit}' after a number without a unit; write the unit of each part or of none")
        if before:
            hours = filled[0] == "h"
            if unit in ("m", "s") and not hours:
                unit = {"m": "′", "s": "″"}[unit]
            if (unit in ("m", "s")) != hours or _SIXTIETHS[unit] <= _SIXTIETHS[before]:
                raise fail(f"'{unit}' after '{before}'; expected {'h m s' if hours else '° ′ ″'} in this order")
        filled.append(unit)
    numbers = [float(token.number) for token in tokens]
    if not all(math.isfinite(number) for number in numbers):
        raise fail("a number too large")
    if len(tokens) > 1:
        for token in tokens[:-1]:
            if not token.number.isdigit():
                raise fail(f"'{token.number}' has a fraction but is not the last part")
        if "e" in tokens[-1].number:
            raise fail(f"'{token.number}': an exponent in a sexagesimal angle")
        for number, token in zip(numbers[1:], tokens[1:], strict=True):
            if number >= 60.0:
                raise fail(f"'{token.number}' in the place of minutes or seconds; expected less than 60")
    if filled[0]:
        first = filled[0]
        value = sum(number / 60.0 ** _SIXTIETHS[unit] for number, unit in zip(numbers, filled, strict=True))
        unit = "h" if first == "h" else "°"
    else:
        value = sum(number / 60.0**i for i, number in enumerate(numbers))
        unit = "°" if len(numbers) == 1 else ""
    negative = tokens[0].sign == "-"
    return _Angle(-value if negative else value, unit, tuple(token.number for token in tokens), negative)


def _brief(value: float) -> str:
    return f"{value:.6g}".replace("-", MINUS)


def _longitude(tokens: list[_Token], shown: str, equatorial: bool, what: str) -> float:
    angle = _angle(tokens, shown, what)
    if angle.unit == "" and equatorial:
        sign = MINUS if angle.negative else ""
        names = [
            f"{sign}{''.join(n + u for n, u in zip(angle.parts, units, strict=False))}" for units in ("hms", "°′″")
        ]
        raise AngleError(
            f"{what} '{shown}': hours or degrees? In an equatorial frame write {names[0]} "
            f"({format_degrees(angle.value * 15.0 % 360.0)}) or {names[1]} ({format_degrees(angle.value % 360.0)})"
        )
    if angle.unit == "h":
        if abs(angle.value) > 24.0:
            raise AngleError(f"{what} '{shown}': {_brief(angle.value)} h; expected up to 24h")
        return angle.value * 15.0 % 360.0
    if abs(angle.value) > 360.0:
        raise AngleError(f"{what} '{shown}': {_brief(angle.value)}°; expected −360° to 360°")
    # A tiny negative angle becomes exactly 360 under the remainder; keep the half-open range.
    lon = angle.value % 360.0
    return 0.0 if lon >= 360.0 else lon


def _latitude(tokens: list[_Token], shown: str, what: str) -> float:
    angle = _angle(tokens, shown, what)
    if angle.unit == "h":
        raise AngleError(f"{what} '{shown}': in hours; expected degrees")
    if abs(angle.value) > 90.0:
        raise AngleError(f"{what} '{shown}': {_brief(angle.value)}°; expected −90° to 90°")
    return angle.value


def parse_angle(text: str, what: str = "angle") -> float:
    """Return degrees of an angle in degrees, decimal or sexagesimal, with its sign; `what` names it in errors."""
    angle = _angle(_tokens(text, what)[1], one_line(text), what)
    if angle.unit == "h":
        raise AngleError(f"{what} '{one_line(text)}': in hours; expected degrees")
    return angle.value


def parse_longitude(text: str, *, equatorial: bool = False, what: str = "longitude") -> float:
    """Return degrees, 0 ≤ lon < 360, of a longitude or right ascension.

    Decimals are degrees. A sexagesimal text without h or ° is degrees, but in an equatorial frame an AngleError that
    shows both readings.
    """
    return _longitude(_tokens(text, what)[1], one_line(text), equatorial, what)


def parse_latitude(text: str, what: str = "latitude") -> float:
    """Return degrees, −90 to 90, of a latitude or declination, decimal or sexagesimal."""
    return _latitude(_tokens(text, what)[1], one_line(text), what)


def parse_extent(text: str, what: str = "size") -> float:
    """Return the degrees of a size such as `3`, `2.5°`, `30′` or `10″`; AngleError unless positive."""
    value = parse_angle(text, what)
    if not value > 0.0:
        raise AngleError(f"{what} '{one_line(text)}': expected more than zero")
    return value


def parse_position(text: str, *, equatorial: bool) -> tuple[float, float]:
    """Return longitude (0 to 360) and latitude in degrees of a text `LON LAT`.

    The two are parted by a comma, by the sign of the latitude, by its ° or, where both have as many numbers, in the
    middle. `equatorial` says whether the longitude is a right ascension; see `parse_longitude`.
    """
    what = "position"
    shown = one_line(text)
    halves = text.split(",")
    if len(halves) == 2:
        pieces = [
            (_tokens(half, name)[1], one_line(half))
            for half, name in zip(halves, ("longitude", "latitude"), strict=True)
        ]
    elif len(halves) > 2:
        raise AngleError(f"{what} '{shown}': {len(halves) - 1} commas; expected LON LAT, with at most one between")
    else:
        plain, tokens = _tokens(text, what)
        cut = _cut(tokens, shown)
        at = tokens[cut].start
        pieces = [(tokens[:cut], one_line(plain[:at])), (tokens[cut:], one_line(plain[at:]))]
    (lon_tokens, lon_text), (lat_tokens, lat_text) = pieces
    lon = _longitude(lon_tokens, lon_text, equatorial, "longitude")
    return lon, _latitude(lat_tokens, lat_text, "latitude")


def _cut(tokens: list[_Token], shown: str) -> int:
    """Return the index of the token with which the latitude begins."""
    if len(tokens) == 1:
        raise AngleError(f"position '{shown}': one angle; expected two, LON LAT")
    later = range(1, len(tokens))
    signed = [i for i in later if tokens[i].sign]
    if len(signed) == 1:
        return signed[0]
    if len(signed) > 1:
        raise AngleError(
            f"position '{shown}': {len(signed)} signs after the first number; expected one, of the latitude"
        )
    loose = [i for i in later if not tokens[i].colon]
    if len(loose) == 1 and len(tokens) > 2 and any(token.colon for token in tokens):
        return loose[0]
    whole = [i for i in later if tokens[i].unit in ("h", "°")]
    if len(whole) == 1:
        return whole[0]
    if len(tokens) in (2, 4, 6) and not whole:
        return len(tokens) // 2
    raise AngleError(f"position '{shown}': where does the latitude begin? Give it a sign, or put a comma before it")


# Printing


def format_number(value: float, decimals: int, *, plus: bool = False) -> str:
    """Return a number with a true minus and a fixed number of decimals (negative: rounded to tens, hundreds …).

    A value that rounds to zero keeps its sign only where `plus` asks for one.
    """
    if not math.isfinite(value):
        return UNKNOWN
    rounded = round(value, decimals)
    text = f"{abs(rounded):.{max(decimals, 0)}f}"
    if rounded < 0.0 or (plus and math.copysign(1.0, value) < 0.0):
        return MINUS + text
    return "+" + text if plus else text


def format_degrees(degrees: float, decimals: int = 4, *, plus: bool = False) -> str:
    """Return decimal degrees such as `−12.5000°`."""
    text = format_number(degrees, decimals, plus=plus)
    return text if text == UNKNOWN else text + "°"


def _sexagesimal(value: float, decimals: int, smallest: str, limit: int | None) -> tuple[int, int, int, str]:
    """Return the whole, minutes, whole seconds and fraction text of a non-negative value, rounded once with carry.

    `limit` is where the whole wraps to zero (24 or 360).
    """
    steps = {"second": 3600 * 10 ** max(decimals, 0), "minute": 60, "degree": 1}[smallest]
    ticks = round(value * steps)
    if limit is not None:
        ticks %= limit * steps
    whole, rest = divmod(ticks, steps)
    if smallest == "degree":
        return whole, 0, 0, ""
    if smallest == "minute":
        return whole, rest, 0, ""
    minutes, rest = divmod(rest, steps // 60)
    seconds, fraction = divmod(rest, steps // 3600)
    return whole, minutes, seconds, f".{fraction:0{decimals}d}" if decimals > 0 else ""


def format_dms(
    degrees: float,
    decimals: int = 0,
    *,
    longitude: bool = False,
    plus: bool | None = None,
    smallest: str = "second",
    ascii_only: bool = False,
) -> str:
    """Return `−00°12′03.4″`, tabular: three figures of degrees for a longitude (0 to 360), two for a latitude.

    A latitude carries its sign, + too, unless `plus` is false. `smallest` is `second`, `minute` or `degree`;
    `ascii_only` gives `-00:12:03.4`. NaN gives a dash.
    """
    if not math.isfinite(degrees):
        return UNKNOWN
    value = degrees % 360.0 if longitude else abs(degrees)
    whole, minutes, seconds, fraction = _sexagesimal(value, decimals, smallest, 360 if longitude else None)
    signed = (not longitude) if plus is None else plus
    negative = not longitude and math.copysign(1.0, degrees) < 0.0
    sign = (("-" if ascii_only else MINUS) if negative else "+" if signed else "") if (signed or negative) else ""
    width = 3 if longitude else 2
    marks = ":: " if ascii_only else "°′″"
    text = f"{sign}{whole:0{width}d}"
    if smallest == "degree":
        return text if ascii_only else text + "°"
    text += f"{marks[0]}{minutes:02d}"
    if smallest == "minute":
        return text if ascii_only else text + marks[1]
    return f"{text}{marks[1]}{seconds:02d}{fraction}{marks[2]}".rstrip()


def format_hms(degrees: float, decimals: int = 1, *, smallest: str = "second", ascii_only: bool = False) -> str:
    """Return degrees as hours, `12h34m56.7s`, from 0h to below 24h; `ascii_only` gives `12:34:56.7`; NaN a dash.

    `smallest` is `second`, `minute` or `degree` (for the whole hour).
    """
    if not math.isfinite(degrees):
        return UNKNOWN
    whole, minutes, seconds, fraction = _sexagesimal(degrees % 360.0 / 15.0, decimals, smallest, 24)
    marks = ":: " if ascii_only else "hms"
    if smallest == "degree":
        return f"{whole:02d}" if ascii_only else f"{whole:02d}h"
    text = f"{whole:02d}{marks[0]}{minutes:02d}"
    if smallest == "minute":
        return text if ascii_only else text + "m"
    return f"{text}{marks[1]}{seconds:02d}{fraction}{marks[2]}".rstrip()


def format_position(
    lon_deg: float, lat_deg: float, *, equatorial: bool, sigma_arcsec: float = 0.1, ascii_only: bool = False
) -> str:
    """Return `LON LAT` with the figures that the uncertainty supports: hours in an equatorial frame, else degrees."""
    smallest, decimals = dms_places(sigma_arcsec)
    lat = format_dms(lat_deg, decimals, smallest=smallest, ascii_only=ascii_only)
    if equatorial:
        # A second of time is 15″: one more figure keeps the same precision.
        finer, places = dms_places(sigma_arcsec / 15.0)
        return f"{format_hms(lon_deg, places, smallest=finer, ascii_only=ascii_only)} {lat}"
    return f"{format_dms(lon_deg, decimals, longitude=True, smallest=smallest, ascii_only=ascii_only)} {lat}"


def decimals_for(sigma: float, most: int = 9) -> int:
    """Return the decimals that an uncertainty supports: its first figure is the last one shown.

    0.02 gives 2, 0.5 gives 1, 30 gives −1. An uncertainty of zero, unknown or infinite gives `most`, 0 and 0.
    """
    if sigma == 0.0:
        return most
    if not math.isfinite(sigma):
        return 0
    return min(-math.floor(math.log10(abs(sigma)) + 1e-12), most)


def dms_places(sigma_arcsec: float) -> tuple[str, int]:
    """Return (smallest unit, decimals of the second) that an uncertainty in arcseconds supports, for the formatters."""
    if not math.isfinite(sigma_arcsec) or sigma_arcsec >= 1800.0:
        return "degree", 0
    if sigma_arcsec >= 30.0:
        return "minute", 0
    return "second", min(max(decimals_for(sigma_arcsec), 0), 6)


def format_with_sigma(value: float, sigma: float, unit: str = "") -> str:
    """Return `20390 ± 180 s`: the uncertainty to one figure (two if it begins with 1), the value to the same place."""
    if not math.isfinite(value):
        return UNKNOWN
    tail = f" {unit}" if unit else ""
    if not (math.isfinite(sigma) and sigma > 0.0):
        return format_number(value, 3) + tail
    decimals = decimals_for(sigma)
    if sigma * 10.0**decimals < 2.0:
        decimals += 1
    return f"{format_number(value, decimals)} ± {format_number(sigma, decimals)}{tail}"

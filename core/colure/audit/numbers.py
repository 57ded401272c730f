"""The numbers handed in: two coordinates as written, with the half unit of their last digit as their uncertainty."""

import re
from dataclasses import dataclass, replace

import numpy as np

from colure import angles
from colure.arrays import Float, Int
from colure.errors import AngleError
from colure.wording import one_line

UNKNOWN = "?"
"""Written in place of a coordinate that is not known."""

_PLAIN = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)|\?)\s*(?:,\s*|\s+)([+-]?(?:\d+\.?\d*|\.\d+)|\?)\s*\Z", re.ASCII)
_NUMBER = re.compile(r"\d+(?:\.\d*)?|\.\d+", re.ASCII)
LARGEST = 1e7


@dataclass(frozen=True, slots=True)
class Numbers:
    """Pairs as read, in degrees: `x`, `y` (n,), and half the last digit of each, `half_x`, `half_y` (n,).

    `y` or `x` is NaN where the coordinate is not known: it then decides nothing. `spelt` says that they were written
    with degrees, hours and minutes, so that they are neither radians nor packed digits nor bare hours.
    """

    x: Float
    y: Float
    half_x: Float
    half_y: Float
    spelt: bool = False

    @classmethod
    def of(cls, x: Float | float, y: Float | float, half_x: Float | float, half_y: Float | float) -> "Numbers":
        """Return the pairs of any arrays that broadcast to one shape (n,); raise AngleError for impossible ones."""
        parts = np.broadcast_arrays(*(np.atleast_1d(np.asarray(v, dtype=np.float64)) for v in (x, y, half_x, half_y)))
        if parts[0].ndim != 1:
            raise AngleError(f"audit: positions of shape {parts[0].shape}; expected one row of them")
        for name, half in (("longitude", parts[2]), ("latitude", parts[3])):
            if not np.all(half > 0.0):
                raise AngleError(f"audit: the rounding of a {name} is {half.min():g}°; expected more than zero")
        for name, value in (("longitude", parts[0]), ("latitude", parts[1])):
            if np.any(np.isinf(value)) or np.any(np.abs(value) > LARGEST):
                raise AngleError(f"audit: a {name} is {value[np.argmax(np.abs(value))]:g}; expected a coordinate")
        if np.any(np.isnan(parts[0]) & np.isnan(parts[1])):
            raise AngleError("audit: neither coordinate of a position is known; expected one at least")
        return cls(np.array(parts[0]), np.array(parts[1]), np.array(parts[2]), np.array(parts[3]))

    def __len__(self) -> int:
        return len(self.x)

    def take(self, rows: Int | slice) -> "Numbers":
        """Return some of the pairs."""
        return Numbers(self.x[rows], self.y[rows], self.half_x[rows], self.half_y[rows], self.spelt)

    def rounded_to(self, arcsec: float) -> "Numbers":
        """Return the same pairs with another uncertainty, arcseconds in either coordinate."""
        if not 0.0 < arcsec < 3.6e5:
            raise AngleError(f"audit: a rounding of {arcsec:g}″; expected more than zero and less than 100°")
        half = np.full(len(self), arcsec / 3600.0)
        return replace(self, half_x=half, half_y=half)


def read(text: str, *, equatorial: bool = True) -> Numbers:
    """Return the pair of a text `LON LAT` and its rounding.

    Two plain decimals may be any numbers, so that hours, radians or packed digits can be asked about; `?` stands for
    a coordinate that is not known. Sexagesimal text is read as everywhere (`h` or `°` in an equatorial frame).
    """
    shown = one_line(text)
    if len(text) > 200:
        raise AngleError(f"position '{shown}': {len(text)} characters long; expected LON LAT")
    plain = text.translate({ord("−"): "-"})
    found = _PLAIN.match(plain)
    if found:
        pairs = [_decimal(part) for part in found.groups()]
    else:
        lon_text, lat_text = _halves(plain, shown)
        pairs = [_half(lon_text, True, equatorial), _half(lat_text, False, equatorial)]
    (x, half_x), (y, half_y) = pairs
    return replace(Numbers.of(x, y, half_x, half_y), spelt=found is None)


def last_digit(text: str) -> float:
    """Return half the last digit of one number as written, decimal or sexagesimal, in the unit of its first part."""
    numbers = _NUMBER.findall(text)
    if not numbers:
        raise AngleError(f"'{one_line(text)}': no number")
    return float(0.5 * 10.0 ** -len(numbers[-1].partition(".")[2]) / 60.0 ** (len(numbers) - 1))


def _decimal(text: str) -> tuple[float, float]:
    if text == UNKNOWN:
        return np.nan, 1.0
    return float(text), 0.5 * 10.0 ** -len(text.partition(".")[2])


def _halves(text: str, shown: str) -> tuple[str, str]:
    """Return the texts of longitude and latitude, parted as `colure.angles.parse_position` parts them."""
    if "," in text:
        lon, _, lat = text.partition(",")
        if "," in lat:
            raise AngleError(f"position '{shown}': more than one comma; expected LON LAT")
        return lon, lat
    if UNKNOWN in text:
        lon, _, lat = text.strip().partition(" ") if text.strip()[0] == UNKNOWN else text.strip().rpartition(" ")
        return lon, lat
    spelt, tokens = angles._tokens(text, "position")
    at = tokens[angles._cut(tokens, shown)].start
    return spelt[:at], spelt[at:]


def _half(text: str, longitude: bool, equatorial: bool) -> tuple[float, float]:
    if text.strip() == UNKNOWN:
        return np.nan, 1.0
    value = angles.parse_longitude(text, equatorial=equatorial) if longitude else angles.parse_latitude(text)
    return value, last_digit(text) * (15.0 if re.search(r"\dh|h\b|hour", text.casefold()) else 1.0)

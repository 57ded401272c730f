"""What the digits may mean: every way in which two numbers are read wrongly, undone (list A of the hypotheses)."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from colure import sidereal
from colure.arrays import DEG, TWO_PI, Bool, Float
from colure.audit.numbers import Numbers
from colure.moment import Moment
from colure.sites import Site

SIDEREAL_TURN = 1.00273781191135448
"""Turns of the Earth in a day of UT1 (IAU 2000)."""


@dataclass(frozen=True, slots=True)
class Read:
    """Numbers taken in one meaning: rad, (n,) each; `fits` where they can have that meaning.

    `period` is the angle after which the longitude repeats: less than a turn where digits were lost.
    """

    lon: Float
    lat: Float
    sigma_lon: Float
    sigma_lat: Float
    fits: Bool
    period: float = TWO_PI


@dataclass(frozen=True, slots=True)
class Reading:
    """One meaning: its key, its code in the list of hypotheses, the words for it, and the function that applies it."""

    key: str
    code: str
    words: str
    apply: Callable[[Numbers], Read]


def _plain(n: Numbers) -> Read:
    return _scaled(n, DEG, DEG, np.ones(len(n), dtype=np.bool_))


def _scaled(n: Numbers, by_x: float, by_y: float, fits: Bool, period: float = TWO_PI) -> Read:
    return Read(n.x * by_x, n.y * by_y, n.half_x * by_x, n.half_y * by_y, fits & _lat(n.y * by_y), period)


def _lat(rad: Float) -> Bool:
    return ~(np.abs(rad) > np.pi / 2 + 1e-9)


def _with(n: Numbers, lon_deg: Float, lat_deg: Float, fits: Bool) -> Read:
    return Read(lon_deg * DEG, lat_deg * DEG, n.half_x * DEG, n.half_y * DEG, fits & _lat(lat_deg * DEG))


def _hours(n: Numbers) -> Read:
    return _scaled(n, 15.0 * DEG, DEG, ~((n.x < 0.0) | (n.x > 24.0)))


def _fifteenfold(n: Numbers) -> Read:
    # The text was degrees, and the reader took it for hours: only the remainder of 24° is left of it.
    return _scaled(n, DEG / 15.0, DEG, np.ones(len(n), dtype=np.bool_), TWO_PI / 15.0)


def _radians(n: Numbers) -> Read:
    return _scaled(n, 1.0, 1.0, ~(np.abs(n.x) > TWO_PI))


def _unpacked(value: Float, half: Float) -> tuple[Float, Float, Bool]:
    """Return the value of digits W.MMSSss, its half digit, and whether minutes and seconds are below sixty."""
    size = np.abs(value)
    digits = size * 1e4 + 1e-6  # decimals that binary fractions fall short of must not lose a second
    whole = np.floor(digits / 1e4)
    minutes = np.floor((digits - whole * 1e4) / 100.0)
    seconds = digits - 1e-6 - whole * 1e4 - minutes * 100.0
    unit = np.where(half < 1e-3, half * 1e4 / 3600.0, np.where(half < 0.1, half * 100.0 / 60.0, half))
    sound = (minutes < 60.0) & (seconds < 60.0)
    return np.copysign(whole + minutes / 60.0 + seconds / 3600.0, value), unit, sound


def _packed(by: float) -> Callable[[Numbers], Read]:
    def apply(n: Numbers) -> Read:
        x, half_x, good_x = _unpacked(n.x, n.half_x)
        y, half_y, good_y = _unpacked(n.y, n.half_y)
        fits = (good_x | np.isnan(n.x)) & (good_y | np.isnan(n.y)) & ~(x * by > 360.0) & ~(x < 0.0)
        return Read(x * by * DEG, y * DEG, half_x * by * DEG, half_y * DEG, fits & _lat(y * DEG))

    return apply


def _sign_lost(n: Numbers) -> Read:
    return _with(n, n.x, -n.y, np.abs(n.y) < 1.0)


def _minutes_added(n: Numbers) -> Read:
    # −10° 30′ had become −10 + 0.5: the whole degrees are the next below.
    degrees = np.ceil(-n.y - 1e-9)
    return _with(n, n.x, -(degrees + (n.y + degrees)), (n.y < 0.0) & (degrees >= 1.0))


def _swapped(n: Numbers) -> Read:
    signed = (n.x + 180.0) % 360.0 - 180.0
    return Read(n.y * DEG, signed * DEG, n.half_y * DEG, n.half_x * DEG, _lat(signed * DEG))


def _colatitude(n: Numbers) -> Read:
    return _with(n, n.x, 90.0 - n.y, ~((n.y < 0.0) | (n.y > 180.0)))


def _mirrored(n: Numbers) -> Read:
    return _with(n, -n.x, n.y, np.ones(len(n), dtype=np.bool_))


AS_READ = Reading("read", "", "as read", _plain)
READINGS = (
    Reading("hours", "A1", "right ascension in hours, read as degrees", _hours),
    Reading("fifteenfold", "A1", "degrees, read as hours and multiplied by 15", _fifteenfold),
    Reading("radians", "A2", "radians, read as degrees", _radians),
    Reading("packed-hours", "A3", "digits of hours, minutes, seconds (12.3456 is 12h34m56s)", _packed(15.0)),
    Reading("packed-degrees", "A3", "digits of degrees, minutes, seconds (12.3456 is 12°34′56″)", _packed(1.0)),
    Reading("sign-lost", "A4", "the minus sign of −00° was lost", _sign_lost),
    Reading("minutes-added", "A5", "minutes were added to negative degrees", _minutes_added),
    Reading("swapped", "A6", "longitude and latitude are swapped", _swapped),
    Reading("colatitude", "A7", "the second number is the distance from the pole (90° − latitude)", _colatitude),
    Reading("mirrored", "A8", "longitude counted westward", _mirrored),
)
"""Readings of numbers that need nothing but the numbers."""
BARE = ("hours", "radians", "packed-hours", "packed-degrees")
"""Readings that numbers written with their units cannot have."""


def hour_angles(moment: Moment, site: Site) -> tuple[Reading, ...]:
    """Return the readings of the first number as a local hour angle, right and wrong (A8, B17, E1, E8, E9)."""
    lon = site.lon_deg * DEG
    gast, gmst = (np.atleast_1d(sidereal.gast(moment)), np.atleast_1d(sidereal.gmst(moment)))
    delta = np.atleast_1d(np.asarray(moment.delta_t_s, dtype=np.float64))
    turn = SIDEREAL_TURN * TWO_PI / 86400.0
    late = delta * turn
    # In TT the instant is certain, and how far the Earth has turned is not.
    certain = moment.scale in ("UTC", "UT1")
    doubt = np.zeros(delta.shape) if certain else np.atleast_1d(np.asarray(moment.delta_t_sigma_s)) * turn
    times = [
        ("ha", "A8", "local hour angle", gast + lon),
        ("ha-mean", "B17", "local hour angle without the equation of the equinoxes", gmst + lon),
        ("ha-tt", "E8", "local hour angle with TT taken for UT1", gast + lon + late),
        ("ha-east", "E9", "local hour angle with the sign of the site's longitude reversed", gast - lon),
    ]
    has_utc = np.atleast_1d(np.asarray(moment.has_utc, dtype=np.bool_))
    if np.all(has_utc):
        utc1, utc2 = moment.utc
        ut11, ut12 = moment.ut1
        dut1 = (np.atleast_1d(ut11) - np.atleast_1d(utc1)) + (np.atleast_1d(ut12) - np.atleast_1d(utc2))
        times.append(
            ("ha-utc", "E1", "local hour angle with UTC taken for UT1", gast + lon - dut1 * SIDEREAL_TURN * TWO_PI)
        )
    return tuple(Reading(key, code, words, _hour_angle(local, doubt)) for key, code, words, local in times)


def _hour_angle(local: Float, doubt: Float) -> Callable[[Numbers], Read]:
    def apply(n: Numbers) -> Read:
        every = np.ones(len(n), dtype=np.bool_)
        sigma = np.hypot(n.half_x * DEG, doubt)
        return Read(local - n.x * DEG, n.y * DEG, sigma, n.half_y * DEG, every & _lat(n.y * DEG))

    return apply

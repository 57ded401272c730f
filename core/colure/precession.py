"""Precession: the mean equator and the mean ecliptic of a date, each by a named model, as matrices from ICRS axes.

| model        | equator                                          | span (Julian years) |
|--------------|--------------------------------------------------|---------------------|
| iau2006      | IAU 2006 with the frame bias (ERFA)              | −3000 to 7000       |
| vondrak2011  | Vondrák, Capitaine & Wallace 2011 (ERFA)         | −198000 to 202000   |
| iau1976      | Lieske et al. 1977 from the FK5 axes             | −2000 to 6000       |
| newcomb      | Bessel–Newcomb (Kinoshita's form) from FK4 axes  | 0 to 4000           |

`auto` is iau2006 within 200 years of J2000 and vondrak2011 beyond; they differ by 2 mas at the seam. The span of
iau2006 ends where it is 30″ from the long-term model, that of iau1976 where its obliquity is 15″ from it.
"""

from collections.abc import Callable, Mapping
from typing import TypeAlias

import erfa
import numpy as np

from colure.arrays import ARCSEC, Bool, Float, rotation_x, rotation_z
from colure.errors import FrameError, SpanError, near_names
from colure.moment import Moment

Instant: TypeAlias = Moment | tuple[Float | float, Float | float]
"""A moment, or the two parts of a Julian date of TT (for years that a Moment does not reach)."""

J2000 = 2451545.0
YEAR = 365.25
SEAM_YEARS = 200.0
B1950 = (2433282.5, -0.07654999999)
"""Besselian epoch 1950.0 as JD 2433282.42345 (Lieske 1979), split so that no digit is lost."""
SPANS = {
    "iau2006": (-3000.0, 7000.0),
    "vondrak2011": (-198000.0, 202000.0),
    "iau1976": (-2000.0, 6000.0),
    "newcomb": (0.0, 4000.0),
}
OBLIQUITY_ONLY = ("laskar1986", "vondrak2011-fit")
"""Models that give an angle and no pole: no rotation can be made of them."""


def tt_parts(at: Instant) -> tuple[Float | float, Float | float]:
    """Return the two-part Julian date of TT of a moment or of a pair that already is one."""
    return at.tt if isinstance(at, Moment) else at


def julian_years(at: Instant) -> Float:
    """Return Julian epochs (TT) as an array, to about 1e-9 yr."""
    jd1, jd2 = tt_parts(at)
    return np.asarray(2000.0 + ((np.asarray(jd1) - J2000) + np.asarray(jd2)) / YEAR)


def check_model(model: str) -> str:
    """Return the model's name if it has a pole; raise FrameError with the reason or with near names."""
    if model == "auto" or model in SPANS:
        return model
    if model in OBLIQUITY_ONLY:
        raise FrameError(f"model '{model}': gives the obliquity only, no pole, so no frame can be drawn from it")
    raise FrameError(
        f"model '{model}': unknown; expected auto, {', '.join(SPANS)}{near_names(model, (*SPANS, *OBLIQUITY_ONLY))}"
    )


def check_span(model: str, years: Float, spans: dict[str, tuple[float, float]] = SPANS) -> None:
    """Raise SpanError if any year lies outside what the model covers."""
    first, last = spans[model]
    bad = ~((years >= first) & (years <= last))
    if np.any(bad):
        wrong = float(np.asarray(years)[bad].flat[0])
        raise SpanError(f"model '{model}': year {wrong:.10g} is outside its span, {first:g} to {last:g}")


def model_at(at: Instant, model: str = "auto") -> str:
    """Return the name of the model that answers, for display; both names where moments lie on both sides."""
    if check_model(model) != "auto":
        return model
    far = is_far(julian_years(at))
    if np.all(far):
        return "vondrak2011"
    return "iau2006, vondrak2011" if np.any(far) else "iau2006"


def is_far(years: Float) -> Bool:
    """Return where the automatic model leaves IAU 2006 for the long-term one."""
    return np.asarray(np.abs(years - 2000.0) > SEAM_YEARS)


def by_model(
    at: Instant, model: str, functions: Mapping[str, Callable[[Float | float, Float | float], Float]], tail: int
) -> Float:
    """Evaluate the function of the model chosen; under `auto` each side of the seam by its own.

    `tail` is the number of trailing dimensions that the functions add to the shape of the moments.
    """
    jd1, jd2 = tt_parts(at)
    if model == "auto" and isinstance(jd1, float) and isinstance(jd2, float):
        # One moment, as every frame of a chart asks for it: its side of the seam, without arrays of no dimension.
        year = 2000.0 + ((jd1 - J2000) + jd2) / YEAR
        if not abs(year - 2000.0) > SEAM_YEARS:
            return functions["iau2006"](jd1, jd2)
        check_span("vondrak2011", np.asarray(year))
        return functions["vondrak2011"](jd1, jd2)
    years = julian_years(at)
    if check_model(model) != "auto":
        check_span(model, years)
        return functions[model](jd1, jd2)
    far = is_far(years)
    if not np.any(far):
        return functions["iau2006"](jd1, jd2)
    check_span("vondrak2011", years)
    if np.all(far):
        return functions["vondrak2011"](jd1, jd2)
    jd1, jd2 = np.broadcast_arrays(np.asarray(jd1, dtype=np.float64), np.asarray(jd2, dtype=np.float64))
    out = np.empty((*years.shape, *(3,) * tail))
    for name, part in (("vondrak2011", far), ("iau2006", ~far)):
        out[part] = functions[name](jd1[part], jd2[part])
    return out


def bias_precession_matrix(at: Instant, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the mean equator and equinox of date.

    Raises SpanError outside the model's span, FrameError for a model without a pole. Agrees with ERFA's `pmat06`
    and `ltpb` to rounding.
    """
    return by_model(at, model, _EQUATORS, 2)


def ecliptic_matrix(at: Instant, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the mean ecliptic and equinox of date.

    The ecliptic is the model's own: ERFA's `ecm06` and `ltecm`; for iau1976 and newcomb the equator of the model
    turned by its obliquity.
    """
    return by_model(at, model, _ECLIPTICS, 2)


def equator_pole(at: Instant, model: str = "auto") -> Float:
    """Return the pole (*shape, 3) of the mean equator of date, on ICRS axes."""
    return bias_precession_matrix(at, model)[..., 2, :]


def ecliptic_pole(at: Instant, model: str = "auto") -> Float:
    """Return the pole (*shape, 3) of the mean ecliptic of date, on ICRS axes."""
    return ecliptic_matrix(at, model)[..., 2, :]


def long_term_poles(years: Float | float) -> tuple[Float, Float]:
    """Return the poles (*shape, 3) of equator and ecliptic of Julian years, on the mean equator and equinox J2000.

    Vondrák, Capitaine & Wallace 2011 (ERFA's `ltpequ` and `ltpecl`), without the frame bias.
    """
    check_span("vondrak2011", np.asarray(years, dtype=np.float64))
    return np.asarray(erfa.ltpequ(years)), np.asarray(erfa.ltpecl(years))


# The models. Every function takes a two-part TT and returns matrices from ICRS axes.


def _equator_2006(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(erfa.pmat06(jd1, jd2))


def _ecliptic_2006(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(erfa.ecm06(jd1, jd2))


def _equator_long(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(erfa.ltpb(erfa.epj(jd1, jd2)))


def _ecliptic_long(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(erfa.ltecm(erfa.epj(jd1, jd2)))


def fk5_matrix() -> Float:
    """Return the matrix (3, 3) from ICRS axes to the axes of FK5 at J2000.

    The FK5 orientation as found by Hipparcos (ERFA's `fk5hip`), without the spin: the axes are those at J2000.
    """
    return _FK5.copy()


def fk4_matrix(jd1: Float | float, jd2: Float | float) -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the FK4 mean equator and equinox B1950, as realised at a date.

    The FK4–FK5 matrix for positions and its rate (Explanatory Supplement 1992, eq. 3.591-4), which are a rotation to
    1e-9 and a turn of 1.2″ a century; the rest is removed here. FK4 places need E-terms besides: see `colure.fk4`.
    """
    centuries = (julian_years((jd1, jd2)) - 2000.0) / 100.0
    return np.asarray(erfa.rv2m(centuries[..., None] * _FK4_TURN) @ _FK4)


def newcomb_matrix(from_year: Float | float, to_year: Float | float) -> Float:
    """Return Newcomb's precession (*shape, 3, 3) between mean equators of two Besselian years.

    Kinoshita's form of the Bessel–Newcomb angles (SAO Special Report 364, 1975), about tropical epoch B1850.
    """
    begin = (np.asarray(from_year, dtype=np.float64) - 1850.0) / 100.0
    t = (np.asarray(to_year, dtype=np.float64) - np.asarray(from_year, dtype=np.float64)) / 100.0
    rate = 2303.5548 + (1.39720 + 0.000059 * begin) * begin
    zeta = (rate + (0.30242 - 0.000269 * begin + 0.017996 * t) * t) * t
    z = (rate + (1.09478 + 0.000387 * begin + 0.018324 * t) * t) * t
    theta = 2005.1125 + (-0.85294 - 0.000365 * begin) * begin
    theta = (theta + (-0.42647 - 0.000365 * begin - 0.041802 * t) * t) * t
    return np.asarray(
        rotation_z(-z * ARCSEC) @ _rotation_y(theta * ARCSEC) @ rotation_z(-zeta * ARCSEC), dtype=np.float64
    )


def _rotation_y(angle: Float) -> Float:
    c, s = np.cos(angle), np.sin(angle)
    out = np.zeros((*np.shape(angle), 3, 3))
    out[..., 1, 1] = 1.0
    out[..., 0, 0] = out[..., 2, 2] = c
    out[..., 0, 2], out[..., 2, 0] = -s, s
    return out


def besselian_years(jd1: Float | float, jd2: Float | float) -> Float:
    """Return Besselian epochs of a two-part Julian date (Lieske 1979; ERFA's `epb`)."""
    return np.asarray(erfa.epb(jd1, jd2))


def newcomb_obliquity(jd1: Float | float, jd2: Float | float) -> Float:
    """Return Newcomb's mean obliquity (*shape), rad, by tropical centuries from 1900.0.

    Explanatory Supplement 1961, p. 98: 23°27′08.26″ − 46.845″ T − 0.0059″ T² + 0.00181″ T³ (from memory).
    """
    t = (besselian_years(jd1, jd2) - 1900.0) / 100.0
    return np.asarray((84428.26 + (-46.845 + (-0.0059 + 0.00181 * t) * t) * t) * ARCSEC)


def _equator_1976(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(erfa.pmat76(jd1, jd2) @ _FK5)


def _ecliptic_1976(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(rotation_x(erfa.obl80(jd1, jd2)) @ _equator_1976(jd1, jd2))


def _equator_newcomb(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(newcomb_matrix(1950.0, besselian_years(jd1, jd2)) @ fk4_matrix(jd1, jd2))


def _ecliptic_newcomb(jd1: Float | float, jd2: Float | float) -> Float:
    return np.asarray(rotation_x(newcomb_obliquity(jd1, jd2)) @ _equator_newcomb(jd1, jd2))


FK4_TO_FK5 = np.array(
    [
        [0.9999256782, -0.0111820611, -0.0048579477],
        [0.0111820610, 0.9999374784, -0.0000271765],
        [0.0048579479, -0.0000271474, 0.9999881997],
    ]
)
"""Positions of FK4 B1950 (no E-terms) to FK5 J2000 at epoch J2000, and below its change in rad per Julian century.

Explanatory Supplement 1992, eq. 3.591-4, as in ERFA's `fk425`.
"""
FK4_TO_FK5_RATE = (
    np.array(
        [
            [-0.000551, -0.238565, 0.435739],
            [0.238514, -0.002667, -0.008541],
            [-0.435623, 0.012254, 0.002117],
        ]
    )
    * ARCSEC
)


def _nearest_rotation(matrix: Float) -> Float:
    u, _, v = np.linalg.svd(matrix)
    return np.asarray(u @ v)


def _turn_of_fk4() -> Float:
    """Return the rotation vector (3,), rad per century, by which ICRS-fixed axes turn into FK4's."""
    skew = FK4_TO_FK5.T @ FK4_TO_FK5_RATE
    return np.array([skew[2, 1] - skew[1, 2], skew[0, 2] - skew[2, 0], skew[1, 0] - skew[0, 1]]) / 2.0


# ERFA gives the rotation from FK5 to Hipparcos; the transpose leads from ICRS axes to FK5's.
_FK5: Float = np.asarray(erfa.fk5hip()[0]).T
_FK4: Float = _nearest_rotation(FK4_TO_FK5).T @ _FK5
_FK4_TURN: Float = _turn_of_fk4()

_EQUATORS = {
    "iau2006": _equator_2006,
    "vondrak2011": _equator_long,
    "iau1976": _equator_1976,
    "newcomb": _equator_newcomb,
}
_ECLIPTICS = {
    "iau2006": _ecliptic_2006,
    "vondrak2011": _ecliptic_long,
    "iau1976": _ecliptic_1976,
    "newcomb": _ecliptic_newcomb,
}

"""Obliquity of the ecliptic by every model that has one, mean and true."""

from typing import NamedTuple

import erfa
import numpy as np

from colure import nutation, precession
from colure.arrays import ARCSEC, DEG, TWO_PI, Float, dot, norm
from colure.errors import FrameError, near_names
from colure.precession import Instant, check_span, is_far, julian_years, tt_parts


class Model(NamedTuple):
    """An obliquity model: its span in Julian years, and the reference to print."""

    name: str
    span: tuple[float, float]
    reference: str
    has_pole: bool


MODELS = {
    model.name: model
    for model in (
        Model("iau2006", precession.SPANS["iau2006"], "Capitaine, Wallace & Chapront 2003 (IAU 2006)", True),
        Model(
            "vondrak2011",
            precession.SPANS["vondrak2011"],
            "Vondrák, Capitaine & Wallace 2011, angle between the two poles",
            True,
        ),
        Model(
            "vondrak2011-fit",
            precession.SPANS["vondrak2011"],
            "Vondrák, Capitaine & Wallace 2011, separate fit (table 3)",
            False,
        ),
        Model("iau1976", precession.SPANS["iau1976"], "Lieske et al. 1977 (IAU 1976/1980)", True),
        Model("newcomb", precession.SPANS["newcomb"], "Newcomb 1895", True),
        Model("laskar1986", (-8000.0, 12000.0), "Laskar 1986", False),
    )
}
_SPANS = {name: model.span for name, model in MODELS.items()}

# Laskar 1986, A&A 157, 59, in powers of U = 10,000 Julian years from J2000, arcseconds.
_LASKAR = (84381.448, -4680.93, -1.55, 1999.25, -51.38, -249.67, -39.05, 7.12, 27.87, 5.79, 2.45)

# Vondrák, Capitaine & Wallace 2011, table 3: polynomial in Julian centuries, then (period in centuries, cos, sin).
_FIT_POLYNOMIAL = (84028.206305, 0.3624445, -0.00004039, -110e-9)
_FIT_TERMS = np.array(
    [
        (409.90, 753.872780, -1704.720302),
        (396.15, -247.805823, -862.308358),
        (537.22, 379.471484, 447.832178),
        (402.90, -53.880558, -889.571909),
        (417.15, -90.109153, 190.402846),
        (288.92, -353.600190, -56.564991),
        (4043.00, -63.115353, -296.222622),
        (306.00, -28.248187, -75.859952),
        (277.00, 17.703387, 67.473503),
        (203.00, 38.911307, 3.014055),
    ]
)


def check_model(name: str) -> str:
    """Return the name of an obliquity model or `auto`; raise FrameError with near names."""
    if name != "auto" and name not in MODELS:
        raise FrameError(
            f"obliquity model '{name}': unknown; expected auto, {', '.join(MODELS)}{near_names(name, MODELS)}"
        )
    return name


def _horner(coefficients: tuple[float, ...], x: Float) -> Float:
    out = np.full_like(x, coefficients[-1])
    for c in coefficients[-2::-1]:
        out = out * x + c
    return out


def _laskar(years: Float) -> Float:
    return _horner(_LASKAR, (years - 2000.0) / 10000.0) * ARCSEC


def _vondrak_fit(years: Float) -> Float:
    t = (years - 2000.0) / 100.0
    angle = TWO_PI * t[..., None] / _FIT_TERMS[:, 0]
    waves = np.cos(angle) @ _FIT_TERMS[:, 1] + np.sin(angle) @ _FIT_TERMS[:, 2]
    return np.asarray((_horner(_FIT_POLYNOMIAL, t) + waves) * ARCSEC)


def _vondrak_poles(years: Float) -> Float:
    equator, ecliptic = precession.long_term_poles(years)
    return np.arctan2(norm(np.cross(equator, ecliptic)), dot(equator, ecliptic))


def _near(jd1: float, jd2: float) -> bool:
    return abs((jd1 - precession.J2000) + jd2) <= precession.SEAM_YEARS * precession.YEAR


def mean(at: Instant, model: str = "auto") -> Float:
    """Return the mean obliquity (*shape), rad, by one of MODELS; `auto` as for precession.

    Raises SpanError outside the model's span and FrameError for an unknown model.
    """
    check_model(model)
    jd1, jd2 = tt_parts(at)
    if model == "auto" and isinstance(jd1, float) and isinstance(jd2, float) and _near(jd1, jd2):
        # One moment, as a chart asks for it: no arrays of no dimension.
        return np.asarray(erfa.obl06(jd1, jd2))
    years = julian_years(at)
    if model == "auto":
        far = is_far(years)
        if not np.any(far):
            return np.asarray(erfa.obl06(jd1, jd2))
        check_span("vondrak2011", years)
        if np.all(far):
            return _vondrak_poles(years)
        return np.where(far, _vondrak_poles(years), erfa.obl06(jd1, jd2))
    check_span(model, years, _SPANS)
    match model:
        case "iau2006":
            return np.asarray(erfa.obl06(jd1, jd2))
        case "vondrak2011":
            return _vondrak_poles(years)
        case "vondrak2011-fit":
            return _vondrak_fit(years)
        case "iau1976":
            return np.asarray(erfa.obl80(jd1, jd2))
        case "newcomb":
            return precession.newcomb_obliquity(jd1, jd2)
        case _:
            return _laskar(years)


def true(at: Instant, model: str = "auto") -> Float:
    """Return the true obliquity (*shape), rad: the mean one plus the nutation in obliquity.

    The nutation is IAU 2000A (2006), with iau1976 the IAU 1980 series that belongs to it.
    """
    return np.asarray(mean(at, model) + nutation.nutation(at, nutation.series_of(model))[1])


def mean_deg(years: Float | float, model: str = "auto") -> Float:
    """Return the mean obliquity in degrees for Julian epoch years (*shape)."""
    return np.asarray(mean(at_years(years), model) / DEG)


def at_years(years: Float | float) -> tuple[Float | float, Float | float]:
    """Return the two-part TT of Julian epoch years, which may lie far outside what a Moment reaches."""
    return precession.J2000, (np.asarray(years, dtype=np.float64) - 2000.0) * precession.YEAR


def disagreement(years: Float | float, model: str = "auto") -> Float:
    """Return the largest difference (*shape), rad, between a model and those others that cover the year.

    The long-term solution's two forms differ by 6″ at −3000: this is the honest size of the doubt.
    """
    at = at_years(years)
    own = mean(at, model)
    when = np.asarray(years, dtype=np.float64)
    worst = np.zeros(np.shape(own))
    for name in ("vondrak2011", "vondrak2011-fit", "laskar1986"):
        first, last = _SPANS[name]
        inside = (when >= first) & (when <= last)
        other = mean(at_years(np.where(inside, when, 2000.0)), name)
        worst = np.where(inside, np.maximum(worst, np.abs(other - own)), worst)
    return worst

"""How far each step of a ledger may be wrong: 1σ in arcseconds, with what the figure rests on.

Published figures here are quoted from memory and rounded up; the aberration's is measured against the DE440 kernel,
and those of the ephemeris, of ΔT and of the two precession models come from their own modules. NaN says that nothing is
known, not that nothing is wrong.
"""

import math

from colure import orientation
from colure.arrays import MAS
from colure.ledger.given import Source
from colure.moment import Moment
from colure.reduction import Observer
from colure.starfiles import FROM_GAIA, FROM_HIPPARCOS, NO_MOTION, SOURCE_MASK

Doubt = tuple[float, str]
UNKNOWN = math.nan
EXACT: Doubt = (0.0, "by definition")
IN_EPHEMERIS: Doubt = (0.0, "in that of the ephemeris")
NOT_GIVEN: Doubt = (UNKNOWN, "no uncertainty was given")

TURN_ARCSEC_S = 15.041067
"""How far the Earth turns in a second."""
HIPPARCOS_EPOCH = 1991.25
CATALOGUE_EPOCH = 2016.0

_STARS = {
    FROM_GAIA: (0.1, 0.05, "Gaia DR3, as stored"),
    FROM_HIPPARCOS: (0.6, 0.9, "Hipparcos, new reduction, typical"),
}
"""Position at its own epoch (mas) and motion (mas/yr) of the stars of each source."""
_TYCHO = (60.0, 2.5, "Tycho-2, typical")


def star_position(flags: int) -> Doubt:
    """Return the doubt of a catalogue position at J2016.0."""
    mas, motion, source = _STARS.get(flags & SOURCE_MASK, _TYCHO)
    if flags & SOURCE_MASK != FROM_GAIA:  # measured around 1991.25 and carried to 2016
        mas = math.hypot(mas, motion * (CATALOGUE_EPOCH - HIPPARCOS_EPOCH))
    return mas * 1e-3, source


def star_motion(flags: int, years: float) -> Doubt:
    """Return the doubt of a catalogue star's motion over years."""
    if flags & NO_MOTION:
        return UNKNOWN, "no motion is known"
    _, motion, source = _STARS.get(flags & SOURCE_MASK, _TYCHO)
    return motion * 1e-3 * abs(years), source


def star_parallax(parallax_mas: float, size_arcsec: float) -> Doubt:
    """Return the doubt of the parallax shift of a catalogue star."""
    if parallax_mas <= 0.0:
        return UNKNOWN, "no parallax is known"
    return size_arcsec * min(1.0 / parallax_mas, 1.0), "parallax ±1 mas, Hipparcos typical"


def is_universal(moment: Moment) -> bool:
    """Whether a moment was given by the turn of the Earth, so that TT, not the turn, is what ΔT leaves in doubt."""
    return moment.scale in ("UTC", "UT1")


def rotation(moment: Moment) -> float:
    """Return how far the Earth's turn is in doubt, arcsec."""
    if is_universal(moment):
        return 0.0005  # tides of less than a day, 0.03 ms, are not in the table
    return float(moment.delta_t_sigma_s) * TURN_ARCSEC_S


def body_position(bound_arcsec: float, rate_arcsec_s: float, moment: Moment) -> Doubt:
    """Return the doubt of an ephemeris position, and of TT where the moment was given in UT."""
    slip = float(moment.delta_t_sigma_s) * rate_arcsec_s if is_universal(moment) else 0.0
    return bound_arcsec + slip, "ephemeris, with ΔT × motion" if slip > 0.1 * bound_arcsec else "ephemeris"


def diurnal(size_arcsec: float, moment: Moment) -> Doubt:
    """Return the doubt of a shift that turns with the Earth."""
    return size_arcsec * rotation(moment) / 206264.8, "Earth rotation"


def light_time() -> Doubt:
    """Return the doubt of the light time solved in closed form: the third order of a body's motion is left out."""
    return 1e-5, "closed form"


def deflection(observer: Observer) -> Doubt:
    """Return the doubt of the deflection: that by planets, and by the Earth at a site, is left out."""
    if observer.origin == "site":
        return 4e-4, "deflection by Earth and planets left out"
    return 1e-4, "deflection by planets left out (at 1° from Jupiter)"


def aberration() -> Doubt:
    """Return the doubt of the annual aberration: of the Earth's velocity, tables against the DE440 kernel."""
    return 6e-6, "velocity of the embedded tables"


def refraction(size_arcsec: float, altitude_deg: float, observer: Observer) -> Doubt:
    """Return the doubt of the refraction.

    1 hPa and 2 °C where the air is known, 2 % and 10 °C where the standard air stands in; below 15° 0.07′ more, which
    is what Bennett claims for his formula.
    """
    site = observer.site
    known = observer.air is not None or (
        site is not None and site.pressure_hpa is not None and site.temperature_c is not None
    )
    part = 0.007 if known else 0.04
    low = 4.2 if altitude_deg < 15.0 else 0.0
    return math.hypot(part * size_arcsec, low), "air as given" if known else "standard air assumed"


def turn(name: str, model: str, years: float, lat_deg: float, moment: Moment) -> Doubt:
    """Return the doubt of a turn between axes; `years` from J2000, `lat_deg` the latitude in the axes of the turn."""
    centuries = years / 100.0
    match name:
        case "frame bias":
            if "FK5" in model or "1976" in model or "Newcomb" in model:
                return 0.0023, "link of FK5 to Hipparcos"
            return 0.0005, "origin of right ascension, IERS 2003"
        case "precession of the equator":
            if "1976" in model:
                return 0.30 * abs(centuries) + 0.0003, "rate found wrong by 0.30″ a century (IAU 2000)"
            if "Newcomb" in model:
                return 1.1 * abs(centuries) + 0.0003, "rate found wrong by 1.1″ a century (IAU 1976)"
            return 0.0003 + 0.0005 * centuries**2, "covers IAU 2006 − Vondrák 2011 at their seam, 2 mas"
        case "precession of the ecliptic":
            return 5e-5 * abs(centuries) + 1e-4 * centuries**2, "0.05 mas a century, growing outside the fit"
        case "precession":
            return 0.1, "regional errors of FK4"
        case "nutation":
            if "1980" in model:
                return 0.02, "terms of IAU 1980 against VLBI"
            far = 0.3 * (centuries / 50.0) ** 2  # arguments in doubt by a degree after 5,000 years
            return math.hypot(0.0003, far), "free core nutation left out"
        case "Earth rotation":
            return rotation(moment) * math.cos(math.radians(lat_deg)), "ΔT" if not is_universal(moment) else "UT1"
        case "polar motion":
            first, last = orientation.span()
            inside = first <= float(moment.jd_tt) <= last
            return (0.001, "IERS") if inside else (0.3, "the pole is not known")
        case "horizon of the site":
            return 5.0, "deflection of the vertical left out, typical"
        case "longitude from the Sun":
            return 0.01, "ephemeris"
    return EXACT


def start(given: Source) -> Doubt:
    """Return the doubt of the position that a ledger starts from."""
    if given.flags is not None:
        return star_position(given.flags)
    if given.sigma_arcsec is not None:
        return given.sigma_arcsec, "as read off the chart"
    if given.kind == "deepsky":
        return 1.0, "list of deep-sky objects, typical"
    return EXACT if given.kind in ("point", "constellation", "direction") else NOT_GIVEN


def sky(
    step: str,
    size_arcsec: float,
    moment: Moment,
    observer: Observer,
    is_body: bool,
    flags: int | None,
    parallax: float | None,
    years: float,
) -> Doubt:
    """Return the doubt of a step on the sky; `flags`, `parallax` (rad) and `years` are those of a star."""
    match step:
        case "space motion":
            return NOT_GIVEN if flags is None else star_motion(flags, years)
        case "annual parallax":
            if is_body:
                return IN_EPHEMERIS
            return NOT_GIVEN if flags is None else star_parallax((parallax or 0.0) / MAS, size_arcsec)
        case "diurnal parallax" | "diurnal aberration":
            return diurnal(size_arcsec, moment)
        case "light time":
            return light_time() if is_body else (0.0, "in that of the motion")
        case "deflection":
            return deflection(observer)
        case "annual aberration":
            return aberration()
        case "refraction":
            # The lift itself tells the altitude well enough: 58″ × tan z at standard pressure.
            lift = 58.0 * max(observer.atmosphere.pressure_hpa, 1.0) / 1010.0
            return refraction(size_arcsec, math.degrees(math.atan2(lift, size_arcsec)), observer)
    return EXACT

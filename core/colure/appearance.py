"""How a body looks from where the observer is: magnitude, apparent diameter, phase and bright limb of each."""

from collections.abc import Callable

import numpy as np

from colure import phases, photometry
from colure.arrays import ARCSEC, DEG, Float, dot, norm, unit
from colure.ephemeris import KM_PER_AU

RADIUS_KM = {
    # Equatorial radii: IAU working group on cartographic coordinates 2015 (Archinal et al. 2018). The Sun's is the
    # 959.63″ at 1 au of the almanacs and of eclipse work, not the nominal 695700 km.
    "sun": 696000.0,
    "mercury": 2440.53,
    "venus": 6051.8,
    "earth": 6378.1366,
    "moon": 1737.4,
    "mars": 3396.19,
    "jupiter": 71492.0,
    "saturn": 60268.0,
    "uranus": 25559.0,
    "neptune": 24764.0,
    "pluto": 1188.3,
}
J2000_ECLIPTIC_POLE = np.array([0.0, -np.sin(84381.406 * ARCSEC), np.cos(84381.406 * ARCSEC)])
"""North pole of the mean ecliptic of J2000.0 on ICRS axes, to the 0.02″ of the frame bias."""


def diameter_arcsec(body: str, distance_au: Float) -> Float:
    """Return the apparent equatorial diameter (...) in arcsec; NaN for a point that is no body."""
    if body not in RADIUS_KM:
        return np.full_like(np.asarray(distance_au, dtype=np.float64), np.nan)
    return np.asarray(2.0 * phases.semidiameter(RADIUS_KM[body], np.asarray(distance_au) * KM_PER_AU) / ARCSEC)


def _latitude(pole: Float, towards: Float) -> Float:
    """Return the planetocentric latitude, degrees, of the point below a direction from the planet's centre."""
    return np.asarray(np.arcsin(np.clip(dot(pole, unit(towards)), -1.0, 1.0)) / DEG)


def saturn_latitudes(from_sun: Float, from_observer: Float, centuries: Float) -> tuple[Float, Float]:
    """Return the planetocentric latitudes, degrees, of the Sun and the observer above Saturn's ring plane."""
    pole = photometry.pole(photometry.SATURN_POLE, centuries)
    return _latitude(pole, -from_sun), _latitude(pole, -from_observer)


def uranus_latitudes(from_sun: Float, from_observer: Float, centuries: Float) -> tuple[Float, Float]:
    """Return the planetographic latitudes, degrees, of the Sun and the observer at Uranus."""
    pole = photometry.pole(photometry.URANUS_POLE, centuries)
    squash = (1.0 - photometry.URANUS_FLATTENING) ** 2

    def graphic(lat: Float) -> Float:
        return np.asarray(np.arctan(np.tan(lat * DEG) / squash) / DEG)

    return graphic(_latitude(pole, -from_sun)), graphic(_latitude(pole, -from_observer))


def mars_angles(from_sun: Float, from_observer: Float, days: Float) -> tuple[Float, Float]:
    """Return the two angles, degrees, in which the magnitude of Mars is tabulated.

    The west longitude midway between the sub-observer and sub-solar points, at `days` from J2000 TDB when the light
    left, and the Sun's areocentric longitude as the 2018 paper takes it: heliocentric longitude less 85°.
    """
    pole = photometry.pole(photometry.MARS_POLE, days / 36525.0)
    node = unit(np.stack([-pole[..., 1], pole[..., 0], np.zeros_like(pole[..., 0])], axis=-1))
    beside = np.cross(pole, node)
    turn = photometry.MARS_MERIDIAN[0] + photometry.MARS_MERIDIAN[1] * days

    def west(towards: Float) -> Float:
        return np.asarray(turn - np.arctan2(dot(towards, beside), dot(towards, node)) / DEG)

    observer, sun = west(-from_observer), west(-from_sun)
    middle = observer + 0.5 * ((sun - observer + 180.0) % 360.0 - 180.0)
    sin_e, cos_e = -J2000_ECLIPTIC_POLE[1], J2000_ECLIPTIC_POLE[2]
    lon = np.arctan2(from_sun[..., 1] * cos_e + from_sun[..., 2] * sin_e, from_sun[..., 0]) / DEG
    return middle % 360.0, np.asarray((lon - 85.0) % 360.0)


def magnitude(body: str, from_sun: Float, from_observer: Float, jd_tdb: Float) -> Float:
    """Return the apparent V magnitude (...) of a body; NaN where no formula reaches (`photometry.reason`).

    `from_sun` and `from_observer` (..., 3) are the vectors to the body, au, ICRS; `jd_tdb` when its light left.
    """
    r, delta = norm(from_sun), norm(from_observer)
    if body == "sun":
        return photometry.sun(delta)
    phase = phases.phase_angle(from_sun, from_observer) / DEG
    days = np.asarray(jd_tdb, dtype=np.float64) - 2451545.0
    if body == "mars":
        return photometry.mars(r, delta, phase, *mars_angles(from_sun, from_observer, days))
    if body == "saturn":
        return photometry.saturn(r, delta, phase, *saturn_latitudes(from_sun, from_observer, days / 36525.0))
    if body == "uranus":
        return photometry.uranus(r, delta, phase, *uranus_latitudes(from_sun, from_observer, days / 36525.0))
    if body == "neptune":
        return photometry.neptune(r, delta, phase, 2000.0 + days / 365.25)
    plain: dict[str, Callable[[Float, Float, Float], Float]] = {
        "mercury": photometry.mercury,
        "venus": photometry.venus,
        "earth": photometry.earth,
        "jupiter": photometry.jupiter,
        "pluto": photometry.pluto,
        "moon": photometry.moon,
    }
    if body not in plain:
        return np.full_like(r, np.nan)
    return plain[body](r, delta, phase)

"""The local sphere: hour angle and declination to azimuth and altitude, parallactic angle, air mass, and the ecliptic.

Azimuths run from north through east. Angles are radians of any shape that broadcasts.
"""

import erfa
import numpy as np

from colure.arrays import DEG, TWO_PI, Float
from colure.ephemeris import KM_PER_AU
from colure.errors import SiteError, near_names

Angle = Float | float


def altaz(hour_angle: Angle, dec: Angle, lat: Angle) -> tuple[Float, Float]:
    """Return azimuth (0 to 2π) and altitude of an hour angle and declination at a geodetic latitude."""
    az, alt = erfa.hd2ae(hour_angle, dec, lat)
    return np.asarray(az), np.asarray(alt)


def hadec(az: Angle, alt: Angle, lat: Angle) -> tuple[Float, Float]:
    """Return hour angle (0 to 2π) and declination of an azimuth and altitude."""
    ha, dec = erfa.ae2hd(az, alt, lat)
    return np.asarray(ha) % TWO_PI, np.asarray(dec)


def geocentric_site(lat: Angle, height_m: Angle, sidereal: Angle) -> Float:
    """Return the vector (..., 3), au, from the Earth's centre to a site, in the equator of date (WGS84).

    `sidereal` is the local sidereal time; with the longitude in its place the axes are Earth-fixed.
    """
    return np.asarray(erfa.gd2gc(1, sidereal, lat, height_m)) / (KM_PER_AU * 1000.0)


def parallactic_angle(hour_angle: Angle, dec: Angle, lat: Angle) -> Float:
    """Return the angle at the object from the pole to the zenith, −π to π, negative east of the meridian."""
    return np.asarray(erfa.hd2pa(hour_angle, dec, lat))


def _kasten_young(alt_deg: Float) -> Float:
    return np.asarray(1.0 / (np.sin(alt_deg * DEG) + 0.50572 * (alt_deg + 6.07995) ** -1.6364))


def _hardie(alt_deg: Float) -> Float:
    # Hardie 1962; held at zenith distance 1.52 rad, beyond which its cubic turns.
    s = 1.0 / np.cos(np.minimum(90.0 * DEG - alt_deg * DEG, 1.52)) - 1.0
    return np.asarray(1.0 + s * (0.9981833 - s * (0.002875 + 0.0008083 * s)))


def _secant(alt_deg: Float) -> Float:
    return np.asarray(1.0 / np.sin(np.maximum(alt_deg, 0.01) * DEG))


AIRMASS_MODELS = {"kasten-young": _kasten_young, "hardie": _hardie, "secant": _secant}


def airmass(altitude: Angle, model: str = "kasten-young") -> Float:
    """Return the relative air mass (...) at an apparent altitude: 1 at the zenith, 38 at the horizon, NaN below it.

    Kasten & Young 1989 by default (good to 0.5 % at every altitude); "hardie" (1962) and "secant" by name.
    """
    if model not in AIRMASS_MODELS:
        known = ", ".join(AIRMASS_MODELS)
        raise SiteError(f"air mass: no model '{model}'{near_names(model, AIRMASS_MODELS)}; known: {known}")
    alt_deg = np.asarray(altitude, dtype=np.float64) / DEG
    above = alt_deg >= 0.0
    mass = np.maximum(AIRMASS_MODELS[model](np.where(above, alt_deg, 0.0)), 1.0)
    return np.where(above, mass, np.nan)


def ecliptic_on_horizon(obliquity: Angle, lat: Angle, sidereal: Angle) -> Float:
    """Return the ecliptic longitude (0 to 2π) that stands on the western horizon; the other point is half a turn away.

    `sidereal` is the local apparent sidereal time. Meeus, Astronomical Algorithms, eq. 14.2.
    """
    s, e = np.sin(sidereal), np.asarray(obliquity)
    return np.asarray(np.arctan2(-np.cos(sidereal), np.sin(e) * np.tan(lat) + np.cos(e) * s) % TWO_PI)


def ecliptic_to_horizon(obliquity: Angle, lat: Angle, sidereal: Angle) -> Float:
    """Return the angle (0 to π) between the ecliptic and the horizon, Meeus eq. 14.3."""
    e, f = np.asarray(obliquity), np.asarray(lat)
    return np.asarray(np.arccos(np.cos(e) * np.sin(f) - np.sin(e) * np.cos(f) * np.sin(sidereal)))


def diurnal_path_to_horizon(dec: Angle, lat: Angle) -> Float:
    """Return the angle between a body's daily path and the horizon where it rises or sets; NaN if it never does."""
    d, f = np.asarray(dec, dtype=np.float64), np.asarray(lat, dtype=np.float64)
    b = np.tan(d) * np.tan(f)
    with np.errstate(invalid="ignore"):
        c = np.sqrt(1.0 - b * b)
    return np.asarray(np.arctan2(c * np.cos(d), np.tan(f)))

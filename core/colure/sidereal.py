"""The turn of the Earth: rotation angle, sidereal times, and the matrix from ICRS axes to the ground."""

from functools import lru_cache
from typing import Protocol

import erfa
import numpy as np

from colure import ofdate
from colure.arrays import DEG, TWO_PI, Float
from colure.errors import FrameError
from colure.moment import Moment


class Ground(Protocol):
    """A place on the ground: geodetic east longitude and latitude in degrees, as a Site has them."""

    @property
    def lon_deg(self) -> float:
        """Degrees, east positive."""
        ...

    @property
    def lat_deg(self) -> float:
        """Degrees, north positive."""
        ...


def era(moment: Moment) -> Float:
    """Return the Earth rotation angle (*shape), rad, 0 to 2π (IAU 2000)."""
    return np.asarray(erfa.era00(*moment.ut1))


def gmst(moment: Moment, model: str = "iau2006") -> Float:
    """Return Greenwich mean sidereal time (*shape), rad, 0 to 2π: IAU 2006, or `iau1982` as older almanacs have it.

    The polynomial of IAU 2006 serves at every date. Against the equinox of the long-term model it is 0.02″ off at 1800,
    1.3″ at −1000 and 10″ at −3000, where ΔT is in doubt by far more.
    """
    if model == "iau1982":
        return np.asarray(erfa.gmst82(*moment.ut1))
    if model != "iau2006":
        raise FrameError(f"sidereal time '{model}': expected iau2006 or iau1982")
    return np.asarray(erfa.gmst06(*moment.ut1, *moment.tt))


def gast(moment: Moment, model: str = "auto") -> Float:
    """Return Greenwich apparent sidereal time (*shape), rad, 0 to 2π; within 4 µas of ERFA's `gst06a`."""
    return np.asarray((gmst(moment) + ofdate.equinoxes(moment, model)) % TWO_PI)


def equation_of_equinoxes(moment: Moment, model: str = "auto") -> Float:
    """Return apparent minus mean sidereal time (*shape), rad."""
    return ofdate.equinoxes(moment, model)


def equation_of_origins(moment: Moment, model: str = "auto") -> Float:
    """Return the Earth rotation angle minus the apparent sidereal time (*shape), rad, −π to π."""
    return ofdate.origins(moment, model)


def local(moment: Moment, site: Ground, *, apparent: bool = True) -> Float:
    """Return local sidereal time (*shape), rad, 0 to 2π, at a site's east longitude."""
    greenwich = gast(moment) if apparent else gmst(moment)
    return np.asarray((greenwich + site.lon_deg * DEG) % TWO_PI)


def polar_motion_matrix(moment: Moment) -> Float:
    """Return the matrix (*shape, 3, 3) from the terrestrial intermediate system to the ITRS (IERS 2010)."""
    xp, yp = moment.polar_motion
    return np.asarray(erfa.pom00(xp, yp, erfa.sp00(*moment.tt)))


def terrestrial_matrix(moment: Moment, *, polar_motion: bool = True, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the Earth-fixed ITRS axes.

    By the equinox: polar motion × sidereal time × nutation × precession × bias; equal to ERFA's `c2t06a` to 0.01 mas.
    """
    if isinstance(moment.tt1, float):
        return _ground(moment.tt1, float(moment.tt2), polar_motion, model)
    return _terrestrial(moment, polar_motion, model)


@lru_cache(maxsize=64)
def _ground(tt1: float, tt2: float, polar_motion: bool, model: str) -> Float:
    # One moment asks twice at least: for the observer's place and for its horizon.
    matrix = _terrestrial(Moment(tt1, tt2), polar_motion, model)
    matrix.flags.writeable = False
    return matrix


def _terrestrial(moment: Moment, polar_motion: bool, model: str) -> Float:
    turned = ofdate.turned(ofdate.true_equator_matrix(moment, model), gast(moment, model))
    return np.asarray(polar_motion_matrix(moment) @ turned if polar_motion else turned)


def horizon_matrix(moment: Moment, site: Ground, *, polar_motion: bool = True, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to a site's horizon: x north, y east, z the geodetic zenith.

    These axes are left-handed (determinant −1), so that the longitude in them is the azimuth from north through
    east. The zenith is the normal of the ellipsoid, without a deflection of the vertical.
    """
    lon, lat = site.lon_deg * DEG, site.lat_deg * DEG
    sl, cl, sb, cb = np.sin(lon), np.cos(lon), np.sin(lat), np.cos(lat)
    local_axes = np.array([[-sb * cl, -sb * sl, cb], [-sl, cl, 0.0], [cb * cl, cb * sl, sb]])
    return np.asarray(local_axes @ terrestrial_matrix(moment, polar_motion=polar_motion, model=model))

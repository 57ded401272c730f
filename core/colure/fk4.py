"""FK4, the catalogue system of B1950: E-terms of aberration, its own equinox, and its slow turn against FK5.

A catalogue place of FK4 contains the elliptic part of the annual aberration (the E-terms), and its axes turn by 1.2″ a
century against an inertial frame, so it is reached by no rotation and needs the epoch of observation. The recipe is
that of Aoki et al. 1983 and Smith et al. 1989 (Explanatory Supplement 1992, 3.59), for a source that does not move in
FK5; other equinoxes than B1950 are reached with Newcomb's precession. FK5 axes are joined to ICRS axes without spin.
`star_to_fk5` and `star_from_fk5` carry a star with motion, parallax and radial velocity.
"""

import erfa
import numpy as np

from colure import precession
from colure.arrays import ARCSEC, DEG, Float, dot, rotate, unit

_E_B1950 = np.array([-1.62557e-6, -0.31919e-6, -0.13843e-6])
_E_RATE = np.array([1.245e-3, -1.580e-3, -0.659e-3]) * ARCSEC
"""E-terms at B1950, rad, and their change per tropical century (Explanatory Supplement 1992, eq. 3.591-2, -3)."""
ABERRATION_CONSTANT = 20.49552
"""Constant of aberration of FK4's E-terms, arcseconds (Smith et al. 1989)."""


def e_terms(year: Float | float) -> Float:
    """Return the E-terms vector (*shape, 3), rad, on the mean equator and equinox of a Besselian year.

    Smith et al. 1989, AJ 97, 265: eccentricity, obliquity and longitude of perihelion of the Sun's orbit (Newcomb).
    """
    t = (np.asarray(year, dtype=np.float64) - 1950.0) * 1.00002135903e-2
    eccentricity = 0.01673011 - (0.00004193 + 0.000000126 * t) * t
    obliquity = (84404.836 - (46.8495 + (0.00319 + 0.00181 * t) * t) * t) * ARCSEC
    perihelion = (1015489.951 + (6190.67 + (1.65 + 0.012 * t) * t) * t) * ARCSEC
    k = eccentricity * ABERRATION_CONSTANT * ARCSEC
    c = np.cos(perihelion)
    return np.stack([k * np.sin(perihelion), -k * c * np.cos(obliquity), -k * c * np.sin(obliquity)], axis=-1)


def _terms(equinox: float, epoch: Float | float | None) -> Float:
    """Return the E-terms at the epoch of observation on the axes of the equinox."""
    base = _E_B1950 if equinox == 1950.0 else e_terms(equinox)
    if epoch is None:
        return base
    change = precession.newcomb_matrix(1950.0, equinox) @ _E_RATE
    return np.asarray(base + np.asarray(epoch - np.asarray(equinox))[..., None] / 100.0 * change)


def remove_e_terms(vectors: Float, equinox: float, epoch: Float | float | None = None) -> Float:
    """Return unit vectors (..., 3) of FK4 freed of the E-terms; by default those of the equinox."""
    r = unit(vectors)
    a = _terms(equinox, epoch)
    return unit(r - (a - dot(r, a)[..., None] * r))


def add_e_terms(vectors: Float, equinox: float, epoch: Float | float | None = None) -> Float:
    """Return unit vectors (..., 3) with the E-terms added: the exact inverse of `remove_e_terms`."""
    p = unit(vectors)
    a = _terms(equinox, epoch)
    r = p
    # Each turn gains a factor of 3e6: three reach rounding.
    for _ in range(3):
        r = unit(p * _length(r, a)[..., None] + a - dot(r, a)[..., None] * r)
    return r


def _length(r: Float, a: Float) -> Float:
    s = r - (a - dot(r, a)[..., None] * r)
    return np.asarray(np.sqrt(dot(s, s)))


def _to_fk5_matrix(epoch: Float | float) -> Float:
    """Return the matrix (*shape, 3, 3) from FK4 (no E-terms) B1950 at an epoch to FK5 J2000."""
    julian = np.asarray(erfa.epj(*erfa.epb2jd(np.asarray(epoch, dtype=np.float64))))
    return np.asarray(precession.FK4_TO_FK5 + ((julian - 2000.0) / 100.0)[..., None, None] * precession.FK4_TO_FK5_RATE)


def to_fk5(
    vectors: Float, equinox: float = 1950.0, epoch: Float | float | None = None, *, e_terms: bool = True
) -> Float:
    """Return unit vectors (..., 3) on the axes of FK5 J2000 for FK4 ones of a Besselian equinox and epoch.

    For a source without motion in FK5. Agrees with ERFA's `fk45z` at B1950 to 0.01 mas.
    """
    at = equinox if epoch is None else epoch
    p = remove_e_terms(vectors, equinox, at) if e_terms else unit(vectors)
    if equinox != 1950.0:
        p = p @ precession.newcomb_matrix(1950.0, equinox)
    return unit(rotate(_to_fk5_matrix(at), p))


def from_fk5(
    vectors: Float, equinox: float = 1950.0, epoch: Float | float | None = None, *, e_terms: bool = True
) -> Float:
    """Return unit vectors (..., 3) of FK4 for ones on the axes of FK5 J2000: the exact inverse of `to_fk5`."""
    at = equinox if epoch is None else epoch
    p = unit(rotate(np.asarray(np.linalg.inv(_to_fk5_matrix(at)), dtype=np.float64), vectors))
    if equinox != 1950.0:
        p = p @ precession.newcomb_matrix(1950.0, equinox).T
    return add_e_terms(p, equinox, at) if e_terms else p


def to_icrs(vectors: Float, equinox: float, epoch: Float | float | None = None, *, e_terms: bool = True) -> Float:
    """Return unit vectors (..., 3) on ICRS axes for FK4 ones."""
    return np.asarray(to_fk5(vectors, equinox, epoch, e_terms=e_terms) @ precession.fk5_matrix())


def from_icrs(vectors: Float, equinox: float, epoch: Float | float | None = None, *, e_terms: bool = True) -> Float:
    """Return unit vectors (..., 3) of FK4 for ones on ICRS axes."""
    return from_fk5(vectors @ precession.fk5_matrix().T, equinox, epoch, e_terms=e_terms)


def galactic_1958() -> Float:
    """Return the matrix (3, 3) from FK4 B1950 axes to galactic ones by the IAU definition of 1958.

    Pole at α 12h 49m, δ +27.4°; the centre at position angle 123° there (Blaauw et al. 1960, MNRAS 121, 123).
    """
    pole = erfa.s2c(192.25 * DEG, 27.4 * DEG)
    east = np.array([-np.sin(192.25 * DEG), np.cos(192.25 * DEG), 0.0])
    centre = np.cos(123.0 * DEG) * np.cross(pole, east) + np.sin(123.0 * DEG) * east
    return np.array([centre, np.cross(pole, centre), pole])


def star_to_fk5(
    ra: Float, dec: Float, pm_ra: Float, pm_dec: Float, parallax: Float, rv: Float
) -> tuple[Float, Float, Float, Float, Float, Float]:
    """Return a star's FK5 J2000 place and motion for its FK4 B1950 ones (ERFA's `fk425`).

    Angles in radians; motions in radians per tropical year (FK4) and Julian year (FK5), in right ascension without
    the cosine of the declination; parallax in arcseconds, radial velocity in km/s.
    """
    ra5, dec5, pr5, pd5, px5, rv5 = erfa.fk425(ra, dec, pm_ra, pm_dec, parallax, rv)
    return ra5, dec5, pr5, pd5, px5, rv5


def star_from_fk5(
    ra: Float, dec: Float, pm_ra: Float, pm_dec: Float, parallax: Float, rv: Float
) -> tuple[Float, Float, Float, Float, Float, Float]:
    """Return a star's FK4 B1950 place and motion for its FK5 J2000 ones (ERFA's `fk524`); units as `star_to_fk5`."""
    ra4, dec4, pr4, pd4, px4, rv4 = erfa.fk524(ra, dec, pm_ra, pm_dec, parallax, rv)
    return ra4, dec4, pr4, pd4, px4, rv4

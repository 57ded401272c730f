"""The axes of date: true equator, true ecliptic and celestial intermediate system, as matrices from ICRS axes."""

import math

import erfa
import numpy as np

from colure import nutation, obliquity, precession
from colure.arrays import Float
from colure.errors import FrameError
from colure.precession import Instant, tt_parts


def true_equator_matrix(at: Instant, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the true equator and equinox of date.

    Nutation is IAU 2000A (2006), with iau1976 the IAU 1980 series; `newcomb` has no series and is refused.
    Agrees with ERFA's `pnm06a` to 0.01 mas within 200 years of J2000.
    """
    dpsi, deps = _nutation(at, model)
    mean = precession.bias_precession_matrix(at, model)
    return np.asarray(erfa.rxr(nutation.matrix(obliquity.mean(at, model), dpsi, deps), mean))


def true_ecliptic_matrix(at: Instant, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the mean ecliptic of date, longitude from the true equinox."""
    return turned(precession.ecliptic_matrix(at, model), -_nutation(at, model)[0])


def cirs_matrix(at: Instant, model: str = "auto") -> Float:
    """Return the matrix (*shape, 3, 3) from ICRS axes to the celestial intermediate system (CIP and CIO) of date."""
    return turned(true_equator_matrix(at, model), -origins(at, model))


def turned(matrix: Float, angle: Float | float) -> Float:
    """Return matrices (*shape, 3, 3) whose target axes are turned by `angle` (*shape) about their z."""
    if matrix.ndim == 2 and np.ndim(angle) == 0:
        a, b = math.cos(angle), math.sin(angle)
        return np.asarray(np.array([[a, b, 0.0], [-b, a, 0.0], [0.0, 0.0, 1.0]]) @ matrix)
    # Two rows change: for many moments a product of whole matrices would cost five times as much.
    c, s = np.cos(angle)[..., None], np.sin(angle)[..., None]
    out = np.empty(np.broadcast_shapes(matrix.shape, (*np.shape(angle), 3, 3)))
    out[..., 0, :] = c * matrix[..., 0, :] + s * matrix[..., 1, :]
    out[..., 1, :] = c * matrix[..., 1, :] - s * matrix[..., 0, :]
    out[..., 2, :] = matrix[..., 2, :]
    return out


def origins(at: Instant, model: str = "auto") -> Float:
    """Return the equation of the origins (*shape), rad: Earth rotation angle minus apparent sidereal time.

    It is the right ascension of the CIO origin measured from the true equinox, with the sign of IAU 2006. The
    sidereal time is IAU 2006 with the complementary terms of 2000; 4 µas from ERFA's `eo06a`.
    """
    jd1, jd2 = tt_parts(at)
    # The Earth rotation angle cancels: any UT1 serves.
    accumulated = erfa.gmst06(precession.J2000, 0.0, jd1, jd2) - erfa.era00(precession.J2000, 0.0)
    turn = np.asarray(accumulated + equinoxes(at, model))
    return np.asarray(-((turn + np.pi) % (2.0 * np.pi) - np.pi))


def equinoxes(at: Instant, model: str = "auto") -> Float:
    """Return the equation of the equinoxes (*shape), rad: apparent minus mean sidereal time."""
    jd1, jd2 = tt_parts(at)
    dpsi, _ = _nutation(at, model)
    return np.asarray(dpsi * np.cos(obliquity.mean(at, model)) + erfa.eect00(jd1, jd2))


def _nutation(at: Instant, model: str) -> tuple[Float, Float]:
    if model == "newcomb":
        raise FrameError("model 'newcomb': no nutation series belongs to it; expected kind 'mean', or another model")
    return nutation.nutation(at, nutation.series_of(model))

"""How fast precession runs: the annual rates of equator, ecliptic and equinox, taken from any model's matrices."""

from collections.abc import Callable

import erfa
import numpy as np

from colure import precession
from colure.arrays import Float, rotate
from colure.precession import Instant, tt_parts

_STEP_DAYS = 365.25 / 4.0
"""Half the span of the difference: the chord for the arc costs 3e-6″ a century at this step, rounding less."""

ANGLES_2006 = (
    "eps0", "psia", "oma", "bpa", "bqa", "pia", "bpia", "epsa", "chia", "za", "zetaa", "thetaa", "pa", "gam", "phi",
    "psi",
)  # fmt: skip
"""Names of the IAU 2006 precession angles, in ERFA's order."""


def angles(at: Instant) -> dict[str, Float]:
    """Return the IAU 2006 precession angles (*shape), rad, by the names of ANGLES_2006 (Capitaine et al. 2003)."""
    jd1, jd2 = tt_parts(at)
    precession.check_span("iau2006", precession.julian_years(at))
    return dict(zip(ANGLES_2006, (np.asarray(a) for a in erfa.p06e(jd1, jd2)), strict=True))


def equatorial(at: Instant, model: str = "auto") -> tuple[Float, Float]:
    """Return m and n (*shape), rad per Julian year: the yearly precession in right ascension and in declination.

    At a right ascension α and declination δ it is m + n sin α tan δ and n cos α.
    """
    turn = _turn(at, model, precession.bias_precession_matrix)
    return turn[..., 2], -turn[..., 1]


def general(at: Instant, model: str = "auto") -> Float:
    """Return the general precession in longitude (*shape), rad per Julian year, on the moving ecliptic."""
    return _turn(at, model, precession.ecliptic_matrix)[..., 2]


def ecliptic_turn(at: Instant, model: str = "auto") -> tuple[Float, Float]:
    """Return the yearly motion of the ecliptic's pole as components (*shape), rad per Julian year.

    The first is the rate of P_A = sin π sin Π, the second of Q_A = sin π cos Π, at the moment itself.
    """
    turn = _turn(at, model, precession.ecliptic_matrix)
    return -turn[..., 1], -turn[..., 0]


def _turn(at: Instant, model: str, matrix: Callable[[Instant, str], Float]) -> Float:
    """Return the rate of turn (*shape, 3), rad per Julian year, of the fixed sky on the axes of date."""
    # The seam of the automatic model would show as a jump: both ends are taken with the model of the middle.
    jd1, jd2 = tt_parts(at)
    jd1, jd2 = np.asarray(jd1, dtype=np.float64), np.asarray(jd2, dtype=np.float64)
    if model == "auto":
        far = precession.is_far(precession.julian_years(at))
        if np.any(far) and not np.all(far):
            near = _turn(at, "iau2006", matrix)
            return np.where(far[..., None], _turn(at, "vondrak2011", matrix), near)
        model = "vondrak2011" if np.any(far) else "iau2006"
    after = matrix((jd1, jd2 + _STEP_DAYS), model)
    before = matrix((jd1, jd2 - _STEP_DAYS), model)
    now = matrix((jd1, jd2), model)
    rate = (after - before) / (2.0 * _STEP_DAYS / precession.YEAR)
    # For axes that turn with angular velocity w the sky turns with −w: S = dM/dt Mᵀ is the cross-product matrix.
    skew = rate @ np.swapaxes(now, -1, -2)
    return np.stack(
        [
            (skew[..., 2, 1] - skew[..., 1, 2]) / 2.0,
            (skew[..., 0, 2] - skew[..., 2, 0]) / 2.0,
            (skew[..., 1, 0] - skew[..., 0, 1]) / 2.0,
        ],
        axis=-1,
    )


def drift(vectors: Float, at: Instant, model: str = "auto") -> Float:
    """Return the yearly change (..., 3) of mean equatorial vectors of date by precession alone, rad per year."""
    turn = _turn(at, model, precession.bias_precession_matrix)
    local = rotate(precession.bias_precession_matrix(at, model), vectors)
    return np.cross(turn, local)

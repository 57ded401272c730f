"""FK4 against ERFA and astropy: E-terms, the equinox, and the epoch of observation."""

import erfa
import numpy as np
import pytest

from colure import fk4, frames
from colure.arrays import MAS, Float, separation, unit


def directions(count: int = 400) -> Float:
    return unit(np.random.default_rng(20260805).normal(size=(count, 3)))


@pytest.mark.parametrize("epoch", [1900.0, 1950.0, 1983.5, 2026.0])
def test_agrees_with_erfa_at_b1950(epoch: float) -> None:
    v = directions()
    theirs = erfa.s2c(*erfa.fk45z(*erfa.c2s(v), epoch))
    assert separation(fk4.to_fk5(v, 1950.0, epoch), theirs).max() < 0.01 * MAS
    # ERFA's way back uses a rounded inverse: 0.018 mas from being one.
    ra, dec, *_ = erfa.fk54z(*erfa.c2s(v), epoch)
    assert separation(fk4.from_fk5(v, 1950.0, epoch), erfa.s2c(ra, dec)).max() < 0.03 * MAS


@pytest.mark.parametrize(("equinox", "epoch"), [("B1950", 1950.0), ("B1950", 1978.3), ("B1875", 1930.0)])
def test_agrees_with_astropy(equinox: str, epoch: float) -> None:
    from astropy import units as u
    from astropy.coordinates import FK4, ICRS, FK4NoETerms, SkyCoord
    from astropy.time import Time

    v = directions()
    lon, lat = erfa.c2s(v)
    sky = SkyCoord(lon * u.rad, lat * u.rad, frame=ICRS())
    for name, theirs in (("fk4", FK4), ("fk4-no-e", FK4NoETerms)):
        end = sky.transform_to(theirs(equinox=equinox, obstime=Time(epoch, format="byear")))
        want = unit(end.cartesian.xyz.value.T)
        ours = frames.from_icrs(v, f"equator/{name}/{equinox}", epoch=epoch)
        assert separation(ours, want).max() < 15.0 * MAS


def test_e_terms_are_a_third_of_an_arcsecond_and_undone_exactly() -> None:
    # The constant of the E-terms is 0.343″ (aberration constant times eccentricity): a bound, and nearly reached.
    v = directions()
    shift = separation(fk4.add_e_terms(v, 1950.0), v) / MAS
    assert 335.0 < shift.max() < 344.0
    for epoch in (None, 1900.0, 2000.0):
        there = fk4.add_e_terms(v, 1950.0, epoch)
        assert separation(fk4.remove_e_terms(there, 1950.0, epoch), v).max() < 2e-15


def test_one_observation_has_one_epoch_between_two_equinoxes() -> None:
    # Between two equinoxes of FK4 only Newcomb's precession acts: no turn of FK4 against FK5 comes in (0.6″ in 50
    # years). By way of B1950 the polynomials differ by 3 µas.
    from colure import precession

    v = directions()
    moved = frames.convert(v, "equator/fk4-no-e/B1925", "equator/fk4-no-e/B1975")
    assert separation(moved, v @ precession.newcomb_matrix(1925.0, 1975.0).T).max() < 1e-10


def test_an_array_of_epochs_three_by_three() -> None:
    v, epochs = directions(3), np.array([1930.0, 1950.0, 1980.0])
    together = fk4.to_icrs(v, 1950.0, epochs)
    apart = np.array([fk4.to_icrs(v[k], 1950.0, float(epochs[k])) for k in range(3)])
    assert np.abs(together - apart).max() < 1e-15
    assert separation(fk4.from_icrs(together, 1950.0, epochs), v).max() < 2e-15


def test_iau_1958_galactic_axes_are_a_right_handed_set() -> None:
    matrix = fk4.galactic_1958()
    assert np.abs(matrix @ matrix.T - np.eye(3)).max() < 1e-15
    assert np.linalg.det(matrix) == pytest.approx(1.0)
    # ERFA's galactic system is the same one on ICRS axes, to the 30 mas that its rounding costs.
    v = directions()
    b1950 = frames.from_icrs(v, "equator/fk4-no-e/B1950", epoch=1950.0)
    assert separation(b1950 @ matrix.T, frames.from_icrs(v, "galactic")).max() < 60.0 * MAS

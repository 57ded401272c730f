"""Precession by model: spans, refusals, and rates against published ones."""

import erfa
import numpy as np
import pytest

from colure import precession, precessionrates
from colure.arrays import ARCSEC, separation, unit
from colure.errors import FrameError, SpanError
from colure.moment import Moment

J2000 = (2451545.0, 0.0)


def years(*values: float) -> tuple[float, np.ndarray]:
    return 2451545.0, (np.array(values) - 2000.0) * 365.25


@pytest.mark.parametrize("model", precession.SPANS)
def test_each_model_ends_where_it_says(model: str) -> None:
    first, last = precession.SPANS[model]
    inside = precession.ecliptic_matrix(years(first, last), model)
    assert np.abs(inside @ np.swapaxes(inside, -1, -2) - np.eye(3)).max() < 1e-13
    for outside in (first - 1.0, last + 1.0):
        with pytest.raises(SpanError, match=f"'{model}': year"):
            precession.bias_precession_matrix(years(2000.0, outside), model)


def test_stated_ends_are_where_a_model_leaves_the_long_term_one() -> None:
    # IAU 2006 within 35″ of the long-term model at the ends of its span (its docstring says 30″ of the equator).
    for year in precession.SPANS["iau2006"]:
        pole = precession.equator_pole(years(year), "iau2006")
        assert separation(pole, precession.equator_pole(years(year), "vondrak2011"))[0] < 35.0 * ARCSEC


def test_models_without_a_pole_are_refused() -> None:
    for model in ("laskar1986", "vondrak2011-fit"):
        with pytest.raises(FrameError, match="obliquity only"):
            precession.ecliptic_matrix(J2000, model)
    with pytest.raises(FrameError, match="did you mean 'newcomb'"):
        precession.ecliptic_matrix(J2000, "newcom")


def test_iau1976_is_erfa_about_the_fk5_axes() -> None:
    at = years(1850.0, 1950.0, 2050.0)
    want = erfa.pmat76(*at) @ precession.fk5_matrix()
    assert np.abs(precession.bias_precession_matrix(at, "iau1976") - want).max() < 1e-15


def test_long_term_poles_carry_no_bias() -> None:
    # ERFA's own bias (bi00, its 23 mas as a matrix) leads from one to the other at any date.
    at = years(-1500.0)
    equator, ecliptic = precession.long_term_poles(np.array([-1500.0]))
    biased = np.asarray(erfa.bp06(*J2000)[0])
    for pole, other in (
        (equator, precession.equator_pole(at, "vondrak2011")),
        (ecliptic, precession.ecliptic_pole(at, "vondrak2011")),
    ):
        assert separation(pole @ biased, other)[0] < 1e-5 * ARCSEC


def test_rates_follow_the_sky_between_two_years() -> None:
    # m and n of the middle, held against the turned place of a star half a year before and after.
    star = unit(np.array([0.3, -0.7, 0.5]))
    at = years(2026.0)
    m, n = (float(rate[0]) for rate in precessionrates.equatorial(at))
    before, after = (precession.bias_precession_matrix(years(2026.0 + side))[0] @ star for side in (-0.5, 0.5))
    now = precession.bias_precession_matrix(at)[0] @ star
    ra, dec = np.arctan2(now[1], now[0]), np.arcsin(now[2])
    moved_ra = np.arctan2(after[1], after[0]) - np.arctan2(before[1], before[0])
    moved_dec = np.arcsin(after[2]) - np.arcsin(before[2])
    # m and n leave out the pole's motion across that way, 0.026″ a century (rate of ω_A, Capitaine et al. 2003).
    assert moved_ra == pytest.approx(m + n * np.sin(ra) * np.tan(dec), abs=4e-4 * ARCSEC)
    assert moved_dec == pytest.approx(n * np.cos(ra), abs=4e-4 * ARCSEC)
    drift = precessionrates.drift(star, (at[0], float(at[1][0])))
    assert np.abs(drift - (after - before)).max() < 1e-4 * ARCSEC


def test_rates_do_not_jump_at_the_seam() -> None:
    near = precessionrates.general(years(1799.99, 1800.01, 2199.99, 2200.01))
    assert abs(near[1] - near[0]) < 0.0005 * ARCSEC
    assert abs(near[3] - near[2]) < 0.0005 * ARCSEC
    with pytest.raises(SpanError):
        precessionrates.angles(years(-5000.0))


def test_a_moment_and_a_date_are_the_same_instant() -> None:
    when = Moment.parse("2026-12-01")
    assert np.array_equal(precession.ecliptic_matrix(when), precession.ecliptic_matrix(when.tt))

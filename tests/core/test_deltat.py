"""ΔT: one smooth curve through all its sources, against published tables and an independent library."""

import numpy as np
import pytest
from skyfield.api import load

from colure import deltat, deltat_models, orientation
from colure.errors import SpanError


def test_no_step_anywhere() -> None:
    """Design: no step above 1 ms. A day apart, ΔT moves by 0.1 s at −5000, which the slope on either side explains."""
    year = np.linspace(-4900.0, 4900.0, 3_000_001)
    slope_change = np.diff(deltat.delta_t(year), 2)
    assert np.max(np.abs(slope_change)) < 2e-3  # 1.2 days apart: what the measured length of day really varies by
    # At every join, both sides of it.
    first, last = (2000.0 + (jd - 2451545.0) / 365.25 for jd in orientation.span())
    knots = np.array([-2000.0, -720.0, 1550.0, 1650.0, 1952.0, 1955.0, first, last, 2500.0])
    side = 1e-6
    assert np.max(np.abs(deltat.delta_t(knots + side) - deltat.delta_t(knots - side))) < 1e-3
    table = np.array([-100.0, 400.0, 1000.0, 1150.0, 1500.0, 1720.0, 1850.0, 1920.0, 1950.0])
    assert np.max(np.abs(deltat.delta_t(table + side) - deltat.delta_t(table - side))) < 1e-4


def test_the_slope_is_joined_too() -> None:
    first, last = (2000.0 + (jd - 2451545.0) / 365.25 for jd in orientation.span())
    for knot in (-2000.0, -720.0, 1952.0, 2500.0):
        left = deltat.delta_t(knot) - deltat.delta_t(knot - 1e-3)
        right = deltat.delta_t(knot + 1e-3) - deltat.delta_t(knot)
        assert abs(left - right) / 1e-3 < 0.01, knot  # s per year
    # At the table's ends a year's mean slope is joined: the days themselves scatter by 0.5 s a year.
    assert abs(deltat.delta_t(last + 1) - 2 * deltat.delta_t(last) + deltat.delta_t(last - 1)) < 0.1
    assert abs(deltat.delta_t(first + 1) - 2 * deltat.delta_t(first) + deltat.delta_t(first - 1)) < 0.2


def test_modern_values_agree_with_an_independent_library() -> None:
    """skyfield carries an older Bulletin A: within three of its stated errors (2 ms before 1990, then 0.1)."""
    scale = load.timescale(builtin=True)
    jd = 2441700.5 + np.arange(0.0, 19000.0, 37.3)
    theirs = scale.tt_jd(jd).delta_t
    mine = deltat.of_tt(np.floor(jd) + 0.5, jd - np.floor(jd) - 0.5)
    assert np.max(np.abs(mine - theirs)[jd < 2447892.5]) < 6e-3
    assert np.max(np.abs(mine - theirs)[jd > 2447892.5]) < 3e-4


def test_measured_values_stand_at_midnight() -> None:
    """IERS 20 C04: UT1−UTC of 2020-01-01 is −0.1771642 s with TAI−UTC 37 s (from the file, as shipped)."""
    tt = 2458849.5 + 69.184 / 86400.0
    assert deltat.of_tt(2458849.5, tt - 2458849.5) == pytest.approx(69.184 + 0.1771, abs=2e-4)


def test_reduction_to_the_tidal_acceleration() -> None:
    """−0.91072 (ṅ + 25.82) u² by hand at −720, for ṅ = −26: 0.91072 × 0.18 × 26.75² = 117.3 s."""
    published = float(deltat_models.delta_t(-720.0, "s15-2020"))
    assert deltat.delta_t(-720.0, deltat.TIDAL["table"]) == pytest.approx(published, abs=1e-6)
    assert deltat.delta_t(-720.0, -26.0) - published == pytest.approx(117.30, abs=0.01)
    assert deltat.delta_t(1960.0, -26.0) == deltat.delta_t(1960.0)
    assert deltat.tidal_acceleration(1000.0) == deltat.TIDAL["DE422"]
    assert deltat.tidal_acceleration(1800.0) == deltat.TIDAL["DE440"]


def test_errors_are_those_published() -> None:
    """Beside Morrison et al. 2021: 180 s at −720, 15 s at 1000; 0.74 t² before −2000; IERS: below 0.1 ms in 2010."""
    assert deltat.sigma(-720.0) == 180.0
    assert deltat.sigma(1000.0) == 15.0
    assert deltat.sigma(-3000.0) == pytest.approx(0.74 * 48.25**2, rel=0.01)
    assert deltat.sigma(2010.0) < 1e-4
    year = np.linspace(-4900.0, 4900.0, 9801)
    assert np.all(deltat.sigma(year) > 0.0)
    # The reduction to the ephemeris in use stays well within the error everywhere.
    moved = np.abs(deltat.delta_t(year) - deltat.delta_t(year, deltat.TIDAL["table"]))
    assert np.all(moved < 0.2 * deltat.sigma(year))


def test_named_models_refuse_what_they_do_not_cover() -> None:
    for model in ("s15-2020", "s15-2016"):
        with pytest.raises(SpanError, match="outside"):
            deltat_models.delta_t(-800.0, model)
    with pytest.raises(SpanError, match="unknown"):
        deltat_models.delta_t(2000.0, "guess")
    # Far from the table the two long-term forms stay within each other's error.
    year = np.array([-2000.0, -1000.0, 2300.0])
    gap = np.abs(deltat_models.delta_t(year, "parabola-2016") - deltat_models.delta_t(year, "lod-2021"))
    assert np.all(gap < 1500.0)

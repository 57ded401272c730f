"""Magnitudes beside the published cases, air mass, and the refusals of the small formulas."""

import numpy as np
import pytest

from colure import appearance, horizon, minorphotometry, phases, photometry, refraction
from colure.arrays import DEG
from colure.errors import SiteError


def test_every_planet_is_refused_beyond_its_limit() -> None:
    for body in ("mercury", "venus", "earth", "mars", "jupiter", "moon"):
        formula = getattr(photometry, body)
        limit = photometry.LIMITS_DEG[body]
        inside, outside = formula(1.0, 1.0, np.array([limit - 0.01, limit + 0.01]))
        assert np.isfinite(inside), body
        assert np.isnan(outside), body
        assert body in photometry.reason(body, np.array([np.nan]), np.array([limit + 0.01]))
    assert np.isnan(photometry.saturn(9.5, 8.5, 6.6, 10.0, 10.0))
    assert np.isnan(photometry.saturn(9.5, 8.5, 1.0, 27.5, 27.5))
    assert np.isnan(photometry.neptune(30.0, 29.0, 2.0, 1995.0))
    assert np.isfinite(photometry.neptune(30.0, 29.0, 2.0, 2005.0))


def test_rings_seen_from_the_dark_side_add_no_light() -> None:
    # The effective opening is the geometric mean: nothing when Sun and observer stand on different sides.
    assert photometry.saturn(9.5, 8.5, 1.0, 3.0, -1.0) == photometry.saturn(9.5, 8.5, 1.0, 0.0, 0.0)


def test_mars_tables_close_on_themselves() -> None:
    below = photometry.mars(1.5, 0.6, 10.0, np.array([359.999, 0.001]), np.array([0.001, 359.999]))
    assert abs(below[1] - below[0]) < 1e-3
    # Spread of the rotation term: 0.11 mag (Mallama 2007).
    turn = photometry.mars(1.5, 0.6, 10.0, np.arange(0.0, 360.0, 1.0), 100.0)
    assert 0.10 < turn.max() - turn.min() < 0.13


def test_phase_functions_of_minor_bodies_are_smooth_and_fall() -> None:
    phase = np.linspace(0.0, 119.0, 2381)
    for curve in (
        minorphotometry.hg_reduced(10.0, 0.15, phase),
        minorphotometry.hg12_reduced(10.0, 0.5, phase),
    ):
        assert abs(curve[0] - 10.0) < 1e-9
        assert np.all(np.diff(curve) > 0.0)
        assert np.diff(curve).max() < 0.05
    assert np.isnan(minorphotometry.hg_reduced(10.0, 0.15, 121.0))
    assert np.isnan(minorphotometry.hg12_reduced(10.0, 0.5, 151.0))


def test_comet_laws() -> None:
    # M1 = 5, K1 = 10: at 2 au from the Sun and 0.5 au from the Earth, 5 + 5 log 0.5 + 10 log 2 = 6.5051.
    assert abs(minorphotometry.comet_total(5.0, 10.0, 2.0, 0.5) - 6.5051500) < 1e-6
    assert abs(minorphotometry.comet_nucleus(15.0, 5.0, 0.03, 2.0, 0.5, 20.0) - 15.6) < 1e-9


def test_airmass() -> None:
    # Kasten & Young 1989, their Table II: 1.0000 (90°), 1.9942 (30°), 10.3058 (5°), 37.9196 (0°); from memory.
    altitude = np.array([90.0, 30.0, 5.0, 0.0]) * DEG
    assert np.allclose(horizon.airmass(altitude), [1.0, 1.9942, 10.3058, 37.9196], rtol=2e-4)
    assert np.isnan(horizon.airmass(-0.1 * DEG))
    with pytest.raises(SiteError, match="did you mean 'hardie'"):
        horizon.airmass(0.5, "hardy")


def test_local_sphere_goes_round() -> None:
    rng = np.random.default_rng(3)
    ha, dec, lat = rng.uniform(0, 2 * np.pi, 500), rng.uniform(-1.5, 1.5, 500), rng.uniform(-1.5, 1.5, 500)
    az, alt = horizon.altaz(ha, dec, lat)
    ha2, dec2 = horizon.hadec(az, alt, lat)
    assert np.abs(np.sin(ha2 - ha)).max() < 1e-9
    assert np.abs(dec2 - dec).max() < 1e-9
    # Due south at upper transit in the north; the parallactic angle is then nothing, and negative before it.
    assert abs(float(horizon.altaz(0.0, 0.1, 0.9)[0]) - np.pi) < 1e-12
    assert float(horizon.parallactic_angle(-0.3, 0.1, 0.9)) < 0.0


def test_ecliptic_points_on_the_horizon_are_on_the_horizon() -> None:
    obliquity, lat, lst = 23.44 * DEG, 51.0 * DEG, np.linspace(0.0, 6.2, 50)
    lon = horizon.ecliptic_on_horizon(obliquity, lat, lst)
    ra = np.arctan2(np.sin(lon) * np.cos(obliquity), np.cos(lon))
    dec = np.arcsin(np.sin(lon) * np.sin(obliquity))
    az, alt = horizon.altaz(lst - ra, dec, lat)
    assert np.abs(alt).max() < 1e-9
    assert np.all(np.sin(az) < 0.0)  # the western one


def test_sizes() -> None:
    # The Sun's 959.63″ at 1 au, the Moon's 932.6″ at 384,400 km (almanacs, from memory), Jupiter 98.57″ at 1 au.
    assert abs(appearance.diameter_arcsec("sun", np.array(1.0)) / 2.0 - 959.63) < 0.02
    assert abs(appearance.diameter_arcsec("moon", np.array(384400.0 / 149597870.7)) / 2.0 - 932.6) < 0.5
    assert abs(appearance.diameter_arcsec("jupiter", np.array(4.0)) - 2.0 * 98.57 / 4.0) < 0.01
    assert float(phases.semidiameter(1.0, 0.5)) == np.pi / 2  # inside the body


@pytest.mark.parametrize(
    ("values", "words"),
    [
        ({"pressure_hpa": 1300.0}, "pressure 1300.0 is outside"),
        ({"temperature_c": float("nan")}, "temperature nan"),
        ({"humidity": 2.0}, "humidity"),
        ({"wavelength_um": 0.0}, "wavelength"),
    ],
)
def test_impossible_air_is_refused(values: dict[str, float], words: str) -> None:
    with pytest.raises(SiteError, match=words):
        refraction.Atmosphere(**values)


def test_unknown_refraction_model_is_refused() -> None:
    with pytest.raises(SiteError, match="did you mean 'bennett'"):
        refraction.of_apparent(0.1, model="benett")


def test_standard_pressure() -> None:
    # ISO 2533: 1013.25 hPa at the sea, 898.76 at 1000 m, 701.21 at 3000 m.
    for height, pressure in ((0.0, 1013.25), (1000.0, 898.76), (3000.0, 701.21)):
        assert abs(refraction.standard_pressure(height) - pressure) < 0.2  # geometric against geopotential height

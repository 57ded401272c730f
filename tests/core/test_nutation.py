"""Nutation from its table and from its series, obliquity by every model, and sidereal time, against ERFA."""

import erfa
import numpy as np
import pytest

from colure import nutation, nutationtable, obliquity, sidereal
from colure.arrays import ARCSEC, DEG, MAS, TWO_PI
from colure.errors import FrameError, SpanError
from colure.moment import Moment
from colure.sites import Site

TABLE_TOLERANCE = 0.005 * MAS  # what the design allows the table


def test_table_reproduces_the_series() -> None:
    days = np.random.default_rng(20260803).uniform(-164300.0, 237400.0, 3000)
    for ours, series in zip(nutation.nutation((2451545.0, days)), erfa.nut06a(2451545.0, days), strict=True):
        assert np.abs(ours - series).max() < TABLE_TOLERANCE


def test_table_is_left_at_its_ends_without_a_step() -> None:
    last = nutationtable.FIRST_JD + nutationtable.DAYS - 6
    days = np.concatenate([edge + np.linspace(-0.4, 0.4, 9) for edge in (nutationtable.FIRST_JD, last)])
    dpsi, deps = nutation.nutation((0.0, days))
    series = erfa.nut06a(0.0, days)
    assert np.abs(dpsi - series[0]).max() < TABLE_TOLERANCE
    assert np.abs(deps - series[1]).max() < TABLE_TOLERANCE


def test_any_shape_of_moments() -> None:
    days = np.random.default_rng(20260804).uniform(-9000, 9000, (3, 3, 3))
    dpsi, deps = nutation.nutation((2451545.0, days))
    assert dpsi.shape == deps.shape == (3, 3, 3)
    assert np.abs(dpsi - erfa.nut06a(2451545.0, days)[0]).max() < TABLE_TOLERANCE
    assert np.abs(dpsi[1, 2, 0] - nutation.nutation((2451545.0, float(days[1, 2, 0])))[0]) < TABLE_TOLERANCE
    empty = nutation.nutation((2451545.0, np.empty(0)))
    assert empty[0].shape == (0,)


def test_nutation_outside_its_span_is_refused() -> None:
    with pytest.raises(SpanError, match="nutation"):
        nutation.nutation((2451545.0, 11000 * 365.25))
    with pytest.raises(FrameError, match="iau2000a or iau1980"):
        nutation.nutation((2451545.0, 0.0), "iau2000b")


def test_obliquity_models_against_erfa() -> None:
    at = (2451545.0, np.array([-50000.0, 0.0, 40000.0]))
    assert np.array_equal(obliquity.mean(at), erfa.obl06(*at))
    assert np.array_equal(obliquity.mean(at, "iau1976"), erfa.obl80(*at))
    years = np.array([-5000.0, 0.0, 6000.0])
    between = np.arccos(np.sum(erfa.ltpequ(years) * erfa.ltpecl(years), axis=-1))
    assert np.abs(obliquity.mean(obliquity.at_years(years)) - between).max() < 1e-14


def test_true_obliquity_is_mean_plus_nutation() -> None:
    when = Moment.parse("2026-06-01 TT")
    want = erfa.obl06(*when.tt) + erfa.nut06a(*when.tt)[1]
    assert obliquity.true(when) == pytest.approx(float(want), abs=1e-16)
    old = erfa.obl80(*when.tt) + erfa.nut80(*when.tt)[1]
    assert obliquity.true(when, "iau1976") == pytest.approx(float(old), abs=1e-16)


@pytest.mark.parametrize("name", obliquity.MODELS)
def test_every_obliquity_is_near_the_others_and_ends_where_it_says(name: str) -> None:
    # Newcomb's is 0.3″ off by 2000, the long-term pair 0.1″: nothing that bears the name differs by an arcsecond.
    assert obliquity.mean_deg(2000.0, name) == pytest.approx(84381.406 / 3600.0, abs=1.0 / 3600.0)
    first, last = obliquity.MODELS[name].span
    for outside in (first - 1.0, last + 1.0):
        with pytest.raises(SpanError, match=f"'{name}'"):
            obliquity.mean_deg(outside, name)


def test_unknown_obliquity_model_names_its_neighbours() -> None:
    with pytest.raises(FrameError, match="did you mean 'laskar1986'"):
        obliquity.mean_deg(2000.0, "laskar")


def test_doubt_of_the_obliquity_grows_with_time() -> None:
    # The two forms of the long-term model differ by 6″ at −3000 (Vondrák et al. 2011 print both).
    doubt = obliquity.disagreement(np.array([-3000.0, 2000.0])) / ARCSEC
    assert 5.0 < doubt[0] < 8.0
    assert doubt[1] < 0.2


def test_sidereal_times_against_erfa() -> None:
    when = Moment(2451545.0, np.linspace(-70000.0, 70000.0, 80), "TT")
    for ours, theirs in (
        (sidereal.era(when), erfa.era00(*when.ut1)),
        (sidereal.gmst(when), erfa.gmst06(*when.ut1, *when.tt)),
        (sidereal.gast(when), erfa.gst06a(*when.ut1, *when.tt)),
        (sidereal.equation_of_origins(when), erfa.eo06a(*when.tt)),
    ):
        assert np.abs((ours - theirs + np.pi) % TWO_PI - np.pi).max() < 0.01 * MAS


def test_local_sidereal_time_is_greenwich_plus_east_longitude() -> None:
    when, site = Moment.parse("2026-03-03 14:05:30"), Site("Quern Hill", 129.40, -25.90, 710.0)
    assert (sidereal.local(when, site) - sidereal.gast(when)) % TWO_PI == pytest.approx(129.40 * DEG, abs=1e-12)
    mean = sidereal.local(when, site, apparent=False)
    assert (mean - sidereal.gmst(when)) % TWO_PI == pytest.approx(129.40 * DEG, abs=1e-12)
    with pytest.raises(FrameError, match="iau2006 or iau1982"):
        sidereal.gmst(when, "iau2000")

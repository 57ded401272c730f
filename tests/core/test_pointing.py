"""What a pixel points at, in words, and measuring between two directions."""

from dataclasses import replace

import numpy as np
import pytest

from colure import pointing, scene, sky
from colure.arrays import ARCSEC, DEG, cartesian, separation
from colure.lookup import find
from colure.moment import Moment
from colure.session import Session


@pytest.fixture(scope="module")
def chart():
    above = sky.compute(Session.demo())
    return above, scene.build(above, (900, 800))


def at(chart, pointed):
    x, y = chart[1].projector.project(pointed.vector)
    return float(x), float(y)


def test_a_body_under_the_pointer(chart):
    uranus = pointing.body(chart[0], "uranus")
    found = pointing.at(*chart, *at(chart, uranus))
    assert (found.kind, found.name) == (pointing.BODIES, "Uranus")
    assert found.direction == uranus.direction
    # Near its opposition of 2026: 5.6 mag and some 3.8″ wide (almanac figures, from memory); in Taurus.
    assert "mag 5.6" in found.detail
    assert "3.8″ across" in found.detail
    assert "Taurus" in found.detail


def test_a_star_under_the_pointer_and_its_names(chart):
    aldebaran = pointing.target(chart[0], find("Aldebaran"))
    found = pointing.at(*chart, *at(chart, aldebaran))
    assert (found.kind, found.name) == (pointing.STARS, "Aldebaran")
    assert "α Tau" in found.detail
    assert "HIP 21421" in found.detail
    assert found.direction == aldebaran.direction
    # The chart's own direction of the same star is in single precision at this width: some 0.02″.
    stars = chart[0]["stars"]
    drawn = stars.directions[:, np.flatnonzero(stars.base.ids == found.row)[0]].astype(float)
    assert 0.0 <= float(separation(found.vector, drawn)) / ARCSEC < 0.05


def test_a_deep_sky_object(chart):
    found = pointing.target(chart[0], find("M 45"))
    assert found.kind == pointing.DEEP_SKY
    assert found.name == "M 45"
    assert "open cluster" in found.detail or "cluster" in found.detail


def test_the_bare_sky_and_beyond_it(chart):
    left, top, *_ = chart[1].frame
    rng = np.random.default_rng(3)
    places = [pointing.at(*chart, left + 5 + v[0] * 700, top + 5 + v[1] * 500, 0.5) for v in rng.random((20, 2))]
    bare = [p for p in places if p is not None and p.kind == pointing.DIRECTION]
    assert bare
    # One pixel of 110° over 800: about 500″.
    assert all(100.0 < p.sigma_arcsec < 2000.0 for p in bare)
    assert pointing.at(*chart, 1.0, 1.0) is None
    assert pointing.readout(*chart, 1.0, 1.0) == ""


def test_the_readout_names_object_position_and_constellation(chart):
    text = pointing.readout(*chart, *at(chart, pointing.body(chart[0], "uranus")))
    assert text.startswith("Uranus")
    assert "λ 063°" in text
    assert text.endswith("Taurus")


def test_an_object_is_found_again_at_another_moment(chart):
    moon = pointing.body(chart[0], "moon")
    later = sky.compute(replace(chart[0].session, moment=chart[0].session.moment.shifted(1.0)), chart[0])
    moved = pointing.again(later, moon)
    # The Moon moves by 11.8° to 15.2° a day.
    assert 11.0 < np.degrees(np.arccos(moon.vector @ moved.vector)) < 16.0
    bare = pointing.bare(moon.vector, 1.0)
    assert pointing.again(later, bare) == bare
    far = sky.compute(replace(chart[0].session, moment=Moment.parse("-4900-01-01 TT")))
    assert pointing.again(far, moon) == moon


@pytest.mark.parametrize(
    ("a", "b", "apart", "pa"),
    [
        # By hand: along a meridian, along the equator, and a right angle on it.
        ((10.0, 0.0), (10.0, 5.0), 5.0, 0.0),
        ((10.0, 0.0), (15.0, 0.0), 5.0, 90.0),
        ((10.0, 5.0), (10.0, 0.0), 5.0, 180.0),
        ((10.0, 0.0), (5.0, 0.0), 5.0, 270.0),
        ((0.0, 0.0), (90.0, 45.0), 90.0, 45.0),
    ],
)
def test_measuring(chart, a, b, apart, pa):
    session = replace(chart[0].session, view=replace(chart[0].session.view, up="icrs"))
    above = replace(chart[0], session=session)
    ends = [pointing.bare(cartesian(lon * DEG, lat * DEG), 0.1) for lon, lat in (a, b)]
    found = pointing.measure(above, *ends)
    assert found.separation_deg == pytest.approx(apart, abs=1e-9)
    assert found.pa_deg == pytest.approx(pa, abs=1e-9)
    assert found.frame == "icrs"
    assert f"{int(apart):02d}°00′00.0″" in found.text


def test_nearest_body_is_on_the_map(chart):
    assert pointing.nearest_body(*chart).name == "Uranus"
    none = replace(chart[0].session, bodies=())
    above = sky.compute(none)
    assert pointing.nearest_body(above, scene.build(above, (900, 800))) is None

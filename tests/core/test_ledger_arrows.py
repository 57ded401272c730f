"""Arrows of a ledger on a chart: where they point, how long they are, and which factor is taken."""

import numpy as np
import pytest

from colure import ledger, scene, sky
from colure.arrays import ARCSEC, DEG, cartesian, position_angle, separation, unit
from colure.ledger.arrows import GOAL_PX, LEAST_PX, MOST_PX, carried, lay, nice
from colure.session import Session


@pytest.fixture(scope="module")
def chart():
    found = sky.compute(Session.demo())
    return found, scene.build(found, (1200, 900), 1.0)


@pytest.fixture(scope="module")
def uranus(chart):
    session = chart[0].session
    return ledger.body("uranus", session.moment, observer=chart[0].observer, frame="horizon")


def test_factors_are_round_and_never_above_what_was_asked():
    given = [0.3, 1.0, 1.9, 2.0, 4.99, 5.0, 9.99, 10.0, 99.0, 100.0, 123456.0]
    assert [nice(value) for value in given] == [1, 1, 1, 2, 2, 5, 5, 10, 50, 100, 100000]
    assert nice(1e12) == 1e8


def test_an_arrow_points_where_the_step_goes_and_is_as_long_as_the_factor_says(chart, uranus):
    found, made = chart
    direction = found["bodies"].vector("uranus")
    laid = lay(uranus, direction, made, factor=2000.0)
    assert laid is not None
    assert laid.factor == 2000.0
    arrow = next(one for one in laid.drawn if one.step == "annual aberration")
    entry = uranus["annual aberration"]
    # The same from two pixels of the projection, by way of the entry's own two directions.
    foot, tip = (np.asarray(made.projector.project(end)) for end in entry.arrow)
    move = (tip - foot) * 2000.0
    assert float(np.hypot(*(move - (arrow.dx, arrow.dy)))) < 0.005 * float(np.hypot(*move))
    assert separation(*entry.arrow) / ARCSEC == pytest.approx(entry.size_arcsec, abs=1e-6)


def test_the_chosen_step_gets_a_good_length(chart, uranus):
    found, made = chart
    direction = found["bodies"].vector("uranus")
    for step in ("frame bias", "annual aberration", "precession of the equator"):
        laid = lay(uranus, direction, made, chosen=step)
        arrow = next(one for one in laid.drawn if one.step == step)
        assert 0.3 * GOAL_PX < float(np.hypot(arrow.dx, arrow.dy)) <= GOAL_PX + 1e-9


def test_every_step_is_drawn_or_said_to_be_too_long_or_too_short(chart, uranus):
    found, made = chart
    laid = lay(uranus, found["bodies"].vector("uranus"), made)
    listed = [*(arrow.number for arrow in laid.drawn), *laid.long, *laid.short]
    moved = [number for number, one in enumerate(uranus.entries, 1) if one.size_arcsec > 0.0]
    assert sorted(listed) == moved
    assert all(LEAST_PX <= np.hypot(one.dx, one.dy) <= MOST_PX for one in laid.drawn)
    assert len(laid.drawn) >= 5


def test_nothing_is_laid_off_the_map(chart, uranus):
    _, made = chart
    assert lay(uranus, -chart[0]["bodies"].vector("uranus"), made) is None


def test_a_step_left_out_has_no_arrow(chart):
    found, made = chart
    session = found.session
    without = ledger.body(
        "uranus", session.moment, observer=found.observer, frame="horizon", omitted=("annual aberration",)
    )
    laid = lay(without, found["bodies"].vector("uranus"), made)
    assert "annual aberration" not in [arrow.step for arrow in laid.drawn]


def test_a_bearing_is_carried_along_the_great_circle():
    """Carried along the equator, a bearing keeps its angle to the equator, and so its position angle."""
    foot, there = cartesian(10.0 * DEG, 0.0), cartesian(50.0 * DEG, 0.0)
    tip = unit(foot + 1e-4 * np.array([0.0, 0.6, 0.8]))
    moved = carried(np.stack([foot, tip])[None], there)[0]
    assert float(moved @ there) == pytest.approx(0.0, abs=1e-12)
    given = float(position_angle(foot, tip))
    assert float(position_angle(there, unit(there + 1e-4 * moved))) == pytest.approx(given, abs=1e-7)

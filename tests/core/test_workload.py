"""The number of stars judged beforehand stays within a factor of two of the catalogue's own count."""

from dataclasses import replace

import pytest

from colure import workload
from colure.session import Session
from colure.stars import catalogue


@pytest.mark.parametrize("limit", [6.0, 8.0, 9.5, 11.0])
def test_whole_sky(limit):
    session = Session.demo()
    session = replace(session, view=replace(session.view, projection="hammer", width_deg=360.0, limit_mag=limit))
    found = len(catalogue().brighter(limit))
    assert found / 2 < workload.stars(session) < found * 2


def test_lighter_keeps_what_is_light_and_cuts_what_is_not():
    session = Session.demo()
    assert workload.lighter(session, 90_000) is session
    deep = replace(session, view=replace(session.view, limit_mag=12.0))
    light = workload.lighter(deep, 90_000)
    assert light.view.limit_mag < 12.0
    # The limit is rounded to a tenth of a magnitude: 11 % of the stars.
    assert workload.stars(light) < 90_000 * 1.12
    assert replace(light, view=replace(light.view, limit_mag=12.0)) == deep


def test_no_stars_no_work():
    session = Session.demo()
    assert workload.stars(replace(session, layers=replace(session.layers, stars=False))) == 0

"""Dragging and zooming: the sky under the pointer stays under it, in every projection, turned and mirrored."""

from dataclasses import replace

import numpy as np
import pytest

from colure import scene, sky
from colure.scene import navigate
from colure.session import PROJECTIONS, Centre, Session, View

SIZE = (900, 640)
BARE = replace(
    Session.demo(),
    circles=(),
    layers=replace(
        Session.demo().layers, stars=False, deep_sky=False, milky_way=False, constellation_names=False, grid=None
    ),
)


def laid(session: Session) -> scene.Scene:
    return scene.build(sky.compute(session), SIZE)


@pytest.mark.parametrize("name", PROJECTIONS)
@pytest.mark.parametrize("east_left", [True, False])
@pytest.mark.parametrize(("rotation", "up"), [(0.0, "ecliptic/mean/date"), (70.0, "equator/mean/date")])
def test_what_was_grasped_stays_under_the_pointer(name, east_left, rotation, up):
    view = View(name, Centre("ecliptic/mean/date", 40.0, 12.0), up, east_left, 60.0, rotation)
    session = replace(BARE, view=view)
    before = laid(session)
    grasped = before.unproject(500.0, 250.0)
    moved = navigate.panned(session, before, (500.0, 250.0), (430.0, 330.0))
    after = laid(replace(session, view=moved))
    # A hundredth of a pixel: the search stops at 1e-12 rad, degrees in the session are exact to 1e-14.
    np.testing.assert_allclose(after.projector.project(grasped), [430.0, 330.0], atol=0.01)


@pytest.mark.parametrize("name", PROJECTIONS)
def test_zoom_keeps_what_is_under_the_pointer(name):
    session = replace(BARE, view=View(name, Centre("equator/mean/date", 100.0, 20.0), "equator/mean/date", True, 50.0))
    before = laid(session)
    there = (260.0, 410.0)
    fixed = before.unproject(*there)
    nearer = navigate.zoomed(session, before, 1.7, there)
    assert nearer.width_deg == pytest.approx(50.0 / 1.7)
    after = laid(replace(session, view=nearer))
    np.testing.assert_allclose(after.projector.project(fixed), there, atol=0.01)


def test_zoom_stops_at_the_limits_of_the_projection():
    session = replace(BARE, view=View("gnomonic", Centre(), width_deg=100.0))
    page = laid(session)
    assert navigate.zoomed(session, page, 0.01).width_deg == 150.0
    assert navigate.zoomed(session, page, 1e9).width_deg == pytest.approx(1.0 / 60.0)


def test_a_view_centred_on_a_body_keeps_it():
    session = replace(BARE, view=View("gnomonic", Centre(body="mars"), width_deg=10.0))
    nearer = navigate.zoomed(session, laid(session), 2.0, (100.0, 100.0))
    assert nearer.centre.body == "mars"


def test_grasping_beside_the_sky_changes_nothing():
    session = replace(BARE, view=View("orthographic", Centre(), width_deg=180.0))
    page = laid(session)
    assert navigate.panned(session, page, (60.0, 90.0), (300.0, 300.0)) == session.view


def test_centred_puts_a_direction_in_the_middle():
    page = laid(BARE)
    direction = page.unproject(200.0, 200.0)
    after = laid(replace(BARE, view=navigate.centred(BARE, direction)))
    left, top, right, bottom = after.frame
    middle = [0.5 * (left + right), 0.5 * (top + bottom)]
    np.testing.assert_allclose(after.projector.project(direction), middle, atol=1e-6)

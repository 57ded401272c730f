"""Moving a view by hand: what was held stays held, in every projection and orientation."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from colure import navigate, sky
from colure.arrays import norm
from colure.session import NARROWEST, PROJECTIONS, WIDEST, Centre, Session

FRAME = (50.0, 40.0, 850.0, 640.0)


def session(**view):
    demo = Session.demo()
    return replace(demo, view=replace(demo.view, **view), layers=replace(demo.layers, stars=False, deep_sky=False))


def axes_of(of):
    return sky.compute(of).axes


def after(of, view):
    moved = replace(of, view=view)
    return navigate.page(view, axes_of(moved), FRAME)


@pytest.mark.parametrize("projection", PROJECTIONS)
@pytest.mark.parametrize("east_left", [True, False])
@pytest.mark.parametrize("up", ["ecliptic/mean/date", "equator/true/date", "zenith"])
def test_a_drag_keeps_what_was_grabbed_under_the_pointer(projection, east_left, up):
    s = session(projection=projection, east_left=east_left, up=up, width_deg=40.0, rotation_deg=12.0)
    axes = axes_of(s)
    grabbed = navigate.page(s.view, axes, FRAME).unproject(np.array([400.0, 300.0]))
    view = navigate.dragged(s, axes, FRAME, grabbed, 470.0, 360.0)
    # A tenth of a pixel: the centre is kept to 1e-8°, and is found by a few rounds.
    assert after(s, view).project(grabbed) == pytest.approx([470.0, 360.0], abs=0.1)
    assert view.centre.frame == s.view.centre.frame


@pytest.mark.parametrize("projection", PROJECTIONS)
@pytest.mark.parametrize("factor", [0.8, 1.25, 3.0])
def test_a_zoom_keeps_what_is_under_the_pointer(projection, factor):
    s = session(projection=projection, width_deg=30.0)
    axes = axes_of(s)
    at = np.array([610.0, 220.0])
    held = navigate.page(s.view, axes, FRAME).unproject(at)
    view = navigate.zoomed(s, axes, FRAME, *at, factor)
    assert view.width_deg == pytest.approx(30.0 / factor)
    assert after(s, view).project(held) == pytest.approx(at, abs=0.1)


def test_a_zoom_stops_at_the_widest_and_the_narrowest():
    s = session(width_deg=200.0)
    axes = axes_of(s)
    assert navigate.zoomed(s, axes, FRAME, 450.0, 340.0, 1e-6).width_deg == WIDEST["stereographic"]
    assert navigate.zoomed(s, axes, FRAME, 450.0, 340.0, 1e9).width_deg == pytest.approx(NARROWEST)


def test_a_step_brings_the_sky_from_that_side():
    s = session(width_deg=20.0)
    axes = axes_of(s)
    to_come = navigate.page(s.view, axes, FRAME).unproject(np.array([450.0 + 100.0, 340.0]))
    view = navigate.stepped(s, axes, FRAME, 100.0, 0.0)
    assert after(s, view).project(to_come) == pytest.approx([450.0, 340.0], abs=0.1)
    # East is left: what lies to the right has smaller longitudes.
    assert view.centre.lon_deg < s.view.centre.lon_deg


def test_a_chart_that_followed_a_body_is_let_go_where_it_stood():
    s = session(centre=Centre("ecliptic/mean/date", body="mars"), up="equator/mean/date", width_deg=10.0)
    axes = axes_of(s)
    view = navigate.stepped(s, axes, FRAME, 1.0, 0.0)
    assert view.centre.body is None
    assert view.centre.frame == "equator/mean/date"
    assert float(norm(axes_of(replace(s, view=view)).centre - axes.centre)) < np.radians(0.05)


def test_nothing_moves_without_a_reason():
    s = session(width_deg=20.0)
    axes = axes_of(s)
    assert navigate.stepped(s, axes, FRAME, 0.0, 0.0) == s.view
    assert navigate.zoomed(s, axes, FRAME, 450.0, 340.0, 1.0) == s.view
    grabbed = navigate.page(s.view, axes, FRAME).unproject(np.array([450.0, 340.0]))
    assert navigate.dragged(s, axes, FRAME, grabbed, 450.0, 340.0) == s.view


@settings(max_examples=40, deadline=None)
@given(
    lon=st.floats(0.0, 360.0),
    lat=st.floats(-90.0, 90.0),
    x=st.floats(-200.0, 1100.0),
    y=st.floats(-200.0, 900.0),
    projection=st.sampled_from(PROJECTIONS),
    width=st.floats(0.5, 360.0),
)
def test_any_drag_gives_a_view_that_can_be_drawn(lon, lat, x, y, projection, width):
    s = session(projection=projection, width_deg=width, centre=Centre("ecliptic/mean/date", lon, lat))
    axes = axes_of(s)
    grabbed = navigate.page(s.view, axes, FRAME).unproject(np.array([450.0, 340.0]))
    if not np.isfinite(grabbed).all():
        return
    view = navigate.dragged(s, axes, FRAME, grabbed, x, y)
    assert np.isfinite(axes_of(replace(s, view=view)).centre).all()

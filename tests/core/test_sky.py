"""The sky in layers: each recomputed when its own part of the session changes, and never else."""

from dataclasses import replace

import numpy as np
import pytest

from colure import sky
from colure.arrays import ARCSEC, cartesian, separation
from colure.frames import rotation
from colure.moment import Moment
from colure.reduction import Observer, reduce_bodies, reduce_stars
from colure.session import Centre, Circle, Session, View
from colure.stars import EPOCH_JD

DEMO = replace(Session.demo(), layers=replace(Session.demo().layers, edges=True))


def changed(before: sky.Sky, after: sky.Sky) -> set[str]:
    return {name for name in after.layers if before.layers.get(name) is not after.layers[name]}


def test_the_same_session_recomputes_nothing():
    first = sky.compute(DEMO)
    assert changed(first, sky.compute(replace(DEMO), first)) == set()


@pytest.mark.parametrize(
    "view",
    [
        replace(DEMO.view, centre=Centre("ecliptic/mean/date", 80.0, 3.0)),
        replace(DEMO.view, rotation_deg=30.0),
        replace(DEMO.view, east_left=False),
        replace(DEMO.view, up="galactic"),
        replace(DEMO.view, projection="hammer"),
    ],
)
def test_a_change_of_view_recomputes_no_sky(view):
    first = sky.compute(DEMO)
    assert changed(first, sky.compute(replace(DEMO, view=view), first)) == set()


def test_zooming_in_fetches_stars_and_nothing_that_moves():
    first = sky.compute(DEMO)
    near = sky.compute(replace(DEMO, view=replace(DEMO.view, width_deg=8.0)), first)
    assert changed(first, near) == {"star rows", "stars", "star names", "edges"}
    # A small pan in the near view stays within the cone that was fetched.
    pan = replace(near.session, view=replace(near.session.view, centre=Centre("ecliptic/mean/date", 75.3, 6.1)))
    assert changed(near, sky.compute(pan, near)) == set()


def test_time_moves_what_moves():
    first = sky.compute(DEMO)
    later = sky.compute(replace(DEMO, moment=DEMO.moment.shifted(1.0)), first)
    assert changed(first, later) == {"bodies", "stars", "grid", "belt", "circles", "points"}


def test_a_fixed_circle_does_not_follow_the_moment():
    fixed = replace(DEMO, circles=(Circle("galactic"), Circle("ecliptic/mean/J2000")))
    first = sky.compute(fixed)
    assert "circles" not in changed(first, sky.compute(replace(fixed, moment=DEMO.moment.shifted(400.0)), first))


def test_the_site_moves_the_bodies_and_the_horizon():
    first = sky.compute(DEMO)
    away = sky.compute(replace(DEMO, site=replace(DEMO.site, lon_deg=0.0)), first)
    assert changed(first, away) == {"bodies", "stars", "circles"}


@pytest.mark.parametrize("place", ["geometric", "astrometric", "apparent", "observed"])
def test_stars_and_bodies_have_the_place_of_the_session(place):
    session = replace(DEMO, place=place, view=View("gnomonic", Centre(body="uranus"), width_deg=3.0))
    s = sky.compute(session)
    observer = Observer("site", session.site)
    expected = reduce_bodies(("uranus",), session.moment, observer=observer, place=place).vectors[0]
    np.testing.assert_array_equal(s["bodies"].vector("uranus"), expected)
    base, directions = s["stars"].base, s["stars"].directions
    assert directions.dtype == np.float64
    position, velocity = base.rows.vectors()
    whole = reduce_stars(
        position, velocity, base.parallax, session.moment, observer=observer, place=place, epoch_jd=EPOCH_JD
    )
    np.testing.assert_allclose(directions.T, whole, atol=1e-15)


def test_wide_charts_are_good_to_a_hundredth_of_an_arcsecond_of_float32():
    session = replace(DEMO, place="apparent")
    s = sky.compute(session)
    base = s["stars"].base
    assert s["stars"].directions.dtype == np.float32
    position, velocity = base.rows.vectors()
    exact = reduce_stars(
        position, velocity, None, session.moment, observer=s.observer, place="apparent", epoch_jd=EPOCH_JD
    )
    off = separation(s["stars"].directions.T.astype(np.float64), exact)
    # Float32 components are rounded to 6e-8 at worst, several times in the path: 0.05″.
    assert off.max() < 0.05 * ARCSEC


def test_stars_are_faintest_first_and_within_the_limit():
    base = sky.compute(replace(DEMO, view=replace(DEMO.view, limit_mag=6.0)))["stars"].base
    assert (np.diff(base.vmag) <= 0.0).all()
    assert base.vmag[0] < 6.0
    assert len(base.ids) == len(set(base.ids.tolist()))
    assert base.first_brighter(6.0) == 0
    assert base.vmag[base.first_brighter(2.0) :].max() <= 2.0


def test_the_axes_of_the_view():
    s = sky.compute(
        replace(DEMO, view=replace(DEMO.view, centre=Centre("galactic", 30.0, 10.0), up="equator/mean/date"))
    )
    onto = rotation("galactic").matrix
    np.testing.assert_allclose(onto @ s.axes.centre, cartesian(np.radians(30.0), np.radians(10.0)), atol=1e-14)
    np.testing.assert_allclose(s.axes.pole, rotation("equator/mean/date", DEMO.moment).matrix[2], atol=1e-14)
    up = sky.compute(replace(DEMO, view=replace(DEMO.view, up="zenith")))
    horizon = rotation("horizon", DEMO.moment, DEMO.site).matrix
    np.testing.assert_allclose(up.axes.pole, horizon[2], atol=1e-14)


def test_fk4_circles_are_drawn_though_they_are_no_rotation():
    s = sky.compute(replace(DEMO, circles=(Circle("equator/fk4/B1950"),)))
    (_, axes) = s["circles"][0]
    assert axes.matrix is None
    points = axes.columns(np.linspace(0.1, 6.0, 50), 0.0)
    lon, lat = axes.spherical(points.T)
    np.testing.assert_allclose(lat, 0.0, atol=1e-9)
    np.testing.assert_allclose(lon, np.linspace(0.1, 6.0, 50), atol=1e-9)


def test_outside_the_ephemeris_there_are_stars_and_a_note():
    s = sky.compute(replace(DEMO, circles=(Circle("equator/mean/date"),), moment=Moment.parse("-4800-01-01")))
    assert "bodies" in " ".join(s.notes)
    assert s["bodies"].names == ()
    assert np.isfinite(s["stars"].directions).all()

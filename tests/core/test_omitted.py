"""Steps left out of a whole chart: what the sky of a session does without them, and how a session keeps them."""

from dataclasses import replace

import numpy as np
import pytest

from colure import frames, session_file, sky
from colure.arrays import ARCSEC, DEG, separation
from colure.errors import SessionError
from colure.reduction import Observer, reduce_bodies, reduce_stars
from colure.scene import build
from colure.session import Centre, Circle, Session
from colure.stars import EPOCH_JD

NEAR = replace(
    Session.demo(),
    place="apparent",
    view=replace(Session.demo().view, width_deg=5.0, centre=Centre("ecliptic/true/date", 75.0, 6.0)),
    circles=(Circle("equator/true/date"), Circle("ecliptic/mean/J2000"), Circle("horizon")),
)


def test_stars_and_bodies_do_without_the_step() -> None:
    short = replace(NEAR, omitted=("annual aberration", "diurnal parallax"))
    full_sky, short_sky = sky.compute(NEAR), sky.compute(short)
    base = short_sky["stars"].base
    without = Observer("site", NEAR.site, omitted=frozenset(short.omitted))
    fast = reduce_stars(
        base.state[:3].T, base.state[3:].T, base.parallax, NEAR.moment, observer=without, place="apparent",
        epoch_jd=EPOCH_JD,
    )  # fmt: skip
    assert separation(short_sky["stars"].directions.T, np.asarray(fast)).max() < 1e-12
    # κ = 20.5″ of aberration, more or less its sine of the angle to the apex.
    assert np.array_equal(full_sky["stars"].base.ids, base.ids)
    off = separation(full_sky["stars"].directions.T, short_sky["stars"].directions.T) / ARCSEC
    assert 0.0 < off.min() <= off.max() < 20.9
    moon = reduce_bodies(
        ("moon",), NEAR.moment, observer=Observer("site", NEAR.site), place="apparent", omit=short.omitted
    )
    assert separation(short_sky["bodies"].vector("moon"), moon.vectors[0]) < 1e-12


def test_circles_do_without_the_turn() -> None:
    found = sky.compute(replace(NEAR, omitted=("nutation",)))
    axes = {circle.frame: axes for circle, axes in found["circles"]}
    mean = frames.rotation("equator/mean/date", NEAR.moment).matrix
    assert np.abs(axes["equator/true/date"].matrix - mean.T).max() < 1e-14
    still = frames.rotation("ecliptic/mean/J2000").matrix
    assert np.abs(axes["ecliptic/mean/J2000"].matrix - still.T).max() < 1e-14
    # The chart's centre has the same figures, on other axes: it moves by the nutation in longitude, and back again.
    moved = separation(found.axes.centre, sky.compute(NEAR).axes.centre) / ARCSEC
    assert 5.0 < moved < 18.0  # |Δψ| of December 2026 is about 9″
    lon, lat = sky.frame_axes("ecliptic/true/date", NEAR.moment, NEAR.site, ("nutation",)).spherical(
        found.axes.centre[None, :]
    )
    assert (lon[0] / DEG, lat[0] / DEG) == pytest.approx((75.0, 6.0), abs=1e-10)


def test_only_what_depends_on_it_is_computed_again() -> None:
    full = sky.compute(NEAR)
    again = sky.compute(replace(NEAR, omitted=("nutation",)), full)
    assert again.layers["deep sky"] is full.layers["deep sky"]
    assert again.layers["circles"] is not full.layers["circles"]
    back = sky.compute(NEAR, again)
    assert np.array_equal(back["stars"].directions, full["stars"].directions)


def test_the_title_says_what_is_left_out() -> None:
    scene = build(sky.compute(replace(NEAR, omitted=("annual aberration",))), (1000, 800))
    texts = [text for layer in scene.layers if layer.name == "title" for mark in layer.marks
             for text in getattr(mark, "texts", ())]  # fmt: skip
    assert any("without annual aberration" in text for text in texts)


def test_a_session_keeps_them_in_order() -> None:
    session = replace(NEAR, omitted=("nutation", "light time"))
    assert session.omitted == ("light time", "nutation")
    read, unknown = session_file.loads(session_file.dumps(session))
    assert read == session
    assert unknown == ()
    assert "omitted" not in session_file.dumps(NEAR)


@pytest.mark.parametrize(
    ("line", "needle"),
    [
        ('omitted = ["nutatoin"]', "did you mean 'nutation'"),
        ("omitted = 3", "a list of steps"),
        ("omitted = [1]", "text"),
    ],
)
def test_a_step_that_is_none_is_refused(line: str, needle: str) -> None:
    text = line + "\n" + session_file.dumps(NEAR)
    with pytest.raises(SessionError, match="omitted") as caught:
        session_file.loads(text)
    assert needle in str(caught.value)
    assert "\n" not in str(caught.value)

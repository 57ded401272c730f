"""One direction in every frame: against ERFA's own rotations, with figures no finer than they are worth."""

import erfa
import numpy as np
import pytest

from colure import everyframe
from colure.arrays import DEG, cartesian
from colure.moment import Moment
from colure.sites import DEMO

MOMENT = Moment.parse("2026-12-01 21:36:00 UTC")
DIRECTION = cartesian(61.0 * DEG, 20.6 * DEG)


def rows(**more):
    return {row.frame: row for row in everyframe.table(DIRECTION, MOMENT, site=DEMO, **more)}


def test_rows_agree_with_erfa():
    found = rows()
    tt = MOMENT.tt
    expected = {
        # ERFA: bias-precession pmat06, ecliptic of date ecm06, galactic icrs2g.
        "equator/mean/date": erfa.c2s(erfa.pmat06(*tt) @ DIRECTION),
        "equator/true/date": erfa.c2s(erfa.pnm06a(*tt) @ DIRECTION),
        "ecliptic/mean/date": erfa.c2s(erfa.ecm06(*tt) @ DIRECTION),
        "ecliptic/mean/J2000": erfa.c2s(erfa.ecm06(2451545.0, 0.0) @ DIRECTION),
        "galactic": erfa.icrs2g(61.0 * DEG, 20.6 * DEG),
        "icrs": (61.0 * DEG, 20.6 * DEG),
    }
    for name, (lon, lat) in expected.items():
        # 1e-7° is 0.4 mas: the nutation of the frames is interpolated from a table, good to 0.005 mas.
        assert found[name].lon_deg == pytest.approx(np.degrees(lon) % 360.0, abs=1e-7), name
        assert found[name].lat_deg == pytest.approx(np.degrees(lat), abs=1e-7), name


def test_every_listed_frame_has_an_answer_and_the_users_own_come_after():
    found = everyframe.table(DIRECTION, MOMENT, site=DEMO, also=("ecliptic/mean/-1000", "icrs"))
    names = [row.frame for row in found]
    assert names == [*everyframe.FRAMES, "ecliptic/mean/-1000"]
    assert not any(row.fault for row in found)


def test_a_frame_without_an_answer_says_why():
    found = {row.frame: row for row in everyframe.table(DIRECTION, MOMENT, site=None)}
    assert "site" in found["horizon"].fault
    assert np.isnan(found["horizon"].lon_deg)
    assert found["horizon"].lon_text == "—"


def test_figures_follow_the_uncertainty():
    coarse, fine = rows(sigma_arcsec=60.0)["icrs"], rows(sigma_arcsec=0.01)["icrs"]
    # Right ascension 4h 04m 00s, declination +20° 36′ 00″ by hand.
    assert (coarse.lon_text, coarse.lat_text) == ("04h04m00s", "+20°36′")
    # 0.01″ are 0.0007 s of time: the fourth decimal is the last that is worth anything.
    assert (fine.lon_text, fine.lat_text) == ("04h04m00.0000s", "+20°36′00.00″")
    decimal = rows(sigma_arcsec=36.0, degrees=True)["icrs"]
    # 36″ are 0.01°.
    assert (decimal.lon_text, decimal.lat_text) == ("61.00°", "+20.60°")


def test_near_a_pole_a_longitude_is_worth_less():
    near = cartesian(61.0 * DEG, 89.99 * DEG)
    row = everyframe.row(near, "icrs", MOMENT, sigma_arcsec=1.0)
    # 1″ over cos 89.99° is 1.6°, 6 minutes of time: seconds would say nothing.
    assert row.lon_text == "04h04m"
    assert row.lat_text == "+89°59′24″"


def test_text_for_the_clipboard():
    text = everyframe.as_text(everyframe.table(DIRECTION, MOMENT, site=DEMO), "Heading")
    lines = text.split("\n")
    assert lines[0] == "Heading"
    assert lines[1].startswith("icrs\tα 04h04m00")
    assert len(lines) == 1 + len(everyframe.FRAMES)

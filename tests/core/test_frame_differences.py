"""The same direction in every frame: the differences, and position angles carried from north to north."""

import math

import erfa
import numpy as np
import pytest

from colure import everyframe, frames, ledger
from colure.arrays import ARCSEC, DEG, cartesian, position_angle, separation, spherical
from colure.errors import FrameError
from colure.frames import Frame
from colure.moment import Moment
from colure.reduction import Observer
from colure.sites import DEMO

NIGHT = Moment.parse("2026-06-01 00:00 TT")
HERE = frames.to_icrs(cartesian(75.0 * DEG, 4.0 * DEG), "ecliptic/mean/J2000")


def by_frame(rows):  # type: ignore[no-untyped-def]
    return {row.frame: row for row in rows}


def test_differences_have_the_published_sizes() -> None:
    # 22.1′ of precession in longitude and 12.4″ × sin(λ + 5°) in latitude in mid-2026, nutation +6.5″ (recomputed with
    # ERFA for this date): 50.288″ a year over 26.41 years; the pole's motion of 47″ a century.
    rows = by_frame(everyframe.differences(HERE, NIGHT, "ecliptic/mean/J2000"))
    mean, true = rows["ecliptic/mean/date"], rows["ecliptic/true/date"]
    assert mean.dlon_arcsec / 60.0 == pytest.approx(22.1, abs=0.1)
    assert mean.dlat_arcsec == pytest.approx(0.468 * 26.41 * math.sin(80.0 * DEG), abs=0.15)
    assert true.dlon_arcsec - mean.dlon_arcsec == pytest.approx(6.5, abs=0.1)
    assert true.dlat_arcsec == pytest.approx(mean.dlat_arcsec, abs=0.01)
    bias = rows["equator/mean/J2000"].size_arcsec - rows["icrs"].size_arcsec
    assert abs(bias) < 0.0232
    assert rows["ecliptic/mean/J2000"].size_arcsec < 1e-9


def test_b1950_is_behind_in_longitude() -> None:
    # −41.9′ from J2000 in longitude (50 tropical years of 50.26″), with E-terms of up to 0.34″.
    rows = by_frame(everyframe.differences(HERE, NIGHT, "icrs"))
    assert rows["equator/fk4/B1950"].dlam_arcsec / 60.0 == pytest.approx(-41.9, abs=0.1)
    date = rows["equator/mean/date"]
    assert date.dlam_arcsec / 60.0 == pytest.approx(22.1, abs=0.1)
    # A shift of 22′ keeps its length in any axes but for the bend of their parallels, 1 part in 1,000 here.
    for lon, lat in ((date.dlam_arcsec, date.dbeta_arcsec), (date.dra_arcsec, date.ddec_arcsec)):
        assert math.hypot(lon, lat) == pytest.approx(date.size_arcsec, rel=3e-3)


def test_differences_are_those_of_the_figures() -> None:
    rows = by_frame(everyframe.differences(HERE, NIGHT, "equator/true/date"))
    lon, lat = spherical(frames.from_icrs(HERE, "equator/true/date", NIGHT))
    other, high = spherical(frames.from_icrs(HERE, "equator/mean/date", NIGHT))
    row = rows["equator/mean/date"]
    assert row.dlon_arcsec == pytest.approx(float(other - lon) * math.cos(float(lat)) / ARCSEC, abs=1e-3)
    assert row.dlat_arcsec == pytest.approx(float(high - lat) / ARCSEC, abs=1e-3)


def test_along_and_across_the_motion() -> None:
    # A body read without nutation in longitude is off along the ecliptic; along its own motion by the cosine between.
    moment = Moment.parse("2026-12-01 21:36")
    found, ahead = (ledger.body("mars", at, frame="ecliptic/true/date") for at in (moment, moment.shifted(1 / 1440)))
    motion = ahead.direction - found.direction
    rows = everyframe.differences(found.direction, moment, "ecliptic/true/date", motion=motion)
    row = by_frame(rows)["ecliptic/mean/date"]
    assert math.hypot(row.along_arcsec, row.across_arcsec) == pytest.approx(row.size_arcsec, rel=1e-9)
    local, there = (frames.from_icrs(v, "ecliptic/true/date", moment) for v in (found.direction, ahead.direction))
    course = float(position_angle(local, there)) / DEG
    assert row.along_arcsec == pytest.approx(row.size_arcsec * math.cos((row.pa_deg - course) * DEG), rel=1e-4)
    # Left of the motion on the sky, with east at left, is where the position angle is larger by a quarter turn.
    assert row.across_arcsec == pytest.approx(row.size_arcsec * math.sin((row.pa_deg - course) * DEG), rel=1e-4)
    still = by_frame(everyframe.differences(found.direction, moment, "icrs"))["galactic"]
    assert math.isnan(still.along_arcsec)


def test_a_frame_without_an_answer_says_why() -> None:
    rows = by_frame(everyframe.differences(HERE, NIGHT, "icrs"))
    assert "site" in rows["horizon"].fault
    assert math.isnan(rows["horizon"].size_arcsec)
    turns = by_frame(everyframe.norths(HERE, NIGHT))
    assert "site" in turns["horizon"].fault
    with pytest.raises(FrameError, match="site"):
        everyframe.differences(HERE, NIGHT, "horizon")


# Position angles


def test_position_angle_of_date() -> None:
    # PA(date) − PA(J2000) = n T sin α / cos δ, with n = 20.04″ a year (Newcomb's n; any textbook): 0.1 % over 26 years.
    lon, lat = (float(v) for v in spherical(HERE))
    turned = everyframe.carry_angle(10.0, "equator/mean/J2000", "equator/mean/date", HERE, NIGHT) - 10.0
    assert turned * 3600.0 == pytest.approx(20.04 * 26.41 * math.sin(lon) / math.cos(lat), rel=5e-3)


def test_ecliptic_north_by_the_formula() -> None:
    # tan PA = −sin ε cos α / (cos ε cos δ + sin ε sin δ sin α): the bearing of the ecliptic's pole, spherical triangle.
    v = frames.from_icrs(HERE, "equator/mean/date", NIGHT)
    ra, dec = (float(part) for part in spherical(v))
    e = float(erfa.obl06(*NIGHT.tt))
    up = math.cos(e) * math.cos(dec) + math.sin(e) * math.sin(dec) * math.sin(ra)
    expected = math.atan2(-math.sin(e) * math.cos(ra), up) / DEG
    # Counted from the equator's north, the pole stands at that angle: an object's PA loses it.
    turned = everyframe.carry_angle(0.0, "equator/mean/date", "ecliptic/mean/date", HERE, NIGHT)
    assert (-turned - expected + 180.0) % 360.0 - 180.0 == pytest.approx(0.0, abs=1e-9)


def test_zenith_by_the_parallactic_angle() -> None:
    # ERFA's hd2pa from hour angle, declination and latitude; polar motion turns the pole by 0.4″.
    moment = Moment.parse("2026-12-01 21:36")
    v = frames.from_icrs(HERE, "equator/true/date", moment)
    ra, dec = (float(part) for part in spherical(v))
    from colure import sidereal

    hour = float(sidereal.local(moment, DEMO)) - ra
    q = float(erfa.hd2pa(hour, dec, DEMO.lat_deg * DEG)) / DEG
    turned = everyframe.carry_angle(q, "equator/true/date", "horizon", HERE, moment, DEMO)
    assert (turned + 180.0) % 360.0 - 180.0 == pytest.approx(0.0, abs=1e-3)


def test_angles_go_there_and_back_even_at_the_pole_of_icrs() -> None:
    rng = np.random.default_rng(3)
    places = [v / np.sqrt(v @ v) for v in rng.normal(size=(20, 3))] + [np.array([0.0, 0.0, 1.0])]
    for v in places:
        for name in everyframe.NORTHS:
            there = everyframe.carry_angle(123.4, "equator/true/date", name, v, NIGHT, DEMO)
            back = everyframe.carry_angle(there, name, "equator/true/date", v, NIGHT, DEMO)
            assert back == pytest.approx(123.4, abs=1e-6)


def test_an_arrow_keeps_its_direction_on_the_sky() -> None:
    # The same two points, seen in any right-handed frame, under the angle that is carried there.
    near = HERE + 1e-6 * np.array([0.3, -0.2, 0.5])
    base = float(position_angle(HERE, near)) / DEG
    for name in ("ecliptic/true/date", "galactic", "equator/fk4-no-e/B1950"):
        a, b = (frames.from_icrs(v, name, NIGHT) for v in (HERE, near))
        carried = everyframe.carry_angle(base, "icrs", name, HERE, NIGHT)
        assert carried == pytest.approx(
            float(position_angle(a, b)) / DEG, abs=1e-3
        )  # FK4's matrix keeps angles to 1e-6


@pytest.mark.parametrize(
    ("call", "needle"),
    [
        (lambda: everyframe.norths(HERE, NIGHT, pa_deg=math.nan), "finite"),
        (lambda: everyframe.carry_angle(1.0, "icrs", "horizon", HERE, NIGHT), "site"),
        (lambda: everyframe.carry_angle(1.0, "icrs", "galactic", np.array([0.0, 0.0, 1.0]), NIGHT), "its pole"),
    ],
)
def test_bad_angles_are_one_clear_line(call, needle: str) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(FrameError) as caught:
        call()
    assert needle in str(caught.value)
    assert "\n" not in str(caught.value)


def test_the_table_and_the_ledger_agree() -> None:
    moment = Moment.parse("2026-12-01 21:36")
    for frame in ("ecliptic/true/date", "horizon", "galactic"):
        found = ledger.body("venus", moment, observer=Observer("site", DEMO), frame=frame, place="apparent")
        row = everyframe.row(found.direction, Frame.parse(frame), moment, site=DEMO)
        assert separation(cartesian(row.lon_deg * DEG, row.lat_deg * DEG), found.vector) < 1e-12

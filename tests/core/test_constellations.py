"""The constellation grid, held against an independent library, the published table and its own edges."""

import erfa
import numpy as np
import pytest

from colure import constellations, resources
from colure.arrays import ARCSEC, cartesian, separation, spherical, unit
from colure.errors import TargetError


def _random_directions(count: int, seed: int) -> np.ndarray:
    return unit(np.random.default_rng(seed).normal(size=(count, 3)))


def _at_b1875(ra_h: float, dec_deg: float) -> np.ndarray:
    return cartesian(np.radians(ra_h * 15.0), np.radians(dec_deg)) @ constellations.b1875_matrix()


def _from_nearest_edge(direction: np.ndarray) -> float:
    """Return the angle in radians to the nearest sample of the edges."""
    return float(separation(direction, constellations.edges(0.05).points).min())


def test_agrees_with_astropy_on_random_points() -> None:
    # astropy.coordinates.get_constellation uses Roman's four decimals (0.12 s = 1.8″ off) and another precession
    # (0.6″): a point may differ only beside an edge, within the sum of the two and the spacing of the samples of the
    # edges (0.05°/2). GCRS directions, because from ICRS it would put 20″ of aberration in.
    from astropy.coordinates import GCRS, SkyCoord, get_constellation

    v = _random_directions(20000, 20260812)
    lon, lat = spherical(v)
    theirs = get_constellation(SkyCoord(lon, lat, unit="rad", frame=GCRS()), short_name=True)
    differ = np.flatnonzero(constellations.of(v) != theirs)
    assert len(differ) <= 3
    for i in differ:
        assert _from_nearest_edge(v[i]) < np.radians(0.025) + 3.0 * ARCSEC


def test_follows_the_published_table_zone_by_zone() -> None:
    # Roman 1987 (CDS VI/42) as carried by astropy: a point just inside the lower corner of each of its 357 zones
    # belongs to the zone unless an earlier one holds it. Two seconds and two arcseconds in, rounding cannot matter.
    from importlib.resources import files

    text = files("astropy.coordinates").joinpath("data/constellation_data_roman87.dat").read_text(encoding="utf-8")
    zones = [line.split() for line in text.splitlines() if line.strip() and not line.startswith("#")]
    assert len(zones) == 357
    table = [(float(a), float(b), float(d), code) for a, b, d, code in zones]
    for low, _high, bottom, _ in table:
        ra_h, dec = low + 2.0 / 3600.0, bottom + 2.0 / 3600.0
        expected = next(code for a, b, d, code in table if d <= dec and a <= ra_h < b)
        assert constellations.of(_at_b1875(ra_h, dec)) == expected, (low, bottom)


@pytest.mark.parametrize(
    ("limit_h", "dec_deg", "before", "after"),
    [(6.0 + 14.5 / 60.0, 3.0, "Ori", "Mon"), (18.0 + 10.5 / 60.0, 39.0, "Her", "Lyr")],
)
def test_edge_lies_on_the_whole_second(limit_h: float, dec_deg: float, before: str, after: str) -> None:
    # Delporte 1930, as quoted beside the published rows: limits at 6h14m30s and 18h10m30s, where the four decimals of
    # the table would move them by up to 0.12 s. A tenth of a millisecond either side is tested.
    assert constellations.of(_at_b1875(limit_h - 1e-4 / 3600.0, dec_deg)) == before
    assert constellations.of(_at_b1875(limit_h + 1e-4 / 3600.0, dec_deg)) == after


def test_b1875_is_within_the_stated_error_of_newcomb() -> None:
    # The B1875 equator by Newcomb's precession (astropy FK4NoETerms, without E-terms) and ours differ by 0.6″ at most.
    from astropy.coordinates import ICRS, CartesianRepresentation, FK4NoETerms

    v = _random_directions(500, 3)
    theirs = ICRS(CartesianRepresentation(*v.T)).transform_to(FK4NoETerms(equinox="B1875")).cartesian.xyz.value.T
    off = separation(v @ constellations.b1875_matrix().T, unit(theirs)) / ARCSEC
    assert off.max() < 0.7


def test_poles_and_directions_that_are_none() -> None:
    south = np.array([0.0, 0.0, -1.0]) @ constellations.b1875_matrix()
    north = -south
    assert constellations.of(np.stack([north, south, 7.0 * south])).tolist() == ["UMi", "Oct", "Oct"]
    none = np.array([[0.0, 0.0, 0.0], [np.nan, 0.0, 1.0], [np.inf, 0.0, 1.0], [1.0, 0.0, 0.0]])
    assert constellations.of(none).tolist() == ["", "", "", "Psc"]


def test_shapes_follow_the_input() -> None:
    v = _random_directions(24, 5)
    flat = constellations.of(v)
    assert constellations.of(v.reshape(2, 3, 4, 3)).tolist() == flat.reshape(2, 3, 4).tolist()
    assert constellations.of(v[0]).shape == ()
    assert constellations.of(np.zeros((0, 3))).shape == (0,)
    assert constellations.of(v.astype(np.float32)).tolist() == flat.tolist()


def test_every_edge_separates_its_two_constellations() -> None:
    # Walk the middle of each arc and look 1″ to both sides of it along B1875 right ascension or declination.
    edges = constellations.edges(0.25)
    middle = (edges.starts[:-1] + edges.starts[1:]) // 2
    # The middle sample of a two-point arc is its end: take the mean of the two samples about it instead.
    v = unit(edges.points[middle] + edges.points[middle - 1]) @ constellations.b1875_matrix().T
    ra, dec = spherical(v)
    # A chord lies poleward of its parallel; set the declination back to that of the arc.
    dec = np.where(edges.parallel, spherical(edges.points[middle] @ constellations.b1875_matrix().T)[1], dec)
    step = ARCSEC
    d_ra = np.where(edges.parallel, 0.0, step / np.cos(dec))
    d_dec = np.where(edges.parallel, step, 0.0)
    first = constellations.of(cartesian(ra - d_ra, dec - d_dec) @ constellations.b1875_matrix())
    second = constellations.of(cartesian(ra + d_ra, dec + d_dec) @ constellations.b1875_matrix())
    assert (np.stack([first, second], axis=-1) == edges.pairs).all()


def test_edges_are_complete() -> None:
    # Counted from Roman's table cut at 0h: 399 arcs of parallel and 379 of meridian; seven parallels run through 0h.
    edges = constellations.edges()
    assert (int(edges.parallel.sum()), int((~edges.parallel).sum())) == (399 - 7, 379)
    assert edges.starts[0] == 0
    assert edges.starts[-1] == len(edges.points)
    assert not edges.points.flags.writeable
    # No pair of consecutive random points changes constellation without an edge of that very pair in between.
    v = _random_directions(4000, 11)
    near = unit(v + 0.01 * _random_directions(4000, 12))
    a, b = constellations.of(v), constellations.of(near)
    borders = {frozenset(pair) for pair in edges.pairs.tolist()}
    crossing = [(x, y) for x, y in zip(a.tolist(), b.tolist(), strict=True) if x != y]
    direct = sum(frozenset(pair) in borders for pair in crossing)
    assert direct >= 0.95 * len(crossing)  # the rest pass a corner through a third constellation
    assert len(crossing) > 100


@pytest.mark.parametrize(("step_deg", "limit_arcsec"), [(1.0, 8.0), (0.25, 0.5)])
def test_chords_keep_to_the_stated_error(step_deg: float, limit_arcsec: float) -> None:
    edges = constellations.edges(step_deg)
    last = np.zeros(len(edges.points), dtype=bool)
    last[edges.starts[1:] - 1] = True
    i = np.flatnonzero(~last)
    assert separation(edges.points[i], edges.points[i + 1]).max() <= np.radians(step_deg) * 1.0001
    matrix = constellations.b1875_matrix().T
    ends = spherical(edges.points[i] @ matrix)[1]
    middle = spherical((edges.points[i] + edges.points[i + 1]) @ matrix)[1]
    on_parallel = np.repeat(edges.parallel, np.diff(edges.starts))[i]
    low = on_parallel & (np.abs(ends) < np.radians(75.0))
    sag = np.abs(middle - ends) / ARCSEC
    # 1e-6″ is what rounding leaves on the equator.
    assert (sag[low] <= limit_arcsec * np.abs(np.tan(ends[low])) + 1e-6).all()
    # Nearer the poles the samples are as far apart in right ascension as at 76°, and the error falls again.
    assert sag[on_parallel].max() <= 4.0 * limit_arcsec


def test_anchors_are_well_inside() -> None:
    anchors = constellations.anchors()
    assert len(anchors.codes) == 89
    assert constellations.of(anchors.points).tolist() == anchors.codes.tolist()
    assert sorted(set(anchors.codes.tolist())) == [entry.code for entry in constellations.constellations()]
    assert anchors.codes.tolist().count("Ser") == 2
    edges = constellations.edges(0.25)
    on_arc = np.repeat(np.arange(len(edges.pairs)), np.diff(edges.starts))
    for code, point, radius in zip(anchors.codes, anchors.points, anchors.radius, strict=True):
        own = (edges.pairs == code).any(axis=1)[on_arc]
        distance = separation(point, edges.points[own]).min()
        # 0.25° samples of the edge, 0.3′ of the search.
        assert abs(distance - radius) < np.radians(0.03), code


def test_names_and_neighbours() -> None:
    assert constellations.find("ursae majoris").code == "UMa"
    assert constellations.find("BOO").name == "Boötes"
    assert constellations.find("Serpens").genitive == "Serpentis"
    # From memory of any atlas: Ophiuchus stands between the two parts of Serpens, Scorpius and Sagittarius below it.
    assert constellations.neighbours("Oph") == ("Aql", "Her", "Lib", "Sco", "Ser", "Sgr")
    assert len({frozenset(pair) for pair in constellations.edges().pairs.tolist()}) == 255
    with pytest.raises(TargetError, match=r"'Oriom'.*did you mean 'Orion'"):
        constellations.find("Oriom")


def test_areas_fill_the_sphere() -> None:
    # 4π steradians in square degrees: 129600/π.
    assert abs(sum(entry.area_deg2 for entry in constellations.constellations()) - 129600.0 / np.pi) < 1e-8


def test_cells_name_every_constellation() -> None:
    cells = resources.load_array("constellations/cells.npy")
    assert np.unique(cells).tolist() == list(range(88))


def test_b1875_epoch() -> None:
    # ERFA's Besselian epoch: 2405889.258550475.
    jd1, jd2 = erfa.epb2jd(1875.0)
    assert abs(jd1 + jd2 - constellations.B1875_JD) < 1e-5

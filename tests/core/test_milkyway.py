"""The Milky Way's outlines: closed, turned the right way, nested, and where the Milky Way is."""

import erfa
import numpy as np
import pytest

from colure import milkyway, resources, stars
from colure.arrays import DEG, cartesian, separation, unit
from colure.errors import ResourceError


def galactic(lon_deg: float, lat_deg: float) -> np.ndarray:
    return cartesian(*erfa.g2icrs(lon_deg * DEG, lat_deg * DEG))


def following(outline: milkyway.Outline) -> np.ndarray:
    after = np.arange(1, len(outline.points) + 1)
    after[outline.starts[1:] - 1] = outline.starts[:-1]
    return outline.points[after]


def holds(outline: milkyway.Outline, point: np.ndarray) -> bool:
    """Whether a direction lies inside: its angle round the rings, by crossings of the arc from the outside point."""
    a, b = outline.points, following(outline)
    normal = np.cross(point, outline.outside)
    edge = np.cross(a, b)
    splits = (a @ normal >= 0) != (b @ normal >= 0)
    between = (edge @ point >= 0) != (edge @ outline.outside >= 0)
    meet = np.cross(normal, edge)
    same = (meet @ (point + outline.outside) > 0) == ((meet * (a + b)).sum(axis=1) > 0)
    return bool(np.count_nonzero(splits & between & same) % 2)


def test_shape() -> None:
    found = milkyway.outlines()
    assert [outline.level for outline in found] == [1, 2, 3, 4, 5]
    for outline in found:
        assert np.allclose(np.linalg.norm(outline.points, axis=1), 1.0, atol=1e-6)
        assert outline.starts[0] == 0
        assert outline.starts[-1] == len(outline.points)
        # Smooth: no piece longer than a few degrees, none of no length.
        step = separation(outline.points, following(outline)) / DEG
        assert step.min() > 0.0
        assert step.max() < 6.0
    assert sum(len(outline.points) for outline in found) < 6000


def test_known_clouds_and_gaps() -> None:
    # Galactic longitudes and latitudes of well-known features (star atlases, from memory).
    bright = {"Cygnus": (72.0, 3.0), "Carina": (287.0, -1.0), "Crux–Centaurus": (298.0, 0.0), "Norma": (330.0, -2.0)}
    faint, _, middle, _, _ = milkyway.outlines()
    for place in bright.values():
        assert holds(faint, galactic(*place))
        assert holds(middle, galactic(*place))
    assert not holds(middle, galactic(303.0, -1.0))  # the Coalsack
    assert not holds(faint, galactic(20.0, 5.0))  # the Great Rift
    for lon in (0.0, 90.0, 200.0, 300.0):
        for lat in (-60.0, -40.0, 40.0, 60.0, 89.0):
            assert not holds(faint, galactic(lon, lat))
    assert not holds(faint, -milkyway.OUTSIDE)


def test_levels_lie_within_each_other() -> None:
    rng = np.random.default_rng(7)
    places = [galactic(rng.uniform(0, 360), rng.normal(0, 7)) for _ in range(1500)]
    inside = np.array([[holds(outline, place) for place in places] for outline in milkyway.outlines()])
    shares = inside.mean(axis=1)
    assert np.all(np.diff(shares) < 0)
    # Islands and holes under 3 square degrees are left out of each level by itself: 1 % of these places.
    assert np.mean(inside[1:] & ~inside[:-1]) < 0.01


def test_the_denser_side_is_on_the_left() -> None:
    catalogue = stars.catalogue()
    outline = milkyway.outlines()[1]
    a, b = outline.points, following(outline)
    left, right = 0, 0
    wins = 0
    chosen = range(0, len(a), 40)
    for k in chosen:
        across = unit(np.cross(a[k], b[k])) * np.tan(2.0 * DEG)
        counts = []
        for side in (across, -across):
            lon, lat = np.arctan2(*(a[k] + side)[[1, 0]]), np.arcsin(unit(a[k] + side)[2])
            near = catalogue.cone(lon, lat, 1.5 * DEG, vmag=11.5)
            counts.append(np.count_nonzero(near.vmag > 6.0))
        left, right = left + counts[0], right + counts[1]
        wins += counts[0] > counts[1]
    assert left > 1.2 * right
    assert wins > 0.85 * len(chosen)


def test_each_ring_turns_the_way_its_parity_says() -> None:
    # A step to the left of any edge must lie inside under the even-odd rule, a step to the right outside.
    for outline in milkyway.outlines():
        a, b = outline.points, following(outline)
        for k in range(0, len(a), max(1, len(a) // 60)):
            middle = unit(a[k] + b[k])
            across = unit(np.cross(a[k], b[k])) * 0.02 * DEG
            assert holds(outline, unit(middle + across))
            assert not holds(outline, unit(middle - across))


def test_damaged_files_are_one_clear_line(tmp_path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(resources, "root", lambda: tmp_path)
    (tmp_path / "milkyway").mkdir()
    np.save(tmp_path / "milkyway" / "points.npy", np.zeros((6, 3), "<f4"))
    for rings, match in ((np.zeros(3, "<i4"), "shapes"), (np.array([[0, 1], [5, 1]], "<i4"), "fewer than 3")):
        np.save(tmp_path / "milkyway" / "rings.npy", rings)
        milkyway.outlines.cache_clear()
        with pytest.raises(ResourceError, match=match):
            milkyway.outlines()
    milkyway.outlines.cache_clear()

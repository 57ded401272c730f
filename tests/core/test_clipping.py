"""Lines and areas cut at every edge and seam: what is filled on the page is what lies in the area on the sky."""

import numpy as np
import pytest

from colure.arrays import cartesian
from colure.clipping import Window, lines
from colure.clipping_areas import areas
from colure.projections import PROJECTIONS, projector

FRAME = (0.0, 0.0, 1000.0, 600.0)
NAMES = sorted(PROJECTIONS)
Z, X = np.array([0.0, 0.0, 1.0]), np.array([1.0, 0.0, 0.0])
CENTRES = [(0.0, 0.0), (170.0, 10.0), (181.0, -35.0), (75.0, 88.0), (0.0, -90.0)]
WIDTHS = [0.5, 100.0, 360.0]


def window(
    name: str, centre: tuple[float, float], width: float, rotation: float = 0.0, east_left: bool = True
) -> Window:
    widest = {"orthographic": 180.0, "gnomonic": 150.0, "stereographic": 320.0}.get(name, 360.0)
    c = cartesian(*np.radians(centre))
    p = projector(
        name, c, Z, X, east_left=east_left, width=np.radians(min(width, widest)), rotation=rotation, frame=FRAME
    )
    return Window.of(p, FRAME)


def ring(lat_deg: float, n: int = 360) -> np.ndarray:
    return cartesian(np.radians(np.arange(n) * 360.0 / n), np.radians(lat_deg)).T


def cap(centre: tuple[float, float], radius_deg: float, n: int = 180) -> np.ndarray:
    c = cartesian(*np.radians(centre))
    a = np.cross(c, [0.2, 0.3, 0.9])
    a /= np.linalg.norm(a)
    b = np.cross(c, a)
    t = np.arange(n) * 2 * np.pi / n
    r = np.radians(radius_deg)
    return c[:, None] * np.cos(r) + np.sin(r) * (a[:, None] * np.cos(t) + b[:, None] * np.sin(t))


def filled(points: np.ndarray, starts: np.ndarray, probes: np.ndarray) -> np.ndarray:
    """Return the even-odd count of rings at probes (N, 2), by rays along +x."""
    odd = np.zeros(len(probes), dtype=bool)
    for k in range(len(starts) - 1):
        a = points[starts[k] : starts[k + 1]].astype(np.float64)
        b = np.roll(a, -1, axis=0)
        over = (a[:, 1] > probes[:, 1, None]) != (b[:, 1] > probes[:, 1, None])
        dy = np.where(b[:, 1] == a[:, 1], 1.0, b[:, 1] - a[:, 1])
        x = a[:, 0] + (probes[:, 1, None] - a[:, 1]) / dy * (b[:, 0] - a[:, 0])
        odd ^= (over & (x > probes[:, 0, None])).sum(axis=1) % 2 == 1
    return odd


def probes(w: Window) -> tuple[np.ndarray, np.ndarray]:
    page = np.random.default_rng(7).uniform([0, 0], [1000, 600], (700, 2))
    sky = w.projector.unproject(page)
    on = np.isfinite(sky).all(axis=1)
    return page[on], sky[on]


def angle_of_a_pixel(w: Window, page: np.ndarray) -> np.ndarray:
    """Return the angle on the sky of the longest step of one pixel at page points (N, 2)."""
    here = w.projector.unproject(page)
    steps = [[1.0, 0.0], [0.0, 1.0], [-1.0, 0.0], [0.0, -1.0], [0.7, 0.7], [-0.7, 0.7], [0.7, -0.7], [-0.7, -0.7]]
    there = [np.linalg.norm(w.projector.unproject(page + s) - here, axis=1) for s in steps]
    return np.nan_to_num(np.max(there, axis=0), nan=0.3)


def to_camera(w: Window, columns: np.ndarray) -> np.ndarray:
    return w.projector.to_camera(columns)


def check(w: Window, rings: list[np.ndarray], outside: np.ndarray, margin, kind: type = np.float64) -> None:
    """`margin(sky)` is the signed angle (rad) inside the area; probes within three pixels of its edge are left out."""
    columns = np.concatenate(rings, axis=1)
    starts = np.concatenate([[0], np.cumsum([r.shape[1] for r in rings])]).astype(np.int32)
    # As charts do, half the time: outlines kept in float32, which are unit vectors to 1e-7 only.
    columns = columns.astype(kind)
    points, ends = areas(w, to_camera(w, columns), starts, w.projector.camera @ outside)
    assert np.isfinite(points).all()
    page, sky = probes(w)
    # Chords of 1° arcs sag by 4e-5 rad on the sky, and as chords of curves on the page by up to two pixels.
    sure = np.abs(margin(sky)) > 1e-4 + 3.0 * angle_of_a_pixel(w, page)
    assert sure.sum() > 100
    inside = filled(points, ends, page)
    wrong = (inside != (margin(sky) > 0.0)) & sure
    assert not wrong.any(), f"{wrong.sum()} of {sure.sum()} probes wrong, first at {page[wrong][0]}"


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("centre", CENTRES)
@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize(("rotation", "kind"), [(0.0, np.float64), (0.7, np.float32)])
def test_belt_round_the_sky(name, centre, width, rotation, kind):
    """A belt with two outlines, straight along the equator and so across the seam and the edge."""
    w = window(name, centre, width, rotation)
    half = np.radians(9.0)
    check(w, [ring(9.0), ring(-9.0)], Z, lambda v: half - np.abs(np.arcsin(np.clip(v[:, 2], -1, 1))), kind)


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("centre", CENTRES)
@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize(
    ("middle", "radius"),
    [
        ((10.0, 85.0), 20.0),  # contains the pole
        ((-120.0, -80.0), 25.0),  # contains the other pole
        ((180.0, 0.0), 30.0),  # over the antimeridian, or the point opposite the centre
        ((0.0, 0.0), 100.0),  # more than half the sky
        ((75.0, 87.0), 1.0),  # small, near a pole and near some centres
        ((40.0, -20.0), 0.02),  # seldom in sight
    ],
)
def test_a_cap_anywhere(name, centre, width, middle, radius):
    w = window(name, centre, width)
    c = cartesian(*np.radians(middle))
    r = np.radians(radius)
    check(w, [cap(middle, radius)], -c, lambda v: r - np.arccos(np.clip(v @ c, -1, 1)))


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("centre", CENTRES)
@pytest.mark.parametrize("width", [20.0, 100.0, 360.0])
@pytest.mark.parametrize("kind", [np.float32, np.float64])
def test_ragged_rings_and_islands_cut_many_times(name, centre, width, kind):
    """A belt with a wavy edge, a hole in it and an island beside it: many crossings, one shape under even-odd."""
    w = window(name, centre, width)
    lon = np.radians(np.arange(0.0, 360.0, 1.0))
    wave = np.radians(15.0 + 12.0 * np.sin(9.0 * lon))
    rings = [cartesian(lon, wave).T, cartesian(lon, np.full(360, np.radians(-20.0))).T]
    hole, island = (60.0, -8.0), (200.0, -50.0)
    rings += [cap(hole, 6.0), cap(island, 15.0)]

    def margin(v: np.ndarray) -> np.ndarray:
        lat = np.arcsin(np.clip(v[:, 2], -1, 1))
        at = np.arctan2(v[:, 1], v[:, 0])
        # Angles to the wavy edge are shorter than the difference of latitude by its slope, 2.1 at most.
        edge = np.minimum((np.radians(15.0 + 12.0 * np.sin(9.0 * at)) - lat) / 2.4, lat + np.radians(20.0))
        to_hole, to_island = (np.arccos(np.clip(v @ cartesian(*np.radians(c)), -1, 1)) for c in (hole, island))
        belt = np.minimum(edge, to_hole - np.radians(6.0))
        return np.maximum(belt, np.radians(15.0) - to_island)

    check(w, rings, Z, margin, kind)


@pytest.mark.parametrize("name", NAMES)
def test_an_area_that_fills_the_map_has_the_map_as_its_outline(name):
    w = window(name, (0.0, 0.0), 20.0)
    check(w, [cap((0.0, 0.0), 80.0)], -X, lambda v: np.radians(80.0) - np.arccos(np.clip(v @ X, -1, 1)))


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("centre", CENTRES)
@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("inclination", [0.0, 23.4, 62.9, 90.0])
def test_great_circles_stay_on_the_circle_and_in_one_piece(name, centre, width, inclination):
    """Every point of every drawn piece lies on the circle, no piece leaps over the page, and all of it is drawn."""
    w = window(name, centre, width)
    t = np.radians(np.arange(0.0, 360.25, 0.5))
    i = np.radians(inclination)
    points = np.stack([np.cos(t), np.sin(t) * np.cos(i), np.sin(t) * np.sin(i)])
    pole = np.array([0.0, -np.sin(i), np.cos(i)])
    out, starts = lines(w, w.projector.to_camera(points), np.array([0, points.shape[1]], np.int32))
    out = out.astype(np.float64)
    # Interior points of each segment, put back on the sky, are on the great circle (0.5° chords, pixels in float32).
    for k in range(len(starts) - 1):
        a, b = out[starts[k] : starts[k + 1] - 1], out[starts[k] + 1 : starts[k + 1]]
        seen = ((a > [0, 0]) & (a < [1000, 600]) & (b > [0, 0]) & (b < [1000, 600])).all(axis=1)
        for f in (0.25, 0.5, 0.75):
            page = a[seen] + f * (b[seen] - a[seen])
            sky = w.projector.unproject(page)
            on = np.isfinite(sky).all(axis=1)
            off = np.abs(np.arcsin(np.clip(sky[on] @ pole, -1, 1)))
            assert (off < 1e-4 + 2.0 * angle_of_a_pixel(w, page)[on]).all()
    # Completeness: every point of the circle that is well inside the map has a drawn segment within a pixel.
    fine = np.radians(np.arange(0.0, 360.0, 0.37))
    sky = np.stack([np.cos(fine), np.sin(fine) * np.cos(i), np.sin(fine) * np.sin(i)], axis=1)
    page = w.projector.project(sky)
    ok = np.isfinite(page).all(axis=1)
    ok &= (page > [2, 2]).all(axis=1) & (page < [998, 598]).all(axis=1)
    if ok.any():
        a = np.concatenate([out[starts[k] : starts[k + 1] - 1] for k in range(len(starts) - 1)])
        b = np.concatenate([out[starts[k] + 1 : starts[k + 1]] for k in range(len(starts) - 1)])
        d = b - a
        ap = page[ok][:, None] - a
        u = np.clip((ap * d).sum(-1) / np.maximum((d * d).sum(-1), 1e-12), 0, 1)
        distance = np.linalg.norm(ap - u[..., None] * d, axis=-1).min(axis=1)
        # A chord of 0.5° leaves its arc by at most 1e-5 rad on the sky, several times that where the map is stretched.
        assert distance.max() < 1.0 + 2e-3 * w.projector.scale


@pytest.mark.parametrize("name", ["stereographic", "gnomonic", "orthographic", "azimuthal-equidistant"])
def test_an_arc_is_cut_exactly_at_the_edge(name):
    """A meridian leaves the projection at its edge: the last point drawn is at that angle from the centre."""
    w = window(name, (0.0, 0.0), 360.0)
    w = Window(w.projector, (-1e9, -1e9, 1e9, 1e9), w.projector.projection.edge)
    t = np.radians(np.append(np.arange(0.0, 179.9, 0.7), 179.995))
    points = np.stack([np.cos(t), np.sin(t), np.zeros(len(t))])
    out, _ = lines(w, w.projector.to_camera(points), np.array([0, len(t)], np.int32))
    reach = np.linalg.norm(out - [500.0, 300.0], axis=1).max() / w.projector.scale
    # Pixels are float32: 1e-7 of the largest of them, and the stereographic edge is 57 radians out.
    assert reach == pytest.approx(w.projector.projection.half(w.projector.projection.edge), rel=2e-6)


@pytest.mark.parametrize("name", ["hammer", "plate-carree", "mercator"])
def test_an_arc_over_the_seam_ends_on_both_sides_of_it(name):
    w = window(name, (0.0, 0.0), 360.0)
    arc = cartesian(np.radians([178.0, 179.5, 181.0, 183.0]), np.radians([10.0, 10.0, 12.0, 12.0])).T
    out, starts = lines(w, w.projector.to_camera(arc), np.array([0, 4], np.int32))
    sky = w.projector.unproject(out.astype(np.float64))
    assert len(starts) - 1 >= 2
    left, right = out[out[:, 0] < 500], out[out[:, 0] > 500]
    assert len(left)
    assert len(right)
    # East is left: longitude 178° is near the left end, and the cut points mirror each other over the middle.
    assert left[:, 0].min() == pytest.approx(1000.0 - right[:, 0].max(), abs=1e-3)
    assert np.isfinite(sky).any()


def test_a_small_cap_is_found_by_a_long_arc():
    """Both ends of an arc are far outside a field of half a degree that it crosses."""
    w = window("gnomonic", (0.0, 0.0), 0.5)
    arc = cartesian(np.radians([-2.0, 2.0]), np.radians([0.01, 0.01])).T
    out, _ = lines(w, w.projector.to_camera(arc), np.array([0, 2], np.int32))
    assert len(out) == 2
    assert out[:, 0].min() < 0.0
    assert out[:, 0].max() > 1000.0

"""Projections: known points, inverses, and handedness at the corners for every flip."""

import numpy as np
import pytest

from colure.arrays import cartesian, separation
from colure.projections import PROJECTIONS, orientation, projector

FRAME = (40.0, 30.0, 840.0, 630.0)
NAMES = sorted(PROJECTIONS)


def view(name: str, lon: float = 30.0, lat: float = 20.0, width: float = 60.0, **more):
    options = {"east_left": True, "rotation": 0.0, "frame": FRAME} | more
    centre = cartesian(np.radians(lon), np.radians(lat))
    z, x = np.array([0.0, 0.0, 1.0]), np.array([1.0, 0.0, 0.0])
    return projector(name, centre, z, x, width=np.radians(width), **options)


@pytest.mark.parametrize("name", NAMES)
def test_there_and_back(name):
    p = view(name, width=100.0)
    rng = np.random.default_rng(4)
    page = rng.uniform([FRAME[0], FRAME[1]], [FRAME[2], FRAME[3]], (500, 2))
    sky = p.unproject(page)
    on = np.isfinite(sky).all(axis=1)
    assert on.sum() > 300
    # 1e-9 pixel: the formulas lose at most a few digits of float64 (1e-13 of 1e3 pixels).
    np.testing.assert_allclose(p.project(sky[on]), page[on], atol=1e-9)
    np.testing.assert_allclose(np.linalg.norm(sky[on], axis=1), 1.0, atol=1e-14)


@pytest.mark.parametrize("name", NAMES)
def test_float32_agrees_with_float64_to_a_thousandth_of_a_pixel(name):
    p = view(name, width=100.0)
    page = np.random.default_rng(5).uniform([FRAME[0], FRAME[1]], [FRAME[2], FRAME[3]], (500, 2))
    sky = p.unproject(page)
    sky, page = sky[np.isfinite(sky).all(axis=1)], page[np.isfinite(sky).all(axis=1)]
    camera = p.to_camera(np.ascontiguousarray(sky.T.astype(np.float32)))
    assert camera.dtype == np.float32
    x, y = p.to_page(camera)
    assert x.dtype == np.float32
    # A float32 direction is good to 6e-8; times some 500 pixels a radian, and a little more at the globe's edge.
    inner = camera[2] > 0.3
    np.testing.assert_allclose(np.stack([x, y], axis=1)[inner], page[inner], atol=1e-3)


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("east_left", [True, False])
@pytest.mark.parametrize("rotation_deg", [0.0, 90.0, 180.0, 270.0])
def test_handedness_and_up_at_the_corners(name, east_left, rotation_deg):
    """A degree north and a degree east of the centre, and the four diagonal corners, for every flip and turn."""
    lon, lat = 30.0, 20.0
    p = view(name, lon, lat, east_left=east_left, rotation=np.radians(rotation_deg))
    middle = np.array([440.0, 330.0])
    np.testing.assert_allclose(p.project(cartesian(np.radians(lon), np.radians(lat))), middle, atol=1e-9)
    # East to the left when the sky is seen from inside; turns are anticlockwise on a page whose y runs down.
    east = np.array([-1.0 if east_left else 1.0, 0.0])
    north = np.array([0.0, -1.0])
    turn = np.radians(rotation_deg)
    anticlockwise = np.array([[np.cos(turn), np.sin(turn)], [-np.sin(turn), np.cos(turn)]])
    for d_lon in (-1.0, 0.0, 1.0):
        for d_lat in (-1.0, 0.0, 1.0):
            if d_lon == d_lat == 0.0:
                continue
            there = p.project(cartesian(np.radians(lon + d_lon), np.radians(lat + d_lat))) - middle
            expected = anticlockwise @ (east * d_lon * np.cos(np.radians(lat)) + north * d_lat)
            # Within 12° of the direction, and the unrolled ones within the shear of their own grid.
            cosine = there @ expected / np.linalg.norm(there) / np.linalg.norm(expected)
            assert cosine > np.cos(np.radians(12.0)), (d_lon, d_lat)
            corner = np.sign(np.round(there, 6))
            wanted = np.sign(np.round(anticlockwise @ (east * d_lon + north * d_lat), 6))
            if d_lon and d_lat:
                np.testing.assert_array_equal(corner, wanted)


def test_orientation_is_a_mirror_for_the_sky_and_a_rotation_for_a_map():
    z, x = np.array([0.0, 0.0, 1.0]), np.array([1.0, 0.0, 0.0])
    centre = cartesian(1.0, 0.4)
    for unrolled in (False, True):
        assert np.linalg.det(orientation(centre, z, x, True, unrolled)) == pytest.approx(-1.0)
        assert np.linalg.det(orientation(centre, z, x, False, unrolled)) == pytest.approx(1.0)


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_the_pole_is_the_limit_of_approaching_it(sign):
    z, x = np.array([0.0, 0.0, 1.0]), np.array([1.0, 0.0, 0.0])
    at = orientation(sign * z, z, x, True, False)
    near = orientation(cartesian(0.0, sign * (np.pi / 2 - 1e-7)), z, x, True, False)
    np.testing.assert_allclose(at, near, atol=2e-7)


@pytest.mark.parametrize(
    ("name", "angle_deg", "radius"),
    [
        # Snyder, Map Projections: A Working Manual (USGS PP 1395), the radius formulas for a unit sphere:
        # 2 tan(c/2), tan c, sin c, c, 2 sin(c/2), with c = 60°.
        ("stereographic", 60.0, 1.1547005383792515),
        ("gnomonic", 60.0, 1.7320508075688772),
        ("orthographic", 60.0, 0.8660254037844386),
        ("azimuthal-equidistant", 60.0, 1.0471975511965976),
        ("azimuthal-equal-area", 60.0, 1.0),
        # Along the equator: the longitude itself; Hammer by (5-...) 2√2 cos φ sin(λ/2)/√(1 + cos φ cos(λ/2)) at 60°.
        ("plate-carree", 60.0, 1.0471975511965976),
        ("mercator", 60.0, 1.0471975511965976),
        ("hammer", 60.0, 1.0352761804100832),
    ],
)
def test_radius_on_the_plane(name, angle_deg, radius):
    a = np.radians(angle_deg)
    x, y = PROJECTIONS[name].forward(np.array([[np.sin(a)], [0.0], [np.cos(a)]]))
    assert x[0] == pytest.approx(radius, rel=1e-14)
    assert y[0] == 0.0
    assert PROJECTIONS[name].half(a) == pytest.approx(radius, rel=1e-14)


@pytest.mark.parametrize(
    ("name", "height"),
    # At latitude 60° on the central meridian (Snyder): φ; ln tan(π/4 + φ/2); √2 sin φ/√(1 + cos φ)·... = 2 sin(φ/2).
    [("plate-carree", 1.0471975511965976), ("mercator", 1.3169578969248166), ("hammer", 1.0)],
)
def test_height_on_the_meridian(name, height):
    a = np.radians(60.0)
    _, y = PROJECTIONS[name].forward(np.array([[0.0], [np.sin(a)], [np.cos(a)]]))
    assert y[0] == pytest.approx(height, rel=1e-14)


@pytest.mark.parametrize("name", ["azimuthal-equal-area", "hammer"])
def test_equal_area(name):
    """Small triangles keep their area anywhere on the sky."""
    rng = np.random.default_rng(8)
    v = rng.normal(size=(200, 3))
    v /= np.linalg.norm(v, axis=1)[:, None]
    v = v[np.abs(np.arctan2(v[:, 0], v[:, 2])) < 2.8]
    v = v[v[:, 2] > -0.9]
    e = 1e-5
    a = np.cross(v, [0.3, 0.5, 0.8])
    a /= np.linalg.norm(a, axis=1)[:, None]
    b = np.cross(v, a)
    forward = PROJECTIONS[name].forward
    p0, pa, pb = (np.stack(forward(np.ascontiguousarray(w.T))) for w in (v, v + e * a, v + e * b))
    area = (pa - p0)[0] * (pb - p0)[1] - (pa - p0)[1] * (pb - p0)[0]
    # First-order differences of step 1e-5: relative error about 1e-4 where the map bends most.
    np.testing.assert_allclose(np.abs(area) / e**2, 1.0, atol=2e-3)


@pytest.mark.parametrize("name", ["stereographic", "mercator"])
def test_conformal(name):
    rng = np.random.default_rng(9)
    v = rng.normal(size=(200, 3))
    v /= np.linalg.norm(v, axis=1)[:, None]
    v = v[(np.abs(v[:, 1]) < 0.9) & (np.abs(np.arctan2(v[:, 0], v[:, 2])) < 2.8)]
    a = np.cross(v, [0.3, 0.5, 0.8])
    a /= np.linalg.norm(a, axis=1)[:, None]
    b = np.cross(v, a)
    forward = PROJECTIONS[name].forward
    e = 1e-6
    p0, pa, pb = (np.stack(forward(np.ascontiguousarray(w.T))) for w in (v, v + e * a, v + e * b))
    da, db = (pa - p0) / e, (pb - p0) / e
    scale = np.hypot(*da)
    # Second-order terms of step 1e-6, times the bending of the map at z = −1 + 0.05.
    np.testing.assert_allclose(np.hypot(*db) / scale, 1.0, atol=1e-4)
    np.testing.assert_allclose((da * db).sum(axis=0) / scale**2, 0.0, atol=1e-4)


@pytest.mark.parametrize("name", NAMES)
def test_width_is_the_angle_across_the_map(name):
    width = 50.0
    p = view(name, 30.0, 0.0, width=width)
    left, right = p.unproject(np.array([[FRAME[0], 330.0], [FRAME[2], 330.0]]))
    assert np.degrees(separation(left, right)) == pytest.approx(width, abs=1e-9)


@pytest.mark.parametrize("name", ["azimuthal-equidistant", "azimuthal-equal-area", "orthographic", "hammer"])
def test_the_widest_view_shows_the_whole_sky(name):
    widest = 180.0 if name == "orthographic" else 360.0
    p = view(name, 0.0, 0.0, width=widest)
    rng = np.random.default_rng(2)
    v = rng.normal(size=(2000, 3))
    v /= np.linalg.norm(v, axis=1)[:, None]
    if name == "orthographic":
        v[:, 0] = np.abs(v[:, 0])
    page = p.project(v)
    page = page[np.isfinite(page).all(axis=1)]
    assert len(page) > 1990
    assert page[:, 0].min() >= FRAME[0] - 1e-6
    assert page[:, 0].max() <= FRAME[2] + 1e-6
    assert page[:, 1].min() >= FRAME[1] - 1e-6
    assert page[:, 1].max() <= FRAME[3] + 1e-6


def test_hammer_knows_the_side_of_the_seam_by_the_sign_of_zero():
    forward = PROJECTIONS["hammer"].forward
    x, _ = forward(np.array([[0.0, -0.0], [0.0, 0.0], [-1.0, -1.0]]))
    np.testing.assert_allclose(x, [2.8284271247461903, -2.8284271247461903], rtol=1e-14)

"""The eight projections, forward and inverse, and how the sky is turned, mirrored and scaled on to the page.

Three steps, each a function of arrays:

    ICRS axes  ── camera matrix ──▶  camera axes: x right, y up on the page, z out of its centre towards the reader
    camera     ── forward ──▶        plane: x right, y up, one unit = one radian at the centre
    plane      ── scale, shift ──▶   logical pixels: x right, y down

Directions are columns, `(3, ...)`, on this path: x, y and z are then contiguous, which makes 50,000 stars cheap.
Everything keeps the precision it is given (float32 or float64). What lies beyond the edge of a projection comes out as
some finite or infinite number; `clipping` cuts it away before it is drawn.
"""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure.arrays import Float

Real = NDArray[Any]  # float32 or float64, kept as given

_TINY = 1e-30


class Projection(NamedTuple):
    """One projection: `forward` and `inverse` between camera axes and the plane, and where it ends.

    `edge` is the angle from the centre at which an azimuthal projection is cut, in radians. For the projections that
    are unrolled along an equator it is the latitude at which they are cut, and their seam is the half meridian opposite
    the centre. `whole` is the half-width and half-height of the whole sky on the plane, where it is finite.
    `half(angle)` is the distance on the plane, along its horizontal axis, of a direction at that angle.
    """

    name: str
    unrolled: bool
    edge: float
    whole: tuple[float, float] | None
    forward: Callable[[Real], tuple[Real, Real]]
    inverse: Callable[[Real, Real], Real]
    half: Callable[[float], float]


def _stack(x: Real, y: Real, z: Real) -> Real:
    return np.stack(np.broadcast_arrays(x, y, z))


# Azimuthal projections. Each is x·k, y·k with its own k(z); a direction is a unit vector.


def _stereographic(c: Real) -> tuple[Real, Real]:
    k = 2.0 / np.maximum(1.0 + c[2], _TINY)
    return c[0] * k, c[1] * k


def _stereographic_inverse(x: Real, y: Real) -> Real:
    r2 = 0.25 * (x * x + y * y)
    k = 1.0 / (1.0 + r2)
    return _stack(x * k, y * k, (1.0 - r2) * k)


def _gnomonic(c: Real) -> tuple[Real, Real]:
    k = 1.0 / np.maximum(c[2], _TINY)
    return c[0] * k, c[1] * k


def _gnomonic_inverse(x: Real, y: Real) -> Real:
    k = 1.0 / np.sqrt(1.0 + x * x + y * y)
    return _stack(x * k, y * k, k)


def _orthographic(c: Real) -> tuple[Real, Real]:
    return c[0], c[1]


def _orthographic_inverse(x: Real, y: Real) -> Real:
    r2 = x * x + y * y
    z = np.sqrt(np.where(r2 <= 1.0, 1.0 - r2, np.nan))
    return _stack(np.where(r2 <= 1.0, x, np.nan), np.where(r2 <= 1.0, y, np.nan), z)


def _equidistant(c: Real) -> tuple[Real, Real]:
    s = np.hypot(c[0], c[1])
    k = np.where(s > 0.0, np.arctan2(s, c[2]) / np.maximum(s, _TINY), 1.0)
    return c[0] * k, c[1] * k


def _equidistant_inverse(x: Real, y: Real) -> Real:
    r = np.hypot(x, y)
    inside = np.where(r <= np.pi, r, np.nan)
    k = np.sinc(inside / np.pi)
    return _stack(x * k, y * k, np.cos(inside))


def _equal_area(c: Real) -> tuple[Real, Real]:
    # √(2 / (1 + z)), written so that it keeps its digits near the far point.
    k = c[2] + c.dtype.type(1.0)
    np.maximum(k, c.dtype.type(_TINY), out=k)
    np.divide(c.dtype.type(2.0), k, out=k)
    np.sqrt(k, out=k)
    x = c[0] * k
    k *= c[1]
    return x, k


def _equal_area_inverse(x: Real, y: Real) -> Real:
    r2 = x * x + y * y
    inside = np.where(r2 <= 4.0, r2, np.nan)
    k = np.sqrt(1.0 - 0.25 * inside)
    return _stack(x * k, y * k, 1.0 - 0.5 * inside)


# Unrolled projections: the pole of the camera is +y, longitude runs along the page from the centre (+z) to the right.
# atan2 knows the sign of a zero, so a point put exactly on the seam falls on the side that its ±0 says.


def _longitude(c: Real) -> Real:
    return np.asarray(np.arctan2(c[0], c[2]))


def _plate_carree(c: Real) -> tuple[Real, Real]:
    return _longitude(c), np.arctan2(c[1], np.hypot(c[0], c[2]))


def _plate_carree_inverse(x: Real, y: Real) -> Real:
    inside = (np.abs(x) <= np.pi) & (np.abs(y) <= np.pi / 2)
    lat = np.where(inside, y, np.nan)
    cos_lat = np.cos(lat)
    return _stack(np.sin(x) * cos_lat, np.sin(lat), np.cos(x) * cos_lat)


def _mercator(c: Real) -> tuple[Real, Real]:
    # asinh(tan φ) keeps its digits on both sides of the equator.
    return _longitude(c), np.arcsinh(c[1] / np.maximum(np.hypot(c[0], c[2]), 1e-12))


def _mercator_inverse(x: Real, y: Real) -> Real:
    inside = np.abs(x) <= np.pi
    cos_lat = np.where(inside, 1.0 / np.cosh(np.clip(y, -50.0, 50.0)), np.nan)
    return _stack(np.sin(x) * cos_lat, np.tanh(y), np.cos(x) * cos_lat)


def _hammer(c: Real) -> tuple[Real, Real]:
    # cos φ cos(λ/2) and cos φ sin(λ/2) by half-angle formulas with no trigonometry: with ρ = cos φ, the larger of the
    # two is √(ρ(ρ + |z|)/2) and the other follows from x = 2 sin(λ/2) cos(λ/2) ρ without losing digits. They are
    # chosen between by multiplication: a choice by a mask of stars in no order costs three times all the rest.
    x, y, z = c
    kind = c.dtype.type
    rho = x * x
    part = z * z
    rho += part
    np.sqrt(rho, out=rho)
    np.abs(z, out=part)
    part += rho
    part *= rho
    part *= kind(0.5)
    large = np.sqrt(part, out=part)
    small = np.abs(x)
    small *= rho
    small *= kind(0.5)
    small /= large + kind(_TINY)
    swap = large - small
    swap *= (z >= 0.0).astype(c.dtype)
    cosine, sine = small, large
    cosine += swap
    sine -= swap
    # The sign of x, that of a zero included.
    sign = np.signbit(x).astype(c.dtype)
    sign *= kind(-4.0)
    sign += kind(2.0)
    cosine += kind(1.0)
    k = np.divide(kind(2.0), cosine, out=cosine)
    np.sqrt(k, out=k)
    up = y * k
    k *= sine
    k *= sign
    return k, up


def _hammer_inverse(x: Real, y: Real) -> Real:
    u = 0.5 * x
    r2 = u * u + y * y
    inside = np.where(r2 <= 2.0, r2, np.nan)
    k = np.sqrt(1.0 - 0.25 * inside)
    sine, up, cosine = u * k, y * k, 1.0 - 0.5 * inside
    # Double the longitude: (cosine + i·sine)² has the argument λ and the modulus cos² φ.
    rho = np.maximum(np.hypot(sine, cosine), _TINY)
    return _stack(2.0 * sine * cosine / rho, up, (cosine * cosine - sine * sine) / rho)


_RIGHT = np.pi / 2

_ROOT2 = float(np.sqrt(2.0))


def _half_stereographic(a: float) -> float:
    return float(2.0 * np.tan(0.5 * a))


def _half_gnomonic(a: float) -> float:
    return float(np.tan(min(a, 1.55)))


def _half_equal_area(a: float) -> float:
    return float(2.0 * np.sin(0.5 * a))


def _half_hammer(a: float) -> float:
    return float(2.0 * _ROOT2 * np.sin(0.5 * a) / np.sqrt(1.0 + np.cos(0.5 * a)))


def _half_sine(a: float) -> float:
    return float(np.sin(a))


def _half_angle(a: float) -> float:
    return float(a)


def _table() -> dict[str, Projection]:
    turn, rad = np.pi, np.radians
    full, disc = (turn, turn), (1.0, 1.0)
    rows = (
        ("stereographic", False, rad(176.0), None, _stereographic, _stereographic_inverse, _half_stereographic),
        ("gnomonic", False, rad(86.0), None, _gnomonic, _gnomonic_inverse, _half_gnomonic),
        ("orthographic", False, _RIGHT, disc, _orthographic, _orthographic_inverse, _half_sine),
        ("azimuthal-equidistant", False, rad(179.99), full, _equidistant, _equidistant_inverse, _half_angle),
        ("azimuthal-equal-area", False, rad(179.9), (2.0, 2.0), _equal_area, _equal_area_inverse, _half_equal_area),
        ("plate-carree", True, _RIGHT, (turn, _RIGHT), _plate_carree, _plate_carree_inverse, _half_angle),
        ("mercator", True, rad(86.0), None, _mercator, _mercator_inverse, _half_angle),
        ("hammer", True, _RIGHT, (2.0 * _ROOT2, _ROOT2), _hammer, _hammer_inverse, _half_hammer),
    )
    return {row[0]: Projection(row[0], row[1], float(row[2]), *row[3:]) for row in rows}


PROJECTIONS = _table()


def cross(a: Float, b: Float) -> Float:
    """Return the vector product of two single vectors (3,), without the overhead of the general one."""
    (ax, ay, az), (bx, by, bz) = a.tolist(), b.tolist()
    return np.array([ay * bz - az * by, az * bx - ax * bz, ax * by - ay * bx])


def orientation(centre: Float, pole: Float, spare: Float, east_left: bool, unrolled: bool) -> Float:
    """Return the camera matrix (3, 3): the ONE place where handedness and up are decided.

    Its rows are the page's right, the page's up and the direction out of its centre, on the axes of `centre` and
    `pole` (both unit vectors (3,)): `camera = matrix @ direction`.

    - Up is the direction of `pole` from the centre, that is north. At the pole itself there is none; the pole's own
      meridian, towards `spare`, then points down the page, which is the limit of approaching along that meridian.
    - East is where longitude grows: `pole × centre`. Seen from inside the sphere with north up, east is to the LEFT
      (`east_left`, a sky chart); a map has it to the right. Only the first row knows which: the mirror is that sign.
    - The matrix is a rotation for a map and a rotation times a mirror for the sky: its determinant is +1 or −1.
    - Azimuthal projections look at the centre. Unrolled ones (`unrolled`) keep the pole straight up and look at the
      centre's meridian on the equator; its latitude is a shift on the plane.
    - The turn of the picture and the downward y of pixels are in Projector.plane, after the projection.
    """
    east = cross(pole, centre)
    # 1e-9 is far below a pixel of the narrowest field, and far above the noise of a cross product.
    if float(np.sqrt(east @ east)) < 1e-9:
        east = cross(pole, spare)
    east = east / np.sqrt(east @ east)
    forward = cross(east, pole) if unrolled else centre
    north = cross(forward, east)
    right = -east if east_left else east
    return np.array([right, north, forward])


@dataclass(frozen=True, slots=True, eq=False)
class Projector:
    """A view laid on a page: directions on ICRS axes to logical pixels, and back.

    `camera` (3, 3) takes ICRS axes to camera axes. `plane` (2, 2) and `shift` (2,) take the projection's plane to
    pixels: `pixel = plane @ (x, y) + shift`. `scale` is pixels per radian at the centre, and `centre` (3,) the
    direction asked for, on ICRS axes.
    """

    projection: Projection
    camera: Float
    plane: Float
    shift: Float
    scale: float
    centre: Float
    _back: Float = field(init=False)
    _camera32: NDArray[np.float32] = field(init=False)

    def __post_init__(self) -> None:
        """Keep the inverse of the plane's map and a float32 copy of the camera."""
        (a, b), (c, d) = self.plane.tolist()
        # The plane's map is a turn, a mirror and a scale: its determinant is never near nought.
        object.__setattr__(self, "_back", np.array([[d, -b], [-c, a]]) / (a * d - b * c))
        object.__setattr__(self, "_camera32", self.camera.astype(np.float32))

    def to_plane(self, xy: Float) -> Float:
        """Return points (..., 2) on the projection's plane for pixels (..., 2)."""
        return np.asarray((xy - self.shift) @ self._back.T)

    def to_camera(self, columns: Real) -> Real:
        """Return camera axes (3, N) of directions (3, N) on ICRS axes, in the precision given."""
        matrix = self._camera32 if columns.dtype == np.float32 else self.camera
        return np.asarray(matrix @ columns)

    def to_page(self, camera: Real) -> tuple[Real, Real]:
        """Return pixel x and y (N,) of camera directions (3, N); beyond the edge they mean nothing."""
        x, y = self.projection.forward(camera)
        return self.plane_to_page(x, y)

    def plane_to_page(self, x: Real, y: Real) -> tuple[Real, Real]:
        """Return pixel x and y of points on the projection's plane."""
        (a, b), (c, d) = self.plane.tolist()
        left, top = self.shift.tolist()
        if b == 0.0 and c == 0.0:
            across, down = np.multiply(x, a), np.multiply(y, d)
            across += left
            down += top
            return across, down
        return x * a + y * b + left, x * c + y * d + top

    def on_sky(self, camera: Real) -> NDArray[np.bool_]:
        """Return which camera directions (3, N) lie within the projection's edge."""
        if self.projection.unrolled:
            return np.asarray(np.abs(camera[1]) <= np.sin(self.projection.edge))
        return np.asarray(camera[2] >= np.cos(self.projection.edge))

    def project(self, vectors: Any) -> Float:
        """Return pixels (..., 2) for vectors (..., 3) on ICRS axes; NaN beyond the projection's edge."""
        v = np.asarray(vectors, dtype=np.float64)
        camera = self.camera @ v.reshape(-1, 3).T
        x, y = self.to_page(camera)
        off = ~self.on_sky(camera)
        page = np.stack([np.where(off, np.nan, x), np.where(off, np.nan, y)], axis=-1)
        return page.reshape(*v.shape[:-1], 2)

    def unproject(self, xy: Any) -> Float:
        """Return unit vectors (..., 3) on ICRS axes for pixels (..., 2); NaN off the sky."""
        plane = self.to_plane(np.asarray(xy, dtype=np.float64))
        camera = self.projection.inverse(plane[..., 0], plane[..., 1])
        camera = np.where(self.on_sky(camera), camera, np.nan)
        return np.asarray(np.moveaxis(camera, 0, -1) @ self.camera)

    def with_camera(self, matrix: Float) -> "Projector":
        """Return the same page for directions on other axes: `matrix` (3, 3) takes those axes to ICRS."""
        centre = matrix.T @ self.centre
        return Projector(self.projection, self.camera @ matrix, self.plane, self.shift, self.scale, centre)


def scale_of(projection: Projection, width: float, across: float, down: float) -> float:
    """Return pixels per radian at the centre for an angle `width` across a map of `across` × `down` pixels.

    Where the whole sky is finite on the plane, the scale eases from half a turn on, so that the widest view shows all
    of it even where the map is lower than the sky is high.
    """
    scale = 0.5 * across / projection.half(0.5 * width)
    if projection.whole is None:
        return scale
    widest = np.pi if projection.name == "orthographic" else 2.0 * np.pi
    ease = float(np.clip((width - 0.5 * widest) / (0.5 * widest), 0.0, 1.0))
    whole = min(scale, 0.5 * across / projection.whole[0], 0.5 * down / projection.whole[1])
    return scale * (1.0 - ease) + whole * ease


def projector(
    name: str,
    centre: Float,
    pole: Float,
    spare: Float,
    *,
    east_left: bool,
    width: float,
    rotation: float,
    frame: tuple[float, float, float, float],
) -> Projector:
    """Return the Projector of a view.

    `centre`, `pole`, `spare` are unit vectors (3,) on ICRS axes (see `orientation`); `width` is the angle across the
    map and `rotation` the turn anticlockwise, in radians; `frame` is the map rectangle in pixels.
    """
    projection = PROJECTIONS[name]
    camera = orientation(centre, pole, spare, east_left, projection.unrolled)
    left, top, right, bottom = frame
    scale = scale_of(projection, width, right - left, bottom - top)
    c, s = np.cos(rotation), np.sin(rotation)
    # A turn anticlockwise on a plane with y up, then pixels: the second row is negated because their y runs down.
    plane = scale * np.array([[c, -s], [-s, -c]])
    middle = np.array([0.5 * (left + right), 0.5 * (top + bottom)])
    if projection.unrolled:
        # The centre's latitude is a shift along the meridian, kept within what the projection can reach.
        up = float(np.clip(centre @ pole, -np.sin(projection.edge), np.sin(projection.edge)))
        top_of_map = np.array([0.0, np.sin(projection.edge), np.cos(projection.edge)])
        at = np.array([0.0, up, np.sqrt(1.0 - up * up)])
        x, y = projection.forward(np.stack([at, top_of_map], axis=1))
        # A map that is no higher than its page stands in the middle: a shift would only cut one edge off.
        room = max(float(y[1]) - 0.5 * (bottom - top) / scale, 0.0)
        middle = middle - plane @ np.array([x[0], np.clip(y[0], -room, room)])
    return Projector(projection, camera, plane, middle, scale, centre)

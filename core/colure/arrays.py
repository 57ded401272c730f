"""Vectors and angles as arrays: the shape rule and the few operations everything else is built on.

Shape rule: a vector is the last dimension, `(..., 3)`; a matrix the last two, `(..., 3, 3)`; every other dimension
broadcasts. Angles are radians, longitudes run from 0 to 2π, and axes are right-handed.
"""

from typing import TypeAlias, TypeVar

import numpy as np
from numpy.typing import NDArray

Float: TypeAlias = NDArray[np.float64]
Int: TypeAlias = NDArray[np.int64]
Bool: TypeAlias = NDArray[np.bool_]
F = TypeVar("F", np.float32, np.float64)

TWO_PI = 2.0 * np.pi
ARCSEC = np.pi / 648000.0
"""One second of arc in radians."""
MAS = ARCSEC / 1000.0
DEG = np.pi / 180.0


def cartesian(lon: Float | float, lat: Float | float) -> Float:
    """Return unit vectors (..., 3) for longitudes and latitudes in radians."""
    lon, lat = np.broadcast_arrays(np.asarray(lon, dtype=np.float64), np.asarray(lat, dtype=np.float64))
    out = np.empty((*lon.shape, 3))
    cos_lat = np.cos(lat)
    out[..., 0] = np.cos(lon) * cos_lat
    out[..., 1] = np.sin(lon) * cos_lat
    out[..., 2] = np.sin(lat)
    return out


def spherical(vectors: Float) -> tuple[Float, Float]:
    """Return longitude (0 to 2π) and latitude in radians of vectors (..., 3) of any length.

    The latitude comes from both components, so it keeps its precision at the poles.
    """
    x, y, z = vectors[..., 0], vectors[..., 1], vectors[..., 2]
    lon = np.arctan2(y, x) % TWO_PI
    # A tiny negative angle becomes exactly 2π under the remainder; keep the half-open range.
    lon = np.where(lon >= TWO_PI, 0.0, lon)
    return lon, np.arctan2(z, np.hypot(x, y))


def norm(vectors: Float) -> Float:
    """Return the lengths (...) of vectors (..., 3)."""
    return np.asarray(np.sqrt(np.einsum("...i,...i->...", vectors, vectors)))


def unit(vectors: Float) -> Float:
    """Return vectors (..., 3) divided by their lengths."""
    return np.asarray(vectors / norm(vectors)[..., None])


def dot(a: Float, b: Float) -> Float:
    """Return the scalar product over the last dimension."""
    return np.asarray(np.einsum("...i,...i->...", a, b))


def cross(a: Float, b: Float) -> Float:
    """Return the vector product over the last dimension."""
    # numpy's own takes six times as long for a few vectors, and as long for many.
    ax, ay, az = a[..., 0], a[..., 1], a[..., 2]
    bx, by, bz = b[..., 0], b[..., 1], b[..., 2]
    x = ay * bz - az * by
    out = np.empty((*x.shape, 3))
    out[..., 0], out[..., 1], out[..., 2] = x, az * bx - ax * bz, ax * by - ay * bx
    return out


def separation(a: Float, b: Float) -> Float:
    """Return the angle between vectors in radians, exact for small and for opposite directions."""
    return np.arctan2(norm(cross(a, b)), dot(a, b))


def position_angle(origin: Float, target: Float) -> Float:
    """Return the position angle (0 to 2π) of `target` seen from `origin`, from the +z pole through growing longitude.

    In an equatorial frame that is north through east. Both are vectors (..., 3) in the same frame.
    """
    x, y = origin[..., 0], origin[..., 1]
    # Components of the target along local east and north, without dividing by the cosine of the latitude.
    east = target[..., 1] * x - target[..., 0] * y
    rho2 = x * x + y * y
    r = norm(origin)
    north = (target[..., 2] * rho2 - origin[..., 2] * (target[..., 0] * x + target[..., 1] * y)) / r
    return np.arctan2(east, north) % TWO_PI


def rotate(matrix: Float, vectors: Float) -> Float:
    """Apply matrices (..., 3, 3) to vectors (..., 3), broadcasting the leading dimensions."""
    if matrix.ndim == 2:
        return np.asarray(vectors @ matrix.T)
    # Component by component in runs of contiguous memory: sixteen times as fast as einsum over small matrices.
    m = np.ascontiguousarray(np.moveaxis(matrix, (-2, -1), (0, 1)))
    x, y, z = (np.ascontiguousarray(vectors[..., k]) for k in range(3))
    out = np.empty((3, *np.broadcast_shapes(x.shape, m.shape[2:])))
    for i in range(3):
        np.multiply(m[i, 0], x, out=out[i])
        out[i] += m[i, 1] * y
        out[i] += m[i, 2] * z
    return np.moveaxis(out, 0, -1)


def rotation_x(angle: Float | float) -> Float:
    """Return the matrix (..., 3, 3) that turns the axes by `angle` about x (positive: y towards z)."""
    angle = np.asarray(angle, dtype=np.float64)
    c, s = np.cos(angle), np.sin(angle)
    out = np.zeros((*angle.shape, 3, 3))
    out[..., 0, 0] = 1.0
    out[..., 1, 1] = out[..., 2, 2] = c
    out[..., 1, 2], out[..., 2, 1] = s, -s
    return out


def rotation_z(angle: Float | float) -> Float:
    """Return the matrix (..., 3, 3) that turns the axes by `angle` about z (positive: x towards y)."""
    angle = np.asarray(angle, dtype=np.float64)
    c, s = np.cos(angle), np.sin(angle)
    out = np.zeros((*angle.shape, 3, 3))
    out[..., 2, 2] = 1.0
    out[..., 0, 0] = out[..., 1, 1] = c
    out[..., 0, 1], out[..., 1, 0] = s, -s
    return out

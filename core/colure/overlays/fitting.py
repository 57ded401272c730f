"""The rotation and the scale that carry positions on to the catalogue's, by least squares that outliers do not pull."""

from dataclasses import dataclass

import numpy as np

from colure.arrays import ARCSEC, DEG, Bool, Float, separation, unit

ROUNDS = 12
CUT = 4.685
"""Tukey's biweight: a residual beyond so many sigmas has no weight (95 % efficient for normal errors)."""
COMPACT = 30.0 * DEG
"""Positions within this radius have a scale; over more of the sky there is none."""
LEAST = 1e-5 * ARCSEC


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """What carries the overlay on to the catalogue.

    `rotation` (3,) is the rotation vector in radians on ICRS axes; at the middle of the positions, `centre` (3,), it is
    a shift of `east_arcsec` and `north_arcsec` and a turn by `turn_arcsec` (north through east). `scale` is catalogue
    over overlay, 1 where the positions are too spread (`has_scale` False). `rms_arcsec` is the weighted one of the
    residuals left, both coordinates together; `before_arcsec` the median length without the fit. `sigma` holds the
    standard errors of east, north, turn (arcsec) and scale. `used` (M,) marks the matches with weight, `residuals`
    (M, 2) are what is left, east and north in radians.
    """

    rotation: Float
    centre: Float
    east_arcsec: float
    north_arcsec: float
    turn_arcsec: float
    scale: float
    has_scale: bool
    rms_arcsec: float
    before_arcsec: float
    sigma: tuple[float, float, float, float]
    used: Bool
    residuals: Float

    @property
    def count(self) -> int:
        """How many matches were used."""
        return int(self.used.sum())


def turned(vectors: Float, rotation: Float) -> Float:
    """Return vectors (N, 3) turned by a rotation vector (3,) in radians, right-handed."""
    angle = float(np.sqrt(rotation @ rotation))
    if angle == 0.0:
        return vectors
    axis = rotation / angle
    c, s = np.cos(angle), np.sin(angle)
    return np.asarray(vectors * c + np.cross(axis, vectors) * s + np.outer(vectors @ axis, axis) * (1.0 - c))


def compass(vectors: Float) -> tuple[Float, Float]:
    """Return the unit tangents east and north (N, 3) at directions (N, 3)."""
    x, y, z = vectors[:, 0], vectors[:, 1], vectors[:, 2]
    flat = np.hypot(x, y)
    # At the pole itself any longitude does; that of +x is taken.
    away = flat > 0.0
    safe = np.where(away, flat, 1.0)
    c, s = np.where(away, x / safe, 1.0), np.where(away, y / safe, 0.0)
    length = np.hypot(flat, z)
    sine, cosine = z / length, flat / length
    east = np.stack([-s, c, np.zeros_like(c)], axis=-1)
    north = np.stack([-sine * c, -sine * s, cosine], axis=-1)
    return east, north


def offsets(given: Float, true: Float) -> Float:
    """Return the tangent-plane offsets (N, 2), east and north in radians, of `true` from `given`."""
    east, north = compass(given)
    angle = separation(given, true)
    flat = np.stack([np.einsum("ni,ni->n", true, east), np.einsum("ni,ni->n", true, north)], axis=-1)
    length = np.hypot(flat[:, 0], flat[:, 1])
    # Along the great circle, so that an offset of degrees keeps its length.
    return np.asarray(flat * np.where(length > 0.0, angle / np.where(length > 0.0, length, 1.0), 1.0)[:, None])


def fit(given: Float, true: Float) -> Fit | None:
    """Return the fit of matched directions (M, 3), ICRS: overlay and catalogue; None for fewer than three."""
    if len(given) < 3:
        return None
    centre = given.mean(axis=0)
    length = float(np.sqrt(centre @ centre))
    centre = centre / length if length > 1e-3 else given[0]
    reach = float(separation(given, centre[None]).max())
    has_scale = reach < COMPACT
    rotation, scale = np.zeros(3), 1.0
    before = 1.0 * float(np.median(np.hypot(*offsets(given, true).T))) / ARCSEC
    weight = np.ones(len(given))
    covariance = np.zeros((4, 4))
    # Small turns about the centre's own axes are well scaled also for a small field.
    east, north = (v[0] for v in compass(centre[None]))
    basis = np.stack([east, north, centre])
    moved = given
    rest = offsets(moved, true)
    for turn in range(ROUNDS):
        sigma = _sigma(rest)
        if turn:
            ratio = np.hypot(rest[:, 0], rest[:, 1]) / (CUT * sigma)
            weight = np.where(ratio < 1.0, (1.0 - ratio * ratio) ** 2, 0.0)
        else:
            # A wrong identification is far off the median of all: begin without those.
            aside = rest - np.median(rest, axis=0) if has_scale else rest
            far = np.hypot(aside[:, 0], aside[:, 1])
            weight = (far <= 5.0 * max(float(np.median(far)), LEAST)).astype(np.float64)
        design = _design(moved, basis, has_scale)
        step, covariance = _solve(design, rest, weight)
        axis_step = basis.T @ step[:3]
        rotation = _composed(axis_step, rotation)
        if has_scale:
            scale *= 1.0 + step[3]
        moved = _moved(given, rotation, scale, centre, has_scale)
        rest = offsets(moved, true)
        # Further turns would move the answer by far less than its error.
        if turn > 2 and np.abs(step).max() < 1e-5 * sigma / np.sqrt(len(given)) + 1e-15:
            break
    used = weight > 0.0
    mean = float(np.sum(weight * (rest**2).sum(axis=1)) / max(float(weight.sum()), 1e-300))
    degrees = max(2 * int(used.sum()) - (4 if has_scale else 3), 1)
    spread = np.sum(weight * (rest**2).sum(axis=1)) / degrees
    errors = np.sqrt(np.maximum(np.diag(covariance) * spread, 0.0))
    here = basis @ rotation
    # A turn about the east tangent moves the centre northwards... by minus the angle; about the north tangent, east.
    return Fit(
        rotation, centre,
        east_arcsec=float(here[1]) / ARCSEC, north_arcsec=-float(here[0]) / ARCSEC,
        turn_arcsec=-float(here[2]) / ARCSEC,
        scale=scale, has_scale=has_scale, rms_arcsec=float(np.sqrt(mean)) / ARCSEC, before_arcsec=before,
        sigma=(
            float(errors[1]) / ARCSEC, float(errors[0]) / ARCSEC, float(errors[2]) / ARCSEC,
            float(errors[3]) if has_scale else 0.0,
        ),
        used=used, residuals=rest,
    )  # fmt: skip


def _sigma(rest: Float) -> float:
    """Return a robust standard deviation of one coordinate from the median length (Rayleigh: 1.1774 σ)."""
    return max(float(np.median(np.hypot(rest[:, 0], rest[:, 1]))) / 1.1774, LEAST)


def _design(vectors: Float, basis: Float, has_scale: bool) -> Float:
    """Return (N, 2, 4): what a unit turn about each basis vector, and a unit of scale, add to east and north."""
    east, north = compass(vectors)
    out = np.zeros((len(vectors), 2, 4))
    for k in range(3):
        push = np.cross(basis[k], vectors)
        out[:, 0, k] = np.einsum("ni,ni->n", push, east)
        out[:, 1, k] = np.einsum("ni,ni->n", push, north)
    if has_scale:
        away = offsets(vectors, np.broadcast_to(basis[2], vectors.shape))
        out[:, :, 3] = -away
    return out


def _solve(design: Float, rest: Float, weight: Float) -> tuple[Float, Float]:
    """Return the step (4,) and the cofactor matrix (4, 4) of weighted least squares; what is not determined is 0."""
    wide = design * weight[:, None, None]
    normal = np.einsum("nai,naj->ij", wide, design)
    right = np.einsum("nai,na->i", wide, rest)
    # Unit diagonal before the cut-off, so that a turn of a small field is not mistaken for nothing.
    size = np.sqrt(np.maximum(np.diag(normal), 1e-300))
    scaled = normal / np.outer(size, size)
    scaled[np.diag(normal) <= 1e-30] = 0.0
    inverse = np.linalg.pinv(scaled, rcond=1e-13, hermitian=True)
    return np.asarray(inverse @ (right / size)) / size, np.asarray(inverse / np.outer(size, size))


def _composed(second: Float, first: Float) -> Float:
    """Return the rotation vector of `first` followed by `second`."""
    import erfa

    return np.asarray(-erfa.rm2v(_matrix(second) @ _matrix(first)))


def _matrix(rotation: Float) -> Float:
    return turned(np.eye(3), rotation).T


def _moved(given: Float, rotation: Float, scale: float, centre: Float, has_scale: bool) -> Float:
    """Return directions after the turn, and the scale about where the turn takes the centre."""
    out = turned(given, rotation)
    if not has_scale or scale == 1.0:
        return out
    middle = turned(centre[None], rotation)[0]
    angle = separation(out, middle[None])
    # Along the great circle through the centre.
    tangent = out - (out @ middle)[:, None] * middle
    length = np.sqrt((tangent * tangent).sum(axis=1))
    safe = np.where(length > 0.0, length, 1.0)
    grown = middle * np.cos(scale * angle)[:, None] + tangent * (np.sin(scale * angle) / safe)[:, None]
    return unit(np.where(length[:, None] > 0.0, grown, out))

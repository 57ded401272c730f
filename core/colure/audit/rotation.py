"""The rotation from catalogue to table, with the epoch of the places: least squares that outliers cannot turn."""

from dataclasses import dataclass

import numpy as np

from colure.arrays import Bool, Float, unit

CUT = 4.0
"""Residuals beyond this many σ get no weight (Tukey's biweight reaches zero there)."""
BIWEIGHT = 0.872
"""Weighted scatter over σ for normal errors: with u = r²/2σ², √(∫u(1−u/8)²e⁻ᵘ / ∫(1−u/8)²e⁻ᵘ) = √(0.594/0.781)."""
ROUNDS = 40


@dataclass(frozen=True, slots=True)
class Turned:
    """A fitted rotation: `matrix` (3, 3) from ICRS axes to the table's.

    `covariance` (4, 4) of the rotation vector on the table's axes (rad) and the epoch (yr); `sigma` rad the scatter in
    one coordinate; `good` (n,) which rows agree; `epoch` the Julian year of the places, ± `epoch_sigma`.
    """

    matrix: Float
    covariance: Float
    sigma: float
    good: Bool
    epoch: float
    epoch_sigma: float


def wahba(table: Float, stars: Float, weights: Float) -> Float:
    """Return the rotation (3, 3) that turns `stars` (n, 3) best onto `table` (n, 3)."""
    u, _, v = np.linalg.svd((table * weights[:, None]).T @ stars)
    return np.asarray(u @ np.diag([1.0, 1.0, np.linalg.det(u) * np.linalg.det(v)]) @ v)


def _biweight(size: Float, sigma: float) -> Float:
    # Distances on the sky have two coordinates; the median of such a distance is 1.1774 σ.
    z = np.minimum(size / (CUT * sigma), 1.0)
    return np.asarray((1.0 - z * z) ** 2)


def fit(
    table: Float,
    place: Float,
    motion: Float | None,
    *,
    star_epoch: float,
    epoch: float,
    free_epoch: bool = True,
    least_sigma: float = 1e-9,
) -> Turned:
    """Return the rotation from stars to table directions (n, 3), and the epoch of the places where it is free.

    `place` and `motion` (n, 3) as the catalogue has them at `star_epoch`, ICRS; `epoch` is where the search begins.
    Rows that do not agree are given no weight, at most nearly half of them.
    """
    weights = np.ones(len(table))
    matrix = np.eye(3)
    sigma = np.inf
    free = free_epoch and motion is not None
    normal = np.eye(4)
    for turn in range(ROUNDS):
        stars = unit(place if motion is None else place + motion * (epoch - star_epoch))
        if turn == 0:
            matrix = _start(table, stars)
        model = stars @ matrix.T
        off = table - model
        size = np.sqrt((off * off).sum(axis=1))
        # Begin wide: the first rotation is drawn aside by what it is to reject.
        scale = max(float(np.median(size)) / 1.1774, least_sigma)
        sigma = scale if turn > 3 else scale * (4 - turn)
        weights = _biweight(size, sigma)
        step, normal = _step(model, off, weights, motion @ matrix.T if free and motion is not None else None)
        matrix = _small(step[:3]) @ matrix
        epoch += float(np.clip(step[3], -2000.0, 2000.0)) if free else 0.0
        # Steps far below what the rows can tell are not worth another round.
        small = 1e-3 * sigma / np.sqrt(len(table))
        if (
            turn > 5
            and np.abs(step[:3]).max() < max(small, 1e-14)
            and abs(step[3]) < 1e-3 * sigma / np.sqrt(normal[3, 3])
        ):
            break
    good = weights > 0.0
    covariance = np.asarray(np.linalg.inv(normal), dtype=np.float64) * sigma**2
    # Rows that a biweight admits count in part; their share of the information is that of the weights (within 5 %).
    spread = float(np.sqrt((weights * size**2).sum() / max(2.0 * weights.sum() - 4.0, 1.0)))
    epoch_sigma = float(np.sqrt(covariance[3, 3])) if free else np.inf
    return Turned(matrix, covariance, max(spread / BIWEIGHT, least_sigma), good, epoch, epoch_sigma)


def _start(table: Float, stars: Float) -> Float:
    """Return a first rotation from the middle half of the rows, in three rounds."""
    weights = np.ones(len(table))
    matrix = np.eye(3)
    for _ in range(6):
        matrix = wahba(table, stars, weights)
        size = ((table - stars @ matrix.T) ** 2).sum(axis=1)
        weights = (size <= np.quantile(size, 0.75)).astype(np.float64)
    return matrix


def _step(model: Float, off: Float, weights: Float, motion: Float | None) -> tuple[Float, Float]:
    """Return the rotation vector and years (4,) that lessen the residuals, and the matrix (4, 4) of the equations."""
    w = weights[:, None]
    # δ = θ × p: the equations of θ are Σ w (1 − p pᵀ) θ = Σ w p × off.
    normal = np.zeros((4, 4))
    right = np.zeros(4)
    normal[:3, :3] = weights.sum() * np.eye(3) - (model * w).T @ model
    right[:3] = (np.cross(model, off) * w).sum(axis=0)
    if motion is None:
        normal[3, 3] = 1.0
        return np.asarray(np.linalg.solve(normal, right), dtype=np.float64), normal
    across = np.cross(model, motion)
    normal[:3, 3] = normal[3, :3] = (across * w).sum(axis=0)
    tangent = motion - model * (motion * model).sum(axis=1)[:, None]
    normal[3, 3] = float((tangent * tangent * w).sum()) + 1e-30
    right[3] = float((tangent * off * w).sum())
    return np.asarray(np.linalg.solve(normal, right), dtype=np.float64), normal


def _small(vector: Float) -> Float:
    """Return the matrix (3, 3) that turns vectors by the rotation vector (Rodrigues)."""
    angle = float(np.sqrt(vector @ vector))
    k = np.array([[0.0, -vector[2], vector[1]], [vector[2], 0.0, -vector[0]], [-vector[1], vector[0], 0.0]])
    if angle < 1e-12:
        return np.asarray(np.eye(3) + k)
    return np.asarray(np.eye(3) + np.sin(angle) / angle * k + (1.0 - np.cos(angle)) / angle**2 * (k @ k))


def rotation_vector(matrix: Float) -> Float:
    """Return the rotation vector (3,), rad, of a matrix that turns vectors."""
    vector = np.array([matrix[2, 1] - matrix[1, 2], matrix[0, 2] - matrix[2, 0], matrix[1, 0] - matrix[0, 1]]) / 2.0
    sine = float(np.sqrt(vector @ vector))
    angle = float(np.arctan2(sine, (np.trace(matrix) - 1.0) / 2.0))
    return np.asarray(vector * (angle / sine)) if sine > 1e-15 else vector

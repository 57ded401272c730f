"""Magnitudes of minor bodies: H–G, H–G1–G2, H–G12, comets, and sums of magnitudes.

Distances are au, phase angles degrees; arrays broadcast.
"""

import numpy as np

from colure.arrays import DEG, Float

Number = Float | float


def hg_reduced(h: Number, g: Number, phase: Number) -> Float:
    """Return the reduced magnitude V(1, 1, α) of the IAU H–G system, Bowell et al. 1989 in full; NaN beyond 120°."""
    a = np.asarray(phase, dtype=np.float64) * DEG
    half = np.tan(0.5 * a)
    blend = np.exp(-90.56 * half * half)
    s = np.sin(a)
    ratio = s / (0.119 + 1.341 * s - 0.754 * s * s)
    phi = []
    for slope, power, constant in ((3.332, 0.631, 0.986), (1.862, 1.218, 0.238)):
        small = 1.0 - constant * ratio
        large = np.exp(-slope * half**power)
        phi.append(blend * small + (1.0 - blend) * large)
    value = h - 2.5 * np.log10((1.0 - g) * phi[0] + g * phi[1])
    return np.where(np.asarray(phase) <= 120.0, value, np.nan)


def hg(h: Number, g: Number, r: Number, delta: Number, phase: Number) -> Float:
    """Return the apparent V magnitude in the H–G system."""
    return np.asarray(hg_reduced(h, g, phase) + 5.0 * np.log10(np.asarray(r) * np.asarray(delta)))


class _Spline:
    """A cubic spline with given end slopes, continued by straight lines below its first node."""

    def __init__(self, nodes_deg: tuple[float, ...], values: tuple[float, ...], first: float, last: float) -> None:
        self.x = np.array(nodes_deg) * DEG
        self.y = np.array(values)
        n = len(self.x)
        step = np.diff(self.x)
        matrix, right = np.zeros((n, n)), np.zeros(n)
        matrix[0, 0] = matrix[-1, -1] = 1.0
        right[0], right[-1] = first, last
        secant = np.diff(self.y) / step
        for k in range(1, n - 1):  # continuity of curvature at the inner nodes
            matrix[k, k - 1 : k + 2] = step[k], 2.0 * (step[k - 1] + step[k]), step[k - 1]
            right[k] = 3.0 * (step[k] * secant[k - 1] + step[k - 1] * secant[k])
        self.slope = np.linalg.solve(matrix, right)

    def __call__(self, a: Float) -> Float:
        k = np.clip(np.searchsorted(self.x, a, side="right") - 1, 0, len(self.x) - 2)
        step = self.x[k + 1] - self.x[k]
        t = (np.clip(a, self.x[0], self.x[-1]) - self.x[k]) / step
        return np.asarray(
            self.y[k] * (1 + 2 * t) * (1 - t) ** 2
            + self.slope[k] * step * t * (1 - t) ** 2
            + self.y[k + 1] * t * t * (3 - 2 * t)
            + self.slope[k + 1] * step * t * t * (t - 1)
        )


# Basis functions of Muinonen et al. 2010, Icarus 209, 542, Tables 3 and 4.
_WIDE = (7.5, 30.0, 60.0, 90.0, 120.0, 150.0)
_PHI1 = _Spline(
    _WIDE, (0.75, 0.33486016, 0.134105601, 0.0511047559, 0.0214656869, 0.0036396989), -1.9098593, -0.0913286
)
_PHI2 = _Spline(
    _WIDE, (0.925, 0.62884169, 0.31755495, 0.12716367, 0.0223739005, 0.000165056890), -0.57295780, -8.6573138e-8
)
_PHI3 = _Spline(
    (0.0, 0.3, 1.0, 2.0, 4.0, 8.0, 12.0, 20.0, 30.0),
    (1.0, 0.83381185, 0.57735424, 0.42144772, 0.23174230, 0.10348178, 0.061733473, 0.016107006, 0.0),
    -0.10630097,
    0.0,
)


def hg1g2_reduced(h: Number, g1: Number, g2: Number, phase: Number) -> Float:
    """Return V(1, 1, α) of the H–G1–G2 system; NaN beyond 150°."""
    a = np.asarray(phase, dtype=np.float64) * DEG
    line = a <= 7.5 * DEG
    phi1 = np.where(line, 1.0 - 6.0 * a / np.pi, _PHI1(a))
    phi2 = np.where(line, 1.0 - 9.0 * a / (5.0 * np.pi), _PHI2(a))
    value = h - 2.5 * np.log10(g1 * phi1 + g2 * phi2 + (1.0 - np.asarray(g1) - np.asarray(g2)) * _PHI3(a))
    return np.where(np.asarray(phase) <= 150.0, value, np.nan)


def hg12_reduced(h: Number, g12: Number, phase: Number) -> Float:
    """Return V(1, 1, α) of the H–G12 system (Muinonen et al. 2010); NaN beyond 150°."""
    g12 = np.asarray(g12, dtype=np.float64)
    low = g12 < 0.2
    g1 = np.where(low, 0.7527 * g12 + 0.06164, 0.9529 * g12 + 0.02162)
    g2 = np.where(low, -0.9612 * g12 + 0.6270, -0.6125 * g12 + 0.5572)
    return hg1g2_reduced(h, g1, g2, phase)


def comet_total(m1: Number, k1: Number, r: Number, delta: Number) -> Float:
    """Return the total magnitude of a comet, M1 + 5 log Δ + K1 log r (K1 as JPL prints it: 10 for an r⁻⁴ law)."""
    return np.asarray(m1 + 5.0 * np.log10(delta) + k1 * np.log10(r))


def comet_nucleus(m2: Number, k2: Number, coefficient: Number, r: Number, delta: Number, phase: Number) -> Float:
    """Return the nuclear magnitude, M2 + 5 log Δ + K2 log r + coefficient × phase angle in degrees."""
    return np.asarray(m2 + 5.0 * np.log10(delta) + k2 * np.log10(r) + coefficient * np.asarray(phase))


def combined(magnitudes: Float, counts: Number = 1.0) -> float:
    """Return the magnitude of the light of several sources together; `counts` repeats each."""
    return float(-2.5 * np.log10(np.sum(np.asarray(counts) * 10.0 ** (-0.4 * np.asarray(magnitudes)))))


def brightness_ratio(first: Number, second: Number) -> Float:
    """Return how many times brighter the source of magnitude `first` is than that of `second`."""
    return np.asarray(10.0 ** (0.4 * (np.asarray(second) - np.asarray(first))))

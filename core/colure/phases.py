"""How the Sun lights a body: phase angle, illuminated fraction, bright limb, elongation.

Vectors are (..., 3) on any one set of axes; angles are radians.
"""

import numpy as np

from colure.arrays import TWO_PI, Float, dot, position_angle, separation


def phase_angle(body_from_sun: Float, body_from_observer: Float) -> Float:
    """Return the angle (...) Sun–body–observer, 0 to π; 0 for the Sun itself."""
    return separation(body_from_sun, body_from_observer)


def phase_angle_from_distances(r: Float | float, delta: Float | float, observer_sun: Float | float) -> Float:
    """Return the phase angle from the three distances Sun–body, observer–body and observer–Sun (one unit)."""
    r, delta, base = np.asarray(r), np.asarray(delta), np.asarray(observer_sun)
    cosine = (r * r + delta * delta - base * base) / (2.0 * r * delta)
    return np.asarray(np.arccos(np.clip(cosine, -1.0, 1.0)))


def illuminated(phase: Float | float) -> Float:
    """Return the illuminated fraction of a sphere's disc (0 to 1) at a phase angle."""
    return np.asarray(0.5 * (1.0 + np.cos(phase)))


def bright_limb(body: Float, sun: Float) -> Float:
    """Return the position angle (0 to 2π) of the middle of the bright limb: the great circle towards the Sun.

    Both vectors as seen by the observer; the angle is from the +z pole of their axes through growing longitude.
    """
    return position_angle(body, sun)


def elongation(body: Float, sun: Float, pole: Float) -> Float:
    """Return the separation from the Sun, −π to π, positive where the body is east of the Sun.

    East means that the body's longitude about `pole` (north pole of the ecliptic, (3,) or (..., 3)) exceeds the Sun's.
    """
    east = dot(np.cross(sun, body), np.broadcast_to(pole, np.broadcast_shapes(body.shape, sun.shape)))
    return np.where(east < 0.0, -1.0, 1.0) * separation(body, sun)


def longitude_from_sun(lon: Float, sun_lon: Float) -> Float:
    """Return the helio-ecliptic longitude, body minus Sun, −π to π (0 at conjunction, ±π at opposition)."""
    return np.asarray((lon - sun_lon + np.pi) % TWO_PI - np.pi)


def moon_phase(moon_lon: Float | float, sun_lon: Float | float) -> Float:
    """Return the Moon's phase as the excess of its ecliptic longitude over the Sun's, 0 (new) to 2π."""
    return np.asarray((np.asarray(moon_lon) - np.asarray(sun_lon)) % TWO_PI)


def semidiameter(radius: float, distance: Float | float) -> Float:
    """Return the angular radius of a sphere of `radius` seen from `distance` (one unit): its limb's tangent."""
    return np.asarray(np.arcsin(np.clip(radius / np.asarray(distance), 0.0, 1.0)))


def horizontal_parallax(radius: float, distance: Float | float) -> Float:
    """Return the horizontal parallax for an observer at `radius` from the centre of the Earth, in one unit."""
    return semidiameter(radius, distance)

"""Planes through the sky: poles, equinoxes and solstices, colures, how two planes cut, the planets' orbits."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colure import frames
from colure.arrays import DEG, TWO_PI, Float, cartesian, dot, norm, rotation_x, rotation_z, spherical, unit
from colure.errors import FrameError
from colure.frames import Frame, Rotation
from colure.moment import Moment
from colure.sidereal import Ground

CARDINALS = ("March equinox", "June solstice", "September equinox", "December solstice")
COLURES = ("equinoctial", "solstitial")
ORBITS = ("mercury", "venus", "emb", "mars", "jupiter", "saturn", "uranus", "neptune", "pluto")


@dataclass(frozen=True, slots=True)
class Crossing:
    """How a plane cuts a frame's plane: inclination (0 to π) and longitude of the ascending node, rad, each (*shape).

    The node is where the plane passes to the frame's north side, going round in its own positive sense. Where the two
    coincide the node means nothing.
    """

    inclination: Float
    node: Float


def pole(frame: Frame | str, moment: Moment | None = None, site: Ground | None = None) -> Float:
    """Return the pole (*shape, 3) of a frame's plane on ICRS axes: its north pole; the zenith of the horizon."""
    return frames.rotation(frame, moment, site).matrix[..., 2, :]


def cardinal_points(frame: Frame | str, moment: Moment | None = None) -> Float:
    """Return the directions (*shape, 4, 3) on ICRS axes of longitudes 0°, 90°, 180°, 270°, as CARDINALS names them."""
    matrix = frames.rotation(frame, moment).matrix
    x, y = matrix[..., 0, :], matrix[..., 1, :]
    return np.stack([x, y, -x, -y], axis=-2)


def colure(frame: Frame | str, which: str, moment: Moment | None = None, count: int = 361) -> Float:
    """Return a colure as a closed line (*shape, count, 3) on ICRS axes: the great circle through the frame's poles.

    The `equinoctial` one runs through longitudes 0° and 180°, the `solstitial` one through 90° and 270°; both begin
    at the north pole.
    """
    if which not in COLURES:
        raise FrameError(f"colure '{which}': expected {' or '.join(COLURES)}")
    matrix = frames.rotation(frame, moment).matrix
    along = matrix[..., COLURES.index(which), :]
    angle = np.linspace(0.0, TWO_PI, count)[:, None]
    return np.asarray(np.cos(angle) * matrix[..., None, 2, :] + np.sin(angle) * along[..., None, :])


def crossing(normal: Float, frame: Frame | str, moment: Moment | None = None, site: Ground | None = None) -> Crossing:
    """Return how planes with normals (..., 3) on ICRS axes cut a frame's plane."""
    return _crossing(frames.rotation(frame, moment, site).apply(normal))


def mutual(plane: Frame | str, frame: Frame | str, moment: Moment | None = None) -> Crossing:
    """Return how the plane of one frame cuts that of another: inclination and node counted in the second."""
    return crossing(pole(plane, moment), frame, moment)


def _crossing(local: Float) -> Crossing:
    rho = np.hypot(local[..., 0], local[..., 1])
    return Crossing(np.arctan2(rho, local[..., 2]), np.arctan2(local[..., 0], -local[..., 1]) % TWO_PI)


def orbit_poles(bodies: Sequence[str], moment: Moment) -> Float:
    """Return the poles (bodies, *shape, 3) of the osculating heliocentric orbits on ICRS axes, unit vectors.

    The embedded or opened ephemeris gives position and velocity about the Sun; `emb` is the Earth's orbit as it is
    usually meant, freed of the month. Mars to Pluto are the barycentres of their systems.
    """
    from colure import ephemeris

    pos, vel = ephemeris.default().posvel(("sun", *bodies), *moment.tdb)
    return unit(np.cross(pos[1:] - pos[0], vel[1:] - vel[0]))


def orbit_crossings(bodies: Sequence[str], frame: Frame | str, moment: Moment) -> Crossing:
    """Return inclination and node of the planets' orbits, each (bodies, *shape), on a frame such as `invariable`."""
    return crossing(orbit_poles(bodies, moment), frame, moment)


def turn_orbit(inclination: Float, node: Float, peri: Float, turn: Rotation) -> tuple[Float, Float, Float]:
    """Return inclination, node and argument of pericentre, rad, of an orbit after a change of the plane of reference.

    `turn` leads from the old plane's frame to the new one's; see `between`. All arrays broadcast.
    """
    i, w, o = (np.asarray(a, dtype=np.float64) for a in (inclination, node, peri))
    # Rows: direction of the pericentre and the orbit's pole, both in the old frame.
    axes = rotation_z(o) @ rotation_x(i) @ rotation_z(w)
    pericentre = turn.apply(axes[..., 0, :])
    normal = turn.apply(axes[..., 2, :])
    new = _crossing(normal)
    to_node = cartesian(new.node, np.zeros_like(new.node))
    argument = np.arctan2(dot(np.cross(to_node, pericentre), normal), dot(to_node, pericentre))
    return new.inclination, new.node, np.asarray(argument % TWO_PI)


def between(source: Frame | str, target: Frame | str, moment: Moment | None = None) -> Rotation:
    """Return the rotation from one frame to another."""
    return frames.rotation(target, moment) @ frames.rotation(source, moment).inverse()


def opening(a: Float, b: Float) -> Float:
    """Return the angle (...) in rad between planes with normals (..., 3)."""
    return np.arctan2(norm(np.cross(a, b)), dot(a, b))


def graticule(frame: Frame | str, lat_deg: float, moment: Moment | None = None, count: int = 361) -> Float:
    """Return a circle of latitude in a frame as a closed line (*shape, count, 3) on ICRS axes."""
    lon = np.linspace(0.0, TWO_PI, count)
    points = cartesian(lon, np.full(count, lat_deg * DEG))
    return np.asarray(points @ frames.rotation(frame, moment).matrix)


def longitude_of(direction: Float, frame: Frame | str, moment: Moment | None = None) -> tuple[Float, Float]:
    """Return longitude and latitude, rad, of directions (..., 3) on ICRS axes in a frame."""
    return spherical(frames.from_icrs(direction, frame, moment))

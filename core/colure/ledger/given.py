"""What a ledger can start from: a body, a star of the catalogue, a typed position with its motion, a bare direction."""

from dataclasses import dataclass
from typing import Any

import erfa
import numpy as np

from colure import frames, names
from colure.arrays import ARCSEC, DEG, MAS, Float, cartesian, unit
from colure.errors import AngleError, ColureError
from colure.frames import Frame
from colure.ledger import turns
from colure.moment import Moment
from colure.precession import J2000, YEAR
from colure.reduction import space_velocity
from colure.sites import Site
from colure.stars import EPOCH_JD, catalogue

ORDERS = {
    2: ("lon", "lat"),
    4: ("lon", "lat", "pm_lon", "pm_lat"),
    5: ("lon", "lat", "parallax", "pm_lon", "pm_lat"),
    6: ("lon", "lat", "parallax", "pm_lon", "pm_lat", "rv"),
}
"""What the rows of a covariance stand for, by its size; longitude and its motion times the cosine of the latitude."""

_STEPS = {"lon": 1e-6, "lat": 1e-6, "parallax": 1e-7, "pm_lon": 1e-7, "pm_lat": 1e-7, "rv": 1.0}
"""Steps of the derivatives: rad, rad/yr, km/s."""
_UNITS = {"lon": MAS, "lat": MAS, "parallax": MAS, "pm_lon": MAS, "pm_lat": MAS, "rv": 1.0}


@dataclass(frozen=True, slots=True)
class Motion:
    """How a star moves, in the frame of its position: mas/yr (longitude's times cos lat), mas, km/s (away)."""

    pm_lon: float = 0.0
    pm_lat: float = 0.0
    parallax: float = 0.0
    rv: float = 0.0

    def __post_init__(self) -> None:
        """Refuse what is no number or no motion of a star."""
        for what, value, low, high in (
            ("proper motion in longitude, mas/yr", self.pm_lon, -1e6, 1e6),
            ("proper motion in latitude, mas/yr", self.pm_lat, -1e6, 1e6),
            ("parallax, mas", self.parallax, 0.0, 1e6),
            ("radial velocity, km/s", self.rv, -3e5, 3e5),
        ):
            if not low <= value <= high:
                raise ColureError(f"{what}: {value:g}; expected {low:g} to {high:g}")


@dataclass(frozen=True, slots=True, eq=False)
class Source:
    """A direction that light comes from, ready for the path of stars.

    `position` (3,), `velocity` (3,) or None and `parallax` (rad, None where there is no distance) on ICRS axes at
    `epoch_jd` (TDB). `typed` (3,) are components in `frame`, where the position was given; `spread` holds perturbed
    states for a covariance, `covariance` (n, n) in rad, rad/yr and km/s, whose derivatives took `steps` (n,). `flags`
    are a star's. Where the position was read at another place than the astrometric, `seen` names it and `seen_as` (3,)
    is the direction as it was read.
    """

    name: str
    kind: str
    position: Float
    velocity: Float | None
    parallax: float | None
    epoch_jd: float
    frame: Frame
    typed: Float
    echo: dict[str, Any]
    flags: int | None = None
    covariance: Float | None = None
    spread: tuple[Float, Float, Float] | None = None
    steps: Float | None = None
    sigma_arcsec: float | None = None
    seen: str = "astrometric"
    seen_as: Float | None = None


ICRS = Frame("icrs")


def star(row: int, name: str | None = None) -> Source:
    """Return a star of the catalogue by its row."""
    rows = catalogue().rows([row])
    position, velocity = (np.asarray(part[0], dtype=np.float64) for part in rows.vectors(np.float64))
    east, north = (float(part[0]) / MAS for part in rows.proper_motion())
    parallax = float(rows.parallax_mas[0])
    echo: dict[str, Any] = {"epoch": "J2016.0", "pm_lon_mas_yr": east, "pm_lat_mas_yr": north}
    if parallax:
        echo |= {"parallax_mas": parallax, "rv_km_s": float(np.nan_to_num(rows.rv_km_s[0]))}
    shown = names.identify(row).best if name is None else name
    return Source(shown, "star", position, velocity, parallax * MAS, EPOCH_JD, ICRS, position, echo, int(rows.flags[0]))


def direction(vector: Float, name: str = "direction", sigma_arcsec: float | None = None) -> Source:
    """Return a bare direction (3,) on ICRS axes, infinitely far and at rest."""
    vector = np.asarray(vector, dtype=np.float64)
    length = float(np.sqrt(vector @ vector)) if vector.shape == (3,) else np.nan
    if not (np.isfinite(length) and length > 0.0):
        shown = ", ".join(f"{float(part):g}" for part in np.ravel(vector)[:4])
        raise ColureError(f"direction ({shown}): expected three finite numbers that are not all zero")
    there = vector / length
    return Source(name, "direction", there, None, None, J2000, ICRS, there, {}, sigma_arcsec=sigma_arcsec)


def jd_tdb(moment: Moment) -> float:
    """Return a moment as one Julian date of TDB, to 50 µs."""
    return float(moment.tdb[0]) + float(moment.tdb[1])


def position(
    lon_deg: float,
    lat_deg: float,
    frame: Frame | str,
    moment: Moment,
    site: Site | None = None,
    *,
    epoch: Moment | None = None,
    motion: Motion | None = None,
    covariance: Float | None = None,
    name: str | None = None,
    kind: str = "position",
) -> Source:
    """Return a position given in a frame; its epoch is by default that of the frame's equinox, J2000 without one.

    `covariance` (n, n) is symmetric, in mas, mas/yr and km/s, in the order of ORDERS for its size.
    """
    frame = frames.parsed(frame)
    if not (np.isfinite(lon_deg) and np.isfinite(lat_deg) and abs(lat_deg) <= 90.0 and abs(lon_deg) <= 3600.0):
        raise AngleError(f"position {lon_deg:g} {lat_deg:g}: expected finite degrees, latitude −90 to 90")
    if epoch is not None:
        jd = jd_tdb(epoch)
    elif frame.needs_moment:
        jd = jd_tdb(moment)
    else:
        jd = sum(frame.equinox_tt())
    echo: dict[str, Any] = {}
    if motion is not None or epoch is not None or not frame.is_rotation:
        echo["epoch"] = f"B{erfa.epb(jd, 0.0):.4f}" if not frame.is_rotation else f"J{2000.0 + (jd - J2000) / YEAR:.4f}"
    if motion is not None:
        echo |= {
            "pm_lon_mas_yr": motion.pm_lon,
            "pm_lat_mas_yr": motion.pm_lat,
            "parallax_mas": motion.parallax,
            "rv_km_s": motion.rv,
        }
    lon, lat = lon_deg * DEG, lat_deg * DEG
    centre: dict[str, float] = {}
    if motion is not None:
        moves = {"pm_lon": motion.pm_lon * MAS, "pm_lat": motion.pm_lat * MAS}
        centre = moves | {"parallax": motion.parallax * MAS, "rv": motion.rv}
    spread, steps, scaled = None, None, None
    if covariance is not None:
        order, scaled = _checked(covariance)
        if motion is None and len(order) > 2:
            raise ColureError(f"covariance of {len(order)} rows: holds motions, but the position was given without one")
        steps = np.array([_STEPS[key] for key in order])
        states = [
            _state(lon, lat, {**centre, key: centre.get(key, 0.0) + sign * _STEPS[key]}, frame, moment, site, jd)
            for key in order
            for sign in (1.0, -1.0)
        ]
        spread = (
            np.array([state[0] for state in states]),
            np.array([state[1] for state in states]),
            np.array([state[2] for state in states]),
        )
    pos, vel, parallax = _state(lon, lat, centre, frame, moment, site, jd)
    typed = cartesian(lon, lat)
    return Source(
        f"{frame} {lon_deg:.10g} {lat_deg:.10g}" if name is None else name,
        kind,
        pos,
        None if motion is None else vel,
        parallax or None,
        jd,
        frame,
        typed,
        echo,
        None,
        scaled,
        spread,
        steps,
    )


def _state(
    lon: float, lat: float, given: dict[str, float], frame: Frame, moment: Moment, site: Site | None, jd: float
) -> tuple[Float, Float, float]:
    """Return position (3,), velocity (3,) on ICRS axes and the parallax (rad) of a position given in a frame.

    `given` holds what there is of motion, parallax and radial velocity, and under "lon" and "lat" small shifts on the
    sky along the two, which leave the motion parallel to itself.
    """
    parallax, rv = given.get("parallax", 0.0), given.get("rv", 0.0)
    where = (np.asarray(lon), np.asarray(lat))
    pm = (np.asarray(given.get("pm_lon", 0.0)), np.asarray(given.get("pm_lat", 0.0)))
    local, moving = space_velocity(*where, *pm, np.asarray(parallax), np.asarray(rv))
    if "lon" in given or "lat" in given:
        nothing = np.zeros(())
        along = (np.asarray(given.get("lon", 0.0)), np.asarray(given.get("lat", 0.0)))
        local = unit(local + space_velocity(*where, *along, nothing, nothing)[1])
    if frame.is_rotation:
        back = frames.rotation(frame, moment, site).inverse()
        return back.apply(local), back.apply(moving), parallax
    # FK4's axes turn, and slip along with Newcomb's precession: the motion is that of the place carried over at both
    # ends of a span. Its years are tropical.
    year = float(erfa.epb(jd, 0.0))
    here = frames.to_icrs(local, frame, epoch=year)
    radial = float(moving @ local)
    across = moving - radial * local
    half = 5.0
    ends = [frames.to_icrs(unit(local + across * t), frame, epoch=year + t) for t in (half, -half)]
    tropical_in_julian = 1.00002135903
    return here, (ends[0] - ends[1]) / (2.0 * half) * tropical_in_julian + radial * here, parallax


def _checked(covariance: Float) -> tuple[tuple[str, ...], Float]:
    """Return the order of a covariance and the matrix in rad, rad/yr and km/s; raise ColureError for one that is none.

    A covariance is square, of 2, 4, 5 or 6 rows, symmetric, finite and has no negative variance along any axis.
    """
    matrix = np.asarray(covariance, dtype=np.float64)
    if matrix.ndim != 2 or matrix.shape[0] != matrix.shape[1] or matrix.shape[0] not in ORDERS:
        raise ColureError(f"covariance of shape {matrix.shape}: expected 2, 4, 5 or 6 rows and as many columns")
    if not np.all(np.isfinite(matrix)):
        raise ColureError("covariance: holds a value that is not finite")
    size = np.sqrt(np.abs(np.diag(matrix)))
    if np.any(np.diag(matrix) < 0.0) or np.any(np.abs(matrix - matrix.T) > 1e-9 * np.outer(size, size) + 1e-300):
        raise ColureError("covariance: expected a symmetric matrix with variances on its diagonal")
    scale = np.where(size > 0.0, size, 1.0)
    if np.linalg.eigvalsh(matrix / np.outer(scale, scale)).min() < -1e-9:
        raise ColureError("covariance: its correlations contradict each other (a negative variance along some axis)")
    order = ORDERS[len(matrix)]
    unit_of = np.array([_UNITS[key] for key in order])
    return order, matrix * np.outer(unit_of, unit_of)


def upper(numbers: tuple[float, ...]) -> Float:
    """Return the symmetric matrix whose upper triangle, row by row, is given by 3, 10, 15 or 21 numbers."""
    sizes = {n * (n + 1) // 2: n for n in ORDERS}
    if len(numbers) not in sizes:
        raise ColureError(f"covariance of {len(numbers)} numbers: expected 3, 10, 15 or 21, the upper triangle by rows")
    n = sizes[len(numbers)]
    out = np.zeros((n, n))
    out[np.triu_indices(n)] = numbers
    return np.asarray(out + out.T - np.diag(np.diag(out)))


def input_turn(source: Source, moment: Moment, site: Site | None) -> Float | None:
    """Return the matrix (3, 3) from the frame that a position was given in to ICRS axes; None for FK4."""
    if not source.frame.is_rotation:
        return None
    return turns.final_matrix(source.frame, moment, site).T


def rate_arcsec_s(line: Float, motion: Float) -> float:
    """Return how fast a body moves across the sky, from its vector (au) and relative velocity (au/day)."""
    across = np.cross(line, motion)
    return float(np.sqrt(across @ across) / (line @ line) / ARCSEC / 86400.0)

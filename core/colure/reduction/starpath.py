"""The path of stars: a context set once for a moment and an observer, then applied to any number of stars.

The context holds everything that does not depend on the star, so that a star costs a few dozen multiplications. The
number type of the stars is kept: float64 to the milliarcsecond and below, float32 (0.07″) for charts.
"""

from collections.abc import Collection
from threading import local
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure import refraction
from colure.arrays import Float, unit
from colure.ephemeris import Ephemeris
from colure.moment import Moment
from colure.reduction.bodypath import GEOCENTRE, check_place
from colure.reduction.observer import C_AU_DAY, Observer, ObserverState, eye, observer_state
from colure.reduction.optics import DEFLECTION_LIMIT, FAR_AU, SCHWARZSCHILD_AU, refracted
from colure.reduction.steps import PARTED, check_omitted
from colure.stepnames import SKY_STEPS

J2000 = 2451545.0
YEAR = 365.25
KM_S_AU_YR = 86400.0 * YEAR / 149597870.700
"""km/s in au per Julian year."""
BLOCK = 16384
"""Stars worked on at a time: every array of the arithmetic then stays in the cache."""

STAR_STEPS = SKY_STEPS
"""What happens to the direction of a star, in order: the names that `omit` may hold."""

Stars = NDArray[np.floating]


class StarContext(NamedTuple):
    """What a moment, an observer and a place mean for every star (units: years, au, speed of light)."""

    place: str
    years: float
    roemer_years: Float
    observer_au: Float
    velocity: Float
    towards_observer: Float
    weight: float
    limit: float
    potential: float
    rotation: Float | None
    zenith: Float | None
    air: refraction.Atmosphere | None


def space_velocity(
    lon: Float, lat: Float, pm_lon: Float, pm_lat: Float, parallax: Float, radial_km_s: Float
) -> tuple[Float, Float]:
    """Return unit positions (n, 3) and velocities (n, 3) in units of the star's distance per Julian year.

    Longitude and latitude in rad; proper motions in rad/yr, the longitude's times cos(latitude); parallax in rad;
    radial velocity in km/s, positive away (it acts only where there is a parallax).
    """
    cl, sl, cb, sb = np.cos(lon), np.sin(lon), np.cos(lat), np.sin(lat)
    position = np.stack([cl * cb, sl * cb, sb], axis=-1)
    east = np.stack([-sl, cl, np.zeros_like(sl)], axis=-1)
    north = np.stack([-cl * sb, -sl * sb, cb], axis=-1)
    # A star at parallax p stands at 1/p au, so v km/s change its distance by that many of its own distances a year.
    outward = np.asarray(radial_km_s) * KM_S_AU_YR * np.asarray(parallax)
    velocity = np.asarray(pm_lon)[..., None] * east + np.asarray(pm_lat)[..., None] * north
    return position, velocity + outward[..., None] * position


def space_motion(position: Float, velocity: Float, years: Float | float) -> Float:
    """Return unit directions (n, 3) after `years` of straight motion at constant speed.

    Arguments as `space_velocity` gives them. Exact for any span: perspective acceleration is in the straight line.
    """
    moved = position + np.asarray(years, dtype=np.float64)[..., None] * velocity
    return unit(moved)


def star_context(
    moment: Moment,
    *,
    observer: Observer = GEOCENTRE,
    place: str = "astrometric",
    epoch_jd: float = J2000,
    rotation: Float | None = None,
    ephemeris: Ephemeris | None = None,
    omit: Collection[str] = (),
) -> StarContext:
    """Return the context of one moment; `epoch_jd` (TDB) is that of the stars' positions.

    `rotation` (3, 3), from ICRS axes to a frame, is applied in the same pass. From the geocentre at the geometric
    place a star has only its space motion. `omit` names steps of STAR_STEPS to leave out: a context without the last
    steps gives the direction before them, which is how the ledger traces this path. A star's light time is Rømer's:
    light reaches the near side of the Earth's orbit earlier.
    """
    check_place(place, observer)
    check_omitted(omit, (*STAR_STEPS, *PARTED), place)
    return context_of(observer_state(observer, moment, ephemeris), moment, observer, place, epoch_jd, rotation, omit)


def context_of(
    state: ObserverState,
    moment: Moment,
    observer: Observer,
    place: str,
    epoch_jd: float = J2000,
    rotation: Float | None = None,
    omit: Collection[str] = (),
) -> StarContext:
    """Return the context of an observer whose state is already known; see `star_context`."""
    omit = observer.omitted.union(omit)
    jd1, jd2 = moment.tdb
    from_sun = state.pos - state.sun_pos
    distance = float(np.sqrt(from_sun @ from_sun))
    near = distance <= FAR_AU
    eye_pos, eye_vel = eye(state, omit)
    return StarContext(
        place=place,
        years=0.0 if "space motion" in omit else (float(jd1) - epoch_jd + float(jd2)) / YEAR,
        roemer_years=state.pos * (0.0 if {"light time", "space motion"} & set(omit) else 1.0 / (C_AU_DAY * YEAR)),
        observer_au=eye_pos,
        velocity=eye_vel / C_AU_DAY,
        towards_observer=np.zeros(3) if near else from_sun / distance,
        weight=0.0 if near or "deflection" in omit else SCHWARZSCHILD_AU / distance,
        limit=DEFLECTION_LIMIT / max(distance * distance, 1.0),
        potential=0.0 if near else SCHWARZSCHILD_AU / distance,
        rotation=rotation,
        zenith=state.zenith,
        air=observer.atmosphere if place == "observed" and "refraction" not in omit else None,
    )


def _lines(array: Stars, dtype: np.dtype[np.floating]) -> Stars:
    """Return (n, 3) as its three components (3, n), without a copy where memory already lies so."""
    return np.asarray(array, dtype=dtype).T


class _Workspace(local):
    """Memory for one block, kept for each thread: fresh pages at every call would cost as much as the arithmetic."""

    def __init__(self) -> None:
        self.flat: dict[np.dtype[np.floating], Stars] = {}

    def rows(self, dtype: np.dtype[np.floating], count: int) -> Stars:
        """Return (13, count) of contiguous memory with what happens to be in it."""
        if dtype not in self.flat:
            self.flat[dtype] = np.empty(13 * BLOCK, dtype=dtype)
        return self.flat[dtype][: 13 * count].reshape(13, count)


_workspace = _Workspace()


class _Constants:
    """A context's numbers in the number type of the stars, with the rotation folded in."""

    def __init__(self, context: StarContext, dtype: np.dtype[np.floating]) -> None:
        kind = dtype.type
        matrix = np.eye(3) if context.rotation is None else np.asarray(context.rotation)
        e, v = context.towards_observer, context.velocity
        inverse_gamma = float(np.sqrt(1.0 - v @ v))
        self.moves = context.place != "geometric"
        self.bends = context.place in ("apparent", "observed")
        self.turns = context.rotation is not None
        self.matrix = matrix.astype(dtype)
        # One product gives p·e, p·v and the turned vector together.
        self.rows = np.vstack([e, v, matrix]).astype(dtype)
        self.e, self.v = (matrix @ e).astype(dtype), (matrix @ v).astype(dtype)
        self.observer = context.observer_au.astype(dtype)[:, None]
        self.roemer = context.roemer_years.astype(dtype)
        self.years, self.weight, self.limit = kind(context.years), kind(context.weight), kind(context.limit)
        self.ev, self.half = kind(e @ v), kind(1.0 / (1.0 + inverse_gamma))
        self.potential, self.inverse_gamma = kind(context.potential), kind(inverse_gamma)
        self.push = kind(1.0 + context.potential)


def apply_context(context: StarContext, position: Stars, velocity: Stars | None, parallax: Stars | None) -> Stars:
    """Return unit directions (n, 3) of stars; see `reduce_stars` for the arguments.

    The result's memory is three runs of n, so that a column is contiguous.
    """
    dtype = position.dtype if position.dtype in (np.float32, np.float64) else np.dtype(np.float64)
    count = position.shape[0]
    out = np.empty((3, count), dtype=dtype)
    p_all = _lines(position, dtype)
    v_all = None if velocity is None else _lines(velocity, dtype)
    plx_all = None if parallax is None else np.asarray(parallax, dtype=dtype)
    use = _Constants(context, dtype)
    for start in range(0, count, BLOCK):
        cut = slice(start, min(start + BLOCK, count))
        work = _workspace.rows(dtype, cut.stop - start)
        p = _moved(
            use,
            p_all[:, cut],
            None if v_all is None else v_all[:, cut],
            None if plx_all is None else plx_all[cut],
            work,
        )
        if use.bends:
            _bent(use, p, work, out[:, cut])
        else:
            turned = np.matmul(use.matrix, p, out=work[5:8]) if use.turns else p
            np.multiply(turned, _inverse_length(p, work), out=out[:, cut])
        if context.zenith is not None and context.air is not None:
            zenith = (use.matrix @ context.zenith)[:, None]
            exact = dtype == np.float64
            out[:, cut] = refracted(out[:, cut].astype(np.float64), zenith, context.air, exact=exact)
    return out.T


def _moved(use: _Constants, p: Stars, v: Stars | None, parallax: Stars | None, work: Stars) -> Stars:
    """Return vectors (3, m) after space motion, from the observer, in units of the star's distance."""
    if v is not None:
        moved, when = work[0:3], work[3]
        if use.moves:
            # Light from the near side of the Earth's orbit left the star a little later (Rømer).
            np.matmul(use.roemer, p, out=when)
            when += use.years
            np.multiply(v, when, out=moved)
        else:
            np.multiply(v, use.years, out=moved)
        moved += p
        p = moved
    if parallax is not None and use.moves:
        shift = np.multiply(use.observer, parallax, out=work[5:8])
        p = np.subtract(p, shift, out=work[0:3])
    return p


def _inverse_length(p: Stars, work: Stars) -> Stars:
    """Return 1 / |p| (m,)."""
    length, square = work[3], work[4]
    np.multiply(p[0], p[0], out=length)
    length += np.multiply(p[1], p[1], out=square)
    length += np.multiply(p[2], p[2], out=square)
    np.sqrt(length, out=length)
    np.reciprocal(length, out=length)
    return np.asarray(length)


def _bent(use: _Constants, p: Stars, work: Stars, out: Stars) -> None:
    """Write directions (3, m) after deflection and aberration, turned by the context's rotation.

    Both only add multiples of the star's direction, of e (Sun to observer) and of v (the observer's motion), so the
    three factors are found first and the vectors put together once. Formulas as in `optics`, for sources at infinity.
    """
    one = out.dtype.type(1.0)
    length = _inverse_length(p, work)
    products = np.matmul(use.rows, p, out=work[5:10])
    pe, along, spare, bend, scale = products[0], products[1], work[4], work[10], work[11]
    keep = work[12]
    pe *= length
    along *= length
    np.add(pe, one, out=bend)
    np.maximum(bend, use.limit, out=bend)
    np.divide(use.weight, bend, out=bend)
    shrink = np.multiply(bend, pe, out=pe)
    np.subtract(one, shrink, out=shrink)
    along *= shrink
    along += np.multiply(bend, use.ev, out=spare)
    np.add(along, one, out=scale)
    np.reciprocal(scale, out=scale)
    np.multiply(along, -use.potential, out=keep)
    keep += use.inverse_gamma
    keep *= scale
    push = np.multiply(along, use.half, out=along)
    push += use.push
    push *= scale
    bend *= keep
    keep *= shrink
    keep *= length
    for axis in range(3):
        line = np.multiply(products[2 + axis], keep, out=out[axis])
        line += np.multiply(push, use.v[axis], out=spare)
        line += np.multiply(bend, use.e[axis], out=spare)


def reduce_stars(
    position: Stars,
    velocity: Stars | None,
    parallax: Stars | None,
    moment: Moment,
    *,
    observer: Observer = GEOCENTRE,
    place: str = "apparent",
    epoch_jd: float = J2000,
    rotation: Float | None = None,
    ephemeris: Ephemeris | None = None,
) -> Stars:
    """Return unit directions (n, 3) of stars at one moment, in the number type of `position`.

    `position` (n, 3) unit vectors, ICRS, at `epoch_jd` (TDB); `velocity` (n, 3) per Julian year in units of the
    star's distance (see `space_velocity`), radial part included; `parallax` (n,) rad; either may be None.
    Axes of the answer: ICRS, or those that `rotation` leads to. Agrees with ERFA's atciq to 0.1 mas (float64).
    """
    context = star_context(
        moment, observer=observer, place=place, epoch_jd=epoch_jd, rotation=rotation, ephemeris=ephemeris
    )
    return apply_context(context, position, velocity, parallax)


def unreduce(
    directions: Float,
    moment: Moment,
    *,
    observer: Observer = GEOCENTRE,
    place: str = "apparent",
    ephemeris: Ephemeris | None = None,
) -> Float:
    """Return the ICRS directions (n, 3) of distant sources that are seen in `directions` (n, 3, ICRS axes) at a place.

    The inverse of `reduce_stars` without motion and parallax, by iteration to 1e-13 rad; close to the Sun's disc,
    where deflection is not one-to-one, to 1″.
    """
    return unapply(star_context(moment, observer=observer, place=place, ephemeris=ephemeris), directions)


def unapply(context: StarContext, directions: Float) -> Float:
    """Return the directions (n, 3) that a context turns into `directions`; see `unreduce`."""
    wanted = unit(np.atleast_2d(np.asarray(directions, dtype=np.float64)))
    guess = wanted
    for _ in range(50):  # three or four without refraction; near the horizon each gains but a factor of three
        missing = wanted - apply_context(context, guess, None, None)
        guess = unit(guess + missing)
        if np.abs(missing).max(initial=0.0) < 1e-14:
            break
    return guess.reshape(np.shape(directions))

"""The turns from ICRS axes to a frame, one named step at a time: bias, precession, nutation, Earth rotation and so on.

No model stands here: every turn is what lies between two matrices of `precession`, `ofdate`, `sidereal` and `frames`,
and their product is the matrix of the frame itself. Precession is cut at the axes of the equator of date whose
equinox still lies on the ecliptic of J2000: before them the equator moved, after them the ecliptic.
"""

from collections.abc import Callable, Collection
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from colure import fk4, frames, ofdate, precession, sidereal
from colure.arrays import Float, unit
from colure.frames import Frame
from colure.moment import Moment
from colure.nutation import series_of
from colure.precession import Instant
from colure.sites import Site
from colure.stepnames import (
    BIAS,
    E_TERMS,
    EARTH_ROTATION,
    ECLIPTIC,
    EQUATOR,
    FK4_PRECESSION,
    NUTATION,
    POLAR_MOTION,
    TURN_STEPS,
)

J2000 = (precession.J2000, 0.0)
NAMES = {
    "iau2006": "IAU 2006",
    "vondrak2011": "Vondrák, Capitaine & Wallace 2011",
    "iau1976": "IAU 1976",
    "newcomb": "Newcomb",
}
SERIES = {"iau2000a": "IAU 2000A (2006)", "iau1980": "IAU 1980"}


@dataclass(frozen=True, slots=True, eq=False)
class Turn:
    """One step between axes.

    `axes` names the axes after it and `equatorial` says whether longitudes there are right ascensions. `matrix` (3, 3)
    takes components before the step to those after it; None for FK4's steps, which are no rotations: `change` does it.
    """

    name: str
    axes: str
    equatorial: bool
    model: str
    matrix: Float | None
    change: Callable[[Float], Float] | None = None

    def apply(self, vectors: Float) -> Float:
        """Return components (..., 3) after the step for those before it."""
        if self.change is not None:
            return self.change(vectors)
        assert self.matrix is not None
        return np.asarray(vectors @ self.matrix.T)


@dataclass(frozen=True, slots=True)
class _Axes:
    """Axes on the way: matrix from ICRS to them, and the step that leads there."""

    step: str
    name: str
    equatorial: bool
    model: str
    matrix: Float


def chain(
    frame: Frame, moment: Moment, site: Site | None, *, polar_motion: bool = True, epoch: float | None = None
) -> tuple[Turn, ...]:
    """Return the turns that lead from ICRS axes to a frame; none for `icrs`.

    `epoch` is the Besselian year at which FK4 is entered. Raises what `frames.rotation` raises.
    """
    if not frame.is_rotation:
        return _fk4(frame, epoch)
    return _rotations(frame, moment, site if frame.needs_site else None, polar_motion)


@lru_cache(maxsize=64)
def _rotations(frame: Frame, moment: Moment, site: Site | None, polar_motion: bool) -> tuple[Turn, ...]:
    turns = []
    before = np.eye(3)
    for axes in _way(frame, moment, site, polar_motion):
        matrix = axes.matrix @ before.T
        matrix.flags.writeable = False
        turns.append(Turn(axes.step, axes.name, axes.equatorial, axes.model, matrix))
        before = axes.matrix
    return tuple(turns)


def final_matrix(frame: Frame, moment: Moment, site: Site | None, *, polar_motion: bool = True) -> Float:
    """Return the matrix (3, 3) from ICRS axes to a frame, the horizon's with or without polar motion."""
    if frame.plane == "horizon" and site is not None and not polar_motion:
        return sidereal.horizon_matrix(moment, site, polar_motion=False, model=frame.model or "auto")
    return frames.rotation(frame, moment, site).matrix


def _way(frame: Frame, moment: Moment, site: Site | None, polar_motion: bool) -> list[_Axes]:
    last = final_matrix(frame, moment, site, polar_motion=polar_motion)
    model = frame.model or "auto"
    at: Instant = moment if frame.needs_moment else frame.equinox_tt()
    match frame.plane, frame.kind:
        case (("icrs" | "gcrs"), _):
            return []
        case "equator", "mean":
            return _equators(at, model, frame.equinox, last)
        case "ecliptic", ("mean" | "true" | "sun"):
            return _ecliptics(frame, at, model, last)
        case (("equator" | "cirs" | "horizon"), _):
            return _true_equators(frame, at, model, moment, polar_motion, last)
    defined = {
        "galactic": "ESA SP-1200",
        "supergalactic": "de Vaucouleurs et al. 1976",
        "invariable": "Souami & Souchay 2012",
        "ecliptic": "obliquity 84381.448″ on ICRF axes",
    }
    return [_Axes(f"{frame.plane} plane", str(frame), False, defined[frame.plane], last)]


def _of(equinox: str | None) -> str:
    return "date" if equinox is None else equinox


def _equators(at: Instant, model: str, equinox: str | None, last: Float) -> list[_Axes]:
    """Return the way to the mean equator: of J2000, then moved, then with its equinox on the moved ecliptic."""
    name = precession.model_at(at, model)
    shown = NAMES[name]
    bias = _Axes(BIAS, "equator/mean/J2000", True, shown, precession.bias_precession_matrix(J2000, name))
    if equinox == "J2000":
        return [_Axes(BIAS, "equator/mean/J2000", True, shown, last)]
    of = _of(equinox)
    moved = _with_node(last[2], last[2], precession.ecliptic_pole(J2000, name))
    return [
        bias,
        _Axes(EQUATOR, f"equator/mean/{of}, equinox on the ecliptic of J2000", True, shown, moved),
        _Axes(ECLIPTIC, f"equator/mean/{of}", True, shown, last),
    ]


def _with_node(pole: Float, equator: Float, ecliptic: Float) -> Float:
    """Return axes (3, 3) about a pole, with x at the ascending node of an ecliptic on an equator (given by poles)."""
    node = unit(np.cross(equator, ecliptic))
    return np.stack([node, np.cross(pole, node), pole])


def _ecliptics(frame: Frame, at: Instant, model: str, last: Float) -> list[_Axes]:
    name = precession.model_at(at, model)
    shown = NAMES[name]
    still = precession.ecliptic_matrix(J2000, name)
    mean = last if frame.kind == "mean" else precession.ecliptic_matrix(at, name)
    of = _of(frame.equinox)
    way = [_Axes(BIAS, "equator/mean/J2000", True, shown, precession.bias_precession_matrix(J2000, name))]
    if of == "J2000":
        way.append(_Axes("ecliptic plane", "ecliptic/mean/J2000", False, shown, mean))
    else:
        moved = _with_node(still[2], precession.equator_pole(at, name), still[2])
        way += [
            _Axes("ecliptic plane", "ecliptic/mean/J2000", False, shown, still),
            _Axes(EQUATOR, f"ecliptic of J2000, equinox of {of}", False, shown, moved),
            _Axes(ECLIPTIC, f"ecliptic/mean/{of}", False, shown, mean),
        ]
    if frame.kind == "mean":
        return way
    true = last if frame.kind == "true" else ofdate.true_ecliptic_matrix(at, model)
    way.append(_Axes(NUTATION, f"ecliptic/true/{of}", False, SERIES[series_of(name)], true))
    if frame.kind == "sun":
        way.append(_Axes("longitude from the Sun", "ecliptic/sun/date", False, "the Sun's apparent longitude", last))
    return way


def _true_equators(
    frame: Frame, at: Instant, model: str, moment: Moment, polar_motion: bool, last: Float
) -> list[_Axes]:
    equinox = frame.equinox if frame.plane == "equator" else "date"
    mean = precession.bias_precession_matrix(at, model)
    true = last if frame.plane == "equator" else ofdate.true_equator_matrix(at, model)
    name = SERIES[series_of(precession.model_at(at, model))]
    way = [
        *_equators(at, model, equinox, mean),
        _Axes(NUTATION, f"equator/true/{_of(equinox)}", True, name, true),
    ]
    if frame.plane == "cirs":
        way.append(_Axes("intermediate origin", "cirs", True, "equation of the origins, IAU 2006", last))
    if frame.plane != "horizon":
        return way
    turned = ofdate.turned(true, sidereal.gast(moment, model))
    way.append(_Axes(EARTH_ROTATION, "terrestrial intermediate (TIRS)", False, "IAU 2006 sidereal time, UT1", turned))
    if polar_motion:
        itrs = sidereal.polar_motion_matrix(moment) @ turned
        way.append(_Axes(POLAR_MOTION, "terrestrial (ITRS)", False, "IERS pole", itrs))
    way.append(_Axes("horizon of the site", "horizon", False, "normal of the WGS84 ellipsoid", last))
    return way


def _fk4(frame: Frame, epoch: float | None) -> tuple[Turn, ...]:
    equinox = frame.besselian_year()
    observed = equinox if epoch is None else epoch
    plain = f"equator/fk4-no-e/{frame.equinox}"

    def back_in_time(vectors: Float) -> Float:
        return fk4.from_fk5(vectors, equinox, observed, e_terms=False)

    def with_terms(vectors: Float) -> Float:
        return fk4.add_e_terms(vectors, equinox, observed)

    turns = [
        Turn(BIAS, "FK5 J2000", True, "FK5 as found by Hipparcos", precession.fk5_matrix()),
        Turn(
            FK4_PRECESSION,
            plain,
            True,
            f"FK4 to FK5 (Explanatory Supplement 1992), Newcomb; observed B{observed:.2f}",
            None,
            back_in_time,
        ),
    ]
    if frame.kind == "fk4":
        turns.append(Turn(E_TERMS, str(frame), True, "E-terms of aberration (Smith et al. 1989)", None, with_terms))
    return tuple(turns)


def reduced(
    frame: Frame | str, moment: Moment, site: Site | None, omitted: Collection[str], *, polar_motion: bool = True
) -> Float:
    """Return the matrix (3, 3) from ICRS axes to a frame without the turns that `omitted` names.

    With it in place of the frame's own, a chart shows what leaving them out does to its circles and its grid.
    """
    frame = frames.parsed(frame)
    polar_motion = polar_motion and POLAR_MOTION not in omitted
    if not set(omitted) & set(TURN_STEPS):
        return final_matrix(frame, moment, site, polar_motion=polar_motion)
    short = np.eye(3)
    for turn in chain(frame, moment, site, polar_motion=polar_motion):
        if turn.name not in omitted:
            assert turn.matrix is not None
            short = turn.matrix @ short
    return short


def omission(
    frame: Frame | str,
    moment: Moment,
    site: Site | None,
    omitted: Collection[str],
    *,
    polar_motion: bool = True,
) -> Float | None:
    """Return the turn (3, 3), on ICRS axes, that shows on a chart in a frame what leaving out turns does to the sky.

    A direction multiplied by it lands where the frame's grid reads what a reduction without those steps would have
    given. None where nothing that is left out is on the way, or the frame is no rotation.
    """
    frame = frames.parsed(frame)
    if not frame.is_rotation or not set(omitted) & set(TURN_STEPS):
        return None
    if not any(turn.name in omitted for turn in chain(frame, moment, site, polar_motion=polar_motion)):
        return None
    short = reduced(frame, moment, site, omitted, polar_motion=polar_motion)
    return np.asarray(final_matrix(frame, moment, site, polar_motion=polar_motion).T @ short)

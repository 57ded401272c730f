"""Frames: turning vectors on ICRS axes into any named frame and back, by rotations that know where they lead.

The grammar of a frame's name is in `colure.framenames`. FK4 alone is no rotation: `from_icrs` and `to_icrs` serve it
too.
"""

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import erfa
import numpy as np

from colure import fk4, ofdate, precession, sidereal
from colure.arrays import ARCSEC, DEG, Float, rotate, rotation_x, rotation_z
from colure.errors import FrameError, FrameMismatch
from colure.framenames import Frame
from colure.moment import Moment
from colure.sidereal import Ground

__all__ = ["Frame", "Rotation", "convert", "from_icrs", "rotation", "to_icrs"]

OBLIQUITY_IAU76_J2000 = 84381.448 * ARCSEC
"""Obliquity of `ecliptic/iau76/J2000`, the ecliptic of published orbital elements, on ICRF axes."""
INVARIABLE_NODE_DEG = 107.0 + 34.0 / 60.0 + 56.0 / 3600.0
INVARIABLE_INCLINATION_DEG = 1.0 + 34.0 / 60.0 + 43.3 / 3600.0


@dataclass(frozen=True, slots=True)
class Rotation:
    """A rotation between two frames: `matrix` (..., 3, 3) turns vectors on `source` axes into vectors on `target` axes.

    `source_at` and `target_at` are the moment and site of the two frames where they need them, None where not; two
    rotations only join where frame, moment and site agree. The horizon's axes are left-handed: its matrix has
    determinant −1, and its inverse is the transpose all the same.
    """

    matrix: Float
    source: str
    target: str
    source_at: Any = None
    target_at: Any = None

    def __matmul__(self, first: "Rotation") -> "Rotation":
        """Return the rotation that does `first` and then this one; raise FrameMismatch where they do not meet."""
        if self.source != first.target:
            raise FrameMismatch(f"rotation from '{self.source}' after one that ends in '{first.target}'")
        if not _same_instant(self.source_at, first.target_at):
            raise FrameMismatch(f"frame '{self.source}': the two rotations are of different moments or sites")
        return Rotation(self.matrix @ first.matrix, first.source, self.target, first.source_at, self.target_at)

    def apply(self, vectors: Float) -> Float:
        """Return vectors (..., 3) on the target's axes; leading dimensions broadcast with the matrix's."""
        return rotate(self.matrix, vectors)

    def inverse(self) -> "Rotation":
        """Return the rotation back."""
        back = np.swapaxes(self.matrix, -1, -2)
        return Rotation(back, self.target, self.source, self.target_at, self.source_at)


def _same_instant(a: Any, b: Any) -> bool:
    if a is b:
        return True
    if a is None or b is None:
        return False
    (moment_a, site_a), (moment_b, site_b) = a, b
    return bool(
        site_a == site_b
        and (moment_a is moment_b or all(np.array_equal(x, y) for x, y in zip(moment_a.tt, moment_b.tt, strict=True)))
    )


def parsed(frame: Frame | str) -> Frame:
    """Return a frame given as such or by its name."""
    return Frame.parse(frame) if isinstance(frame, str) else frame


def rotation(frame: Frame | str, moment: Moment | None = None, site: Ground | None = None) -> Rotation:
    """Return the rotation from ICRS axes to a frame; its matrix is (3, 3), or (*shape, 3, 3) for a frame of date.

    Raises FrameError for FK4 (no rotation) and where a moment or a site is missing, SpanError outside a model's span.
    Scalar moments are remembered: a repeated call costs about a microsecond, and its matrix is read-only.
    """
    frame = parsed(frame)
    if not frame.is_rotation:
        raise FrameError(f"frame '{frame}': is no rotation (E-terms of aberration); convert positions instead")
    if not frame.needs_moment:
        return Rotation(_fixed(frame), "icrs", str(frame))
    if moment is None:
        raise FrameError(f"frame '{frame}': needs a moment")
    if frame.needs_site and site is None:
        raise FrameError(f"frame '{frame}': needs a site")
    where = site if frame.needs_site else None
    if isinstance(moment.tt1, float) and frame.kind != "sun":
        matrix = _at_scalar(frame, moment.tt1, float(moment.tt2), _Held(moment, where))
    else:
        matrix = _of_date(frame, moment, where)
    return Rotation(matrix, "icrs", str(frame), None, (moment, where))


class _Held:
    """Carries moment and site past the cache's key: equal whenever the site is, as TT stands in the key itself."""

    __slots__ = ("moment", "site")

    def __init__(self, moment: Moment, site: Ground | None) -> None:
        self.moment = moment
        self.site = site

    def __hash__(self) -> int:
        return 0 if self.site is None else hash((self.site.lon_deg, self.site.lat_deg))

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Held) and self.site == other.site


@lru_cache(maxsize=1024)
def _at_scalar(frame: Frame, tt1: float, tt2: float, held: _Held) -> Float:
    matrix = _of_date(frame, held.moment, held.site)
    matrix.flags.writeable = False
    return matrix


def _of_date(frame: Frame, moment: Moment, site: Ground | None) -> Float:
    model = frame.model or "auto"
    match frame.plane, frame.kind:
        case "ecliptic", "sun":
            from colure import bodies

            sun = bodies.sun_longitude(moment)
            return ofdate.turned(ofdate.true_ecliptic_matrix(moment, model), sun)
        case "cirs", _:
            return ofdate.cirs_matrix(moment, model)
        case "horizon", _ if site is not None:
            return sidereal.horizon_matrix(moment, site, model=model)
    return _by_equinox(frame, moment)


@lru_cache(maxsize=256)
def _fixed(frame: Frame) -> Float:
    matrix = np.array(_fixed_matrix(frame))
    matrix.flags.writeable = False
    return matrix


def _fixed_matrix(frame: Frame) -> Float:
    match frame.plane, frame.kind:
        case (("icrs" | "gcrs"), _):
            return np.eye(3)
        case "galactic", _:
            return galactic_matrix()
        case "supergalactic", _:
            return SUPERGALACTIC @ galactic_matrix()
        case "invariable", _:
            return invariable_matrix()
        case "ecliptic", "iau76":
            return rotation_x(OBLIQUITY_IAU76_J2000)
    return _by_equinox(frame, frame.equinox_tt())


def _by_equinox(frame: Frame, at: precession.Instant) -> Float:
    """Return the matrix of a mean or true plane for the instant of its equinox, fixed or of date."""
    model = frame.model or "auto"
    match frame.plane, frame.kind:
        case "equator", "mean":
            return precession.bias_precession_matrix(at, model)
        case "equator", "true":
            return ofdate.true_equator_matrix(at, model)
        case "ecliptic", "mean":
            return precession.ecliptic_matrix(at, model)
        case "ecliptic", "true":
            return ofdate.true_ecliptic_matrix(at, model)
    raise AssertionError(f"frame '{frame}' has no matrix")


def galactic_matrix() -> Float:
    """Return the matrix (3, 3) from ICRS axes to galactic ones, as ERFA's `icrs2g` (ESA SP-1200, vol. 1, 1.5.3)."""
    axes = np.eye(3)
    lon, lat = erfa.icrs2g(*erfa.c2s(axes))
    return np.asarray(erfa.s2c(lon, lat)).T


def _supergalactic() -> Float:
    # de Vaucouleurs et al. 1976: pole at l 47.37°, b +6.32°; origin at l 137.37°, b 0°.
    pole = erfa.s2c(47.37 * DEG, 6.32 * DEG)
    origin = erfa.s2c(137.37 * DEG, 0.0)
    return np.array([origin, np.cross(pole, origin), pole])


SUPERGALACTIC = _supergalactic()
"""Matrix (3, 3) from galactic to supergalactic axes."""


def invariable_matrix() -> Float:
    """Return the matrix (3, 3) from ICRS axes to the invariable plane, longitude from its node on the J2000 ecliptic.

    Souami & Souchay 2012, A&A 543, A133: inclination and node on the mean ecliptic and equinox J2000.
    """
    onto = rotation_x(INVARIABLE_INCLINATION_DEG * DEG) @ rotation_z(INVARIABLE_NODE_DEG * DEG)
    return np.asarray(onto @ precession.ecliptic_matrix((precession.J2000, 0.0), "iau2006"))


def from_icrs(
    vectors: Float,
    frame: Frame | str,
    moment: Moment | None = None,
    site: Ground | None = None,
    epoch: Float | float | None = None,
) -> Float:
    """Return vectors (..., 3) on ICRS axes turned into a frame, FK4 included.

    `epoch` is the Besselian year (...) of observation of an FK4 position, by default the frame's equinox; FK4 keeps
    directions, not lengths: its vectors come back as unit vectors.
    """
    frame = parsed(frame)
    if frame.is_rotation:
        return rotation(frame, moment, site).apply(vectors)
    return fk4.from_icrs(vectors, frame.besselian_year(), epoch, e_terms=frame.kind == "fk4")


def to_icrs(
    vectors: Float,
    frame: Frame | str,
    moment: Moment | None = None,
    site: Ground | None = None,
    epoch: Float | float | None = None,
) -> Float:
    """Return vectors (..., 3) given in a frame turned to ICRS axes; the inverse of `from_icrs`."""
    frame = parsed(frame)
    if frame.is_rotation:
        return rotation(frame, moment, site).inverse().apply(vectors)
    return fk4.to_icrs(vectors, frame.besselian_year(), epoch, e_terms=frame.kind == "fk4")


def convert(
    vectors: Float,
    source: Frame | str,
    target: Frame | str,
    moment: Moment | None = None,
    site: Ground | None = None,
    epoch: Float | float | None = None,
) -> Float:
    """Return vectors (..., 3) given in `source`, in `target`; by way of ICRS axes.

    `epoch` is that of an FK4 observation; by default the equinox of the first of the two frames that is FK4.
    """
    source, target = parsed(source), parsed(target)
    if epoch is None and not source.is_rotation:
        epoch = source.besselian_year()  # one observation has one epoch, also between two equinoxes of FK4
    return from_icrs(to_icrs(vectors, source, moment, site, epoch), target, moment, site, epoch)

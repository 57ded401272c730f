"""Convert positions and whole columns of positions from one frame to another, refusing rows that are none."""

from dataclasses import dataclass

import numpy as np

from colure import angles, frames, precession
from colure.arrays import DEG, Bool, Float, cartesian, position_angle, spherical
from colure.errors import FrameError, TableError
from colure.frames import Frame
from colure.moment import Moment
from colure.sidereal import Ground


@dataclass(frozen=True, slots=True)
class Converted:
    """Positions in the target frame, degrees; longitude 0 to 360. Rows that were no position are NaN and not `ok`.

    `model` names the precession that took part, `epoch` the Besselian year of an FK4 observation (None without FK4).
    """

    lon_deg: Float
    lat_deg: Float
    ok: Bool
    source: Frame
    target: Frame
    model: str | None
    epoch: Float | float | None = None

    def faults(self) -> tuple[int, ...]:
        """Return the row numbers, counted from 1, that were refused."""
        return tuple(int(i) + 1 for i in np.flatnonzero(~self.ok))


def text(
    position: str,
    source: Frame | str,
    target: Frame | str,
    moment: Moment | None = None,
    site: Ground | None = None,
    epoch: float | None = None,
) -> Converted:
    """Return one position, written `LON LAT` in the source frame's manner, in the target frame."""
    source = frames.parsed(source)
    lon, lat = angles.parse_position(position, equatorial=source.is_equatorial)
    return columns(np.array([lon]), np.array([lat]), source, target, moment, site, epoch)


def columns(
    lon_deg: Float,
    lat_deg: Float,
    source: Frame | str,
    target: Frame | str,
    moment: Moment | None = None,
    site: Ground | None = None,
    epoch: Float | float | None = None,
    *,
    skip_bad: bool = True,
) -> Converted:
    """Return positions (n,) in degrees turned from one frame to another; one call however many rows.

    `moment` is one for all or an array (n,); `epoch`, a Besselian year or an array, is that of FK4 observations. A row
    that is not finite or whose latitude is outside ±90° is refused: marked, or with `skip_bad` false a TableError.
    """
    source, target = frames.parsed(source), frames.parsed(target)
    check_columns(lon_deg, lat_deg, moment)
    lon, lat = np.asarray(lon_deg, dtype=np.float64), np.asarray(lat_deg, dtype=np.float64)
    # Longitudes of any turn are taken, as long as they are angles at all: 725 is 5, 1e9 is a slip.
    ok = np.isfinite(lon) & np.isfinite(lat) & (np.abs(lat) <= 90.0) & (np.abs(lon) <= 3600.0)
    if not skip_bad and not np.all(ok):
        row = int(np.flatnonzero(~ok)[0])
        raise TableError(
            f"row {row + 1}: position {lon[row]:g} {lat[row]:g}; expected finite degrees, latitude −90 to 90"
        )
    vectors = cartesian(np.where(ok, lon, 0.0) * DEG, np.where(ok, lat, 0.0) * DEG)
    turned = frames.convert(vectors, source, target, moment, site, epoch)
    new_lon, new_lat = spherical(turned)
    return Converted(
        np.where(ok, new_lon / DEG, np.nan),
        np.where(ok, new_lat / DEG, np.nan),
        ok,
        source,
        target,
        model_used(source, target, moment),
        fk4_epoch(source, target, epoch),
    )


def fk4_epoch(source: Frame, target: Frame, epoch: Float | float | None) -> Float | float | None:
    """Return the epoch of observation at which FK4 is entered or left, as given or by default; None without FK4."""
    fk4 = [frame for frame in (source, target) if not frame.is_rotation]
    if not fk4:
        return None
    return fk4[0].besselian_year() if epoch is None else epoch


def check_columns(lon_deg: Float, lat_deg: Float, moment: Moment | None) -> None:
    """Raise TableError unless the columns, and an array of moments, are equally long."""
    shapes = {np.shape(lon_deg), np.shape(lat_deg)}
    if len(shapes) > 1 or len(np.shape(lon_deg)) != 1:
        raise TableError(f"columns of shapes {np.shape(lon_deg)} and {np.shape(lat_deg)}: expected two of one length")
    if moment is not None and np.shape(moment.tt1) not in ((), np.shape(lon_deg)):
        raise TableError(f"{np.size(moment.tt1)} moments for {np.size(lon_deg)} rows: expected one, or one a row")


def model_used(source: Frame, target: Frame, moment: Moment | None) -> str | None:
    """Return the precession models that took part, for display; None where there was none."""
    names = []
    for frame in (source, target):
        if frame.plane in ("equator", "ecliptic", "cirs", "horizon") and frame.is_rotation and frame.kind != "iau76":
            if frame.needs_moment and moment is None:
                raise FrameError(f"frame '{frame}': needs a moment")
            at = moment if frame.needs_moment and moment is not None else frame.equinox_tt()
            names.append(precession.model_at(at, frame.model or "auto"))
        elif not frame.is_rotation:
            names.append("newcomb")
    return ", ".join(dict.fromkeys(names)) or None


def north_turn(
    vectors_icrs: Float,
    source: Frame | str,
    target: Frame | str,
    moment: Moment | None = None,
    site: Ground | None = None,
) -> Float:
    """Return the position angle (...), rad, of the source frame's north in the target frame, at directions (..., 3).

    A position angle counted from the source's north, plus this, is counted from the target's.
    """
    here = frames.from_icrs(vectors_icrs, target, moment, site)
    # A pole at the direction itself has no bearing; arctan2 answers 0 there.
    pole = frames.convert(np.array([0.0, 0.0, 1.0]), source, target, moment, site)
    return position_angle(here, np.broadcast_to(pole, here.shape))

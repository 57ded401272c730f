"""One direction in every frame that an observer is likely to be handed: a table of longitudes and latitudes as text."""

from dataclasses import dataclass

import numpy as np

from colure import angles, frames
from colure.arrays import ARCSEC, DEG, Float, cartesian, dot, position_angle, separation, spherical
from colure.errors import ColureError, FrameError
from colure.frames import Frame
from colure.moment import Moment
from colure.sidereal import Ground

FRAMES = (
    "icrs",
    "equator/mean/J2000",
    "equator/fk4/B1950",
    "equator/mean/date",
    "equator/true/date",
    "ecliptic/mean/J2000",
    "ecliptic/mean/date",
    "ecliptic/true/date",
    "ecliptic/sun/date",
    "galactic",
    "invariable",
    "horizon",
)
"""The frames of the table, in the order in which they are listed."""


@dataclass(frozen=True, slots=True)
class Row:
    """A direction in one frame: degrees for machines, text with no more figures than the uncertainty supports.

    `fault` says why a frame has no answer (no site, or outside the span of its model); the numbers are then NaN.
    """

    frame: str
    label: str
    lon_name: str
    lat_name: str
    lon_deg: float
    lat_deg: float
    lon_text: str
    lat_text: str
    fault: str = ""


def names(frame: Frame) -> tuple[str, str]:
    """Return the signs by which the trade calls the longitude and latitude of a frame."""
    if frame.is_equatorial:
        return "α", "δ"
    return {"galactic": ("l", "b"), "supergalactic": ("SGL", "SGB"), "horizon": ("A", "h")}.get(frame.plane, ("λ", "β"))


def row(
    direction: Float,
    frame: Frame | str,
    moment: Moment,
    *,
    site: Ground | None = None,
    sigma_arcsec: float = 1.0,
    degrees: bool = False,
) -> Row:
    """Return the row of one frame for a direction (3,) on ICRS axes; a refusal becomes the row's `fault`.

    `sigma_arcsec` is the uncertainty of the direction. With `degrees` the text is in decimal degrees.
    """
    frame = Frame.parse(frame) if isinstance(frame, str) else frame
    lon_name, lat_name = names(frame)
    try:
        lon, lat = spherical(frames.from_icrs(np.asarray(direction, dtype=np.float64), frame, moment, site))
    except ColureError as fault:
        nan, dash = float("nan"), angles.UNKNOWN
        return Row(str(frame), frame.label(), lon_name, lat_name, nan, nan, dash, dash, str(fault))
    lon_deg, lat_deg = float(lon) / DEG, float(lat) / DEG
    lon_text, lat_text = texts(lon_deg, lat_deg, frame, sigma_arcsec, degrees=degrees)
    return Row(str(frame), frame.label(), lon_name, lat_name, lon_deg, lat_deg, lon_text, lat_text)


def texts(
    lon_deg: float, lat_deg: float, frame: Frame, sigma_arcsec: float, *, degrees: bool = False
) -> tuple[str, str]:
    """Return a longitude and a latitude in degrees as text, with the figures that the uncertainty supports.

    Near a pole a longitude is worth less: its figures follow the uncertainty over the cosine of the latitude.
    """
    across = sigma_arcsec / max(float(np.cos(lat_deg * DEG)), 1e-6)
    if degrees:
        per_degree = ARCSEC / DEG
        lon_places = min(max(angles.decimals_for(across * per_degree), 0), 9)
        lat_places = min(max(angles.decimals_for(sigma_arcsec * per_degree), 0), 9)
        return angles.format_degrees(lon_deg, lon_places), angles.format_degrees(lat_deg, lat_places, plus=True)
    lon_text, _ = angles.format_position(lon_deg, 0.0, equatorial=frame.is_equatorial, sigma_arcsec=across).split(" ")
    smallest, places = angles.dms_places(sigma_arcsec)
    return lon_text, angles.format_dms(lat_deg, places, smallest=smallest)


def table(
    direction: Float,
    moment: Moment,
    *,
    site: Ground | None = None,
    sigma_arcsec: float = 1.0,
    degrees: bool = False,
    also: tuple[str, ...] = (),
) -> tuple[Row, ...]:
    """Return the rows of every frame of FRAMES, then of those in `also` that are not among them.

    The direction is turned, not reduced: aberration and refraction stay what they were in it.
    """
    wanted = dict.fromkeys((*FRAMES, *(str(Frame.parse(name)) for name in also)))
    return tuple(row(direction, name, moment, site=site, sigma_arcsec=sigma_arcsec, degrees=degrees) for name in wanted)


def as_text(rows: tuple[Row, ...], heading: str = "") -> str:
    """Return rows as lines of tab-separated text (frame, longitude, latitude, fault), for the clipboard."""
    lines = [heading] if heading else []
    lines += [
        "\t".join(part for part in (one.frame, f"{one.lon_name} {one.lon_text}", f"{one.lat_name} {one.lat_text}",
                                    one.fault) if part)
        for one in rows
    ]  # fmt: skip
    return "\n".join(lines)


@dataclass(frozen=True, slots=True)
class Difference:
    """How far the numbers of a frame lead astray where they are read in another, arcseconds.

    The numbers of `frame`, read as if they were in the chosen frame, name a direction that is off by `size_arcsec`
    towards `pa_deg` (from the chosen frame's north through growing longitude). The differences of the numbers are
    given in the chosen frame (`dlon_arcsec`, times cos lat, and `dlat_arcsec`), and for the two directions on the mean
    ecliptic and on the equator of J2000 (Δλ cos β, Δβ; Δα cos δ, Δδ); and the shift along the great circle of a body's
    motion and across it, to the left on the sky with east at left. NaN where the frame has no answer (`fault`) or
    nothing moves.
    """

    frame: str
    label: str
    dlon_arcsec: float
    dlat_arcsec: float
    dlam_arcsec: float
    dbeta_arcsec: float
    dra_arcsec: float
    ddec_arcsec: float
    along_arcsec: float
    across_arcsec: float
    size_arcsec: float
    pa_deg: float
    fault: str = ""


ECLIPTIC_J2000, EQUATOR_J2000 = "ecliptic/mean/J2000", "equator/mean/J2000"


def differences(
    direction: Float,
    moment: Moment,
    chosen: Frame | str,
    *,
    site: Ground | None = None,
    motion: Float | None = None,
    among: tuple[str, ...] = FRAMES,
    also: tuple[str, ...] = (),
) -> tuple[Difference, ...]:
    """Return, for a direction (3,) on ICRS axes, the difference of every frame's numbers from those of a chosen one.

    `motion` (3,) is where a body goes on the sky, on ICRS axes, of any length. Raises what the chosen frame raises.
    """
    here = np.asarray(direction, dtype=np.float64)
    chosen = frames.parsed(chosen)
    right = frames.from_icrs(here, chosen, moment, site)
    wanted = tuple(dict.fromkeys((*among, *(str(Frame.parse(name)) for name in also))))
    found: list[Difference] = []
    for name in wanted:
        frame = Frame.parse(name)
        try:
            read = frames.from_icrs(here, frame, moment, site)
        except ColureError as fault:
            nan = float("nan")
            found.append(Difference(name, frame.label(), nan, nan, nan, nan, nan, nan, nan, nan, nan, nan, str(fault)))
            continue
        there = frames.to_icrs(read, chosen, moment, site)
        size = float(separation(here, there)) / ARCSEC
        angle = float(position_angle(right, read)) / DEG if size > 1e-9 else float("nan")
        parts = (
            *_apart(right, read),
            *_in_frame(here, there, ECLIPTIC_J2000),
            *_in_frame(here, there, EQUATOR_J2000),
            *_along(here, _shift(here, there), motion),
        )
        dlon, dlat, dlam, dbeta, dra, ddec, along, across = (part / ARCSEC for part in parts)
        found.append(Difference(name, frame.label(), dlon, dlat, dlam, dbeta, dra, ddec, along, across, size, angle))
    return tuple(found)


def _shift(here: Float, there: Float) -> Float:
    """Return the tangent vector (3,) at `here` whose length is the angle to `there`, rad."""
    flat = there - dot(here, there) * here
    length = float(np.sqrt(flat @ flat))
    return np.asarray(flat * (float(separation(here, there)) / length)) if length > 0.0 else np.zeros(3)


def _apart(right: Float, read: Float) -> tuple[float, float]:
    """Return the difference of longitudes, times the cosine of the right latitude, and that of latitudes."""
    (lon, lat), (other, high) = spherical(right), spherical(read)
    turn = float(other - lon)
    return float(np.arctan2(np.sin(turn), np.cos(turn)) * np.cos(lat)), float(high - lat)


def _in_frame(here: Float, there: Float, name: str) -> tuple[float, float]:
    matrix = frames.rotation(name).matrix
    return _apart(matrix @ here, matrix @ there)


def _along(here: Float, shift: Float, motion: Float | None) -> tuple[float, float]:
    if motion is None:
        return float("nan"), float("nan")
    ahead = np.asarray(motion, dtype=np.float64)
    ahead = ahead - dot(here, ahead) * here
    length = float(np.sqrt(ahead @ ahead))
    if not length > 0.0:
        return float("nan"), float("nan")
    ahead = ahead / length
    return float(shift @ ahead), float(shift @ np.cross(ahead, here))


NORTHS = ("equator/mean/J2000", "equator/mean/date", "equator/true/date", "ecliptic/mean/date", "galactic", "horizon")
"""The poles from which position angles are counted in practice; that of the horizon is the zenith."""


@dataclass(frozen=True, slots=True)
class North:
    """The bearing of one frame's pole: `turn_deg` its position angle from the north of J2000 through east.

    `pa_deg` is the angle that was asked for, counted from this pole; NaN where the frame has no answer (`fault`).
    """

    frame: str
    label: str
    turn_deg: float
    pa_deg: float
    fault: str = ""


def norths(
    direction: Float,
    moment: Moment,
    *,
    pa_deg: float = 0.0,
    source: Frame | str = "equator/mean/J2000",
    site: Ground | None = None,
    among: tuple[str, ...] = NORTHS,
) -> tuple[North, ...]:
    """Return a position angle at a direction (3,), counted from the source's north, as counted from every other.

    All angles run from north through celestial east, as on the sky, whatever way a frame's longitudes run: from the
    zenith the bearing of celestial north is minus the parallactic angle. Raises FrameError at a pole of the source.
    """
    if not np.isfinite(pa_deg):
        raise FrameError(f"position angle {pa_deg:g}: expected finite degrees")
    here = np.asarray(direction, dtype=np.float64)
    base = _bearing(here, EQUATOR_J2000, moment, site)
    start = _bearing(here, source, moment, site)
    rows = []
    for name in among:
        frame = Frame.parse(name)
        try:
            pole = _bearing(here, frame, moment, site)
        except ColureError as fault:
            rows.append(North(name, frame.label(), float("nan"), float("nan"), str(fault)))
            continue
        turn, angle = (pole - base) / DEG % 360.0, (pa_deg + (start - pole) / DEG) % 360.0
        rows.append(North(name, frame.label(), turn, angle))
    return tuple(rows)


def carry_angle(
    pa_deg: float,
    source: Frame | str,
    target: Frame | str,
    direction: Float,
    moment: Moment,
    site: Ground | None = None,
) -> float:
    """Return a position angle at a direction (3, ICRS axes) counted from another frame's north, degrees 0 to 360."""
    name = str(frames.parsed(target))
    (row,) = norths(direction, moment, pa_deg=pa_deg, source=source, site=site, among=(name,))
    if row.fault:
        raise FrameError(row.fault)
    return row.pa_deg


def _bearing(here: Float, frame: Frame | str, moment: Moment, site: Ground | None) -> float:
    """Return the angle (rad) of a frame's pole at a direction (3,), through east, from a north of its own."""
    frame = frames.parsed(frame)
    pole = frames.to_icrs(cartesian(0.0, np.pi / 2.0), frame, moment, site)
    if not 1e-9 < float(separation(here, pole)) < np.pi - 1e-9:
        raise FrameError(f"frame '{frame}': the direction is its pole, from which no angle can be counted")
    if abs(float(here[2])) > 0.9:  # count from another axis near the pole; the order of axes keeps the sense
        here, pole = np.roll(here, 1), np.roll(pole, 1)
    return float(position_angle(here, pole))

"""One direction in every frame that an observer is likely to be handed: a table of longitudes and latitudes as text."""

from dataclasses import dataclass

import numpy as np

from colure import angles, frames
from colure.arrays import ARCSEC, DEG, Float, spherical
from colure.errors import ColureError
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

import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify

from colure import frames, horizon, sidereal
from colure.arrays import ARCSEC, DEG, Float, cartesian, spherical
from colure.moment import Moment
from colure.reduction import Observer, reduce_stars, space_velocity

MAS = ARCSEC / 1000.0
UNRUN: dict[str, str] = {}


def star(row: Row) -> tuple[Float, Float, Float]:
    """Return position, velocity and parallax, arrays of one star, on the axes in which the row gives them."""
    given = {key: float(row.inputs.get(key, 0.0)) for key in ("pm_ra", "pm_dec", "plx", "rv")}
    if "ra_rad" in row.inputs:
        ra, dec = row.number("ra_rad"), row.number("dec_rad")
        pm = row.number("pm_ra_rad") * np.cos(dec), row.number("pm_dec_rad")
        plx = row.number("plx_arcsec") * ARCSEC
    else:
        ra, dec = row.number("ra_deg") * DEG, row.number("dec_deg") * DEG
        # Older catalogues print the motion in right ascension itself.
        shrink = np.cos(dec) if row.inputs.get("pm") == "dra/dt" else 1.0
        pm = given["pm_ra"] * MAS * shrink, given["pm_dec"] * MAS
        plx = given["plx"] * MAS
    one = [np.array([value]) for value in (ra, dec, *pm, plx, given["rv"])]
    position, velocity = space_velocity(*one)
    return position, velocity, one[4]


def turned(row: Row, vectors: Float, frame: str, when: Moment) -> tuple[float, float]:
    where = sky_rows.site(row) if frame == "horizon" else None
    lon, lat = spherical(frames.from_icrs(vectors, frame, when, where))
    return float(lon[0]), float(lat[0])


def moved_ra_dec(row: Row, place: str, frame: str, who: Observer) -> tuple[float, float]:
    when = sky_rows.moment(row.inputs["at"])
    position, velocity, parallax = star(row)
    seen = reduce_stars(position, velocity, parallax, when, observer=who, place=place)
    return turned(row, np.asarray(seen), frame, when)


def compute(row: Row) -> float:
    what, when = row.inputs["what"], sky_rows.moment(row.inputs["at"])
    geocentre = Observer("earth")
    second = what.endswith(("dec", "lat"))
    if what in ("aberration_ra", "nutation_ra", "nutation_dec", "aberrated_lon", "aberrated_lat"):
        ecliptic = what.startswith("aberrated")
        mean = "ecliptic/mean/date" if ecliptic else "equator/mean/date"
        lon, lat = ("lon_deg", "lat_deg") if ecliptic else ("ra_deg", "dec_deg")
        start = row.number(lon) * DEG, row.number(lat) * DEG
        icrs = frames.to_icrs(cartesian(*start)[None], mean, when)
        if what.startswith("nutation"):
            end = turned(row, icrs, "equator/true/date", when)
            return (end[second] - start[second]) / ARCSEC
        seen = reduce_stars(icrs, None, None, when, place="apparent")
        end = turned(row, np.asarray(seen), mean, when)
        return end[second] / DEG if ecliptic else (end[0] - start[0]) / ARCSEC
    if what.endswith("_rad"):
        # Place and motion are given on the mean axes of J1999: turn both to ICRS.
        position, velocity, parallax = star(row)
        axes = f"equator/mean/{row.inputs['equinox']}@iau1976"
        icrs = [frames.to_icrs(vectors, axes) for vectors in (position, velocity)]
        epoch = 2451545.0 - 365.25
        seen = reduce_stars(*icrs, parallax, when, place="apparent", epoch_jd=epoch)
        return turned(row, np.asarray(seen), "equator/true/date", when)["dec" in what]
    site = sky_rows.observer(row)
    if row.id.startswith(("sofa_ast_topo", "sofa_ast_observed")):
        return by_the_horizon(row, "apparent" if "topo" in what else "observed", site)[second] / DEG
    place, frame, who = {
        "apparent": ("apparent", "equator/true/date", geocentre),
        "astrometric": ("astrometric", "icrs", geocentre),
        "cirs": ("apparent", "cirs", geocentre),
        "topo": ("apparent", "equator/true/date", site),
    }[what.rsplit("_", 1)[0]]
    value = moved_ra_dec(row, place, frame, who)[second] / DEG
    return value / 15.0 if row.unit == "h" else value


def by_the_horizon(row: Row, place: str, who: Observer) -> tuple[float, float]:
    """Return right ascension from the CIO and declination by way of azimuth and altitude, as SOFA defines them.

    Hour angle and declination then count from the Earth-fixed pole, which polar motion keeps off the celestial one.
    """
    when, where = sky_rows.moment(row.inputs["at"]), who.site
    assert where is not None
    az, alt = moved_ra_dec(row, place, "horizon", who)
    ha, dec = horizon.hadec(az, alt, where.lat_deg * DEG)
    # The origin of longitudes has moved by s′, 0.6 µas a year since 2000.
    ra = float(sidereal.era(when) + where.lon_deg * DEG - ha) % (2.0 * np.pi)
    return ra, float(dec)


@pytest.mark.parametrize("row", runnable("aberration_apparent_place", UNRUN), ids=lambda row: row.id)
def test_aberration_apparent_place(row: Row) -> None:
    verify(row, compute)

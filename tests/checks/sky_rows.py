"""Rows about places of bodies: reads a row's inputs and asks the public functions for the one figure it names.

All rows are run with the embedded ephemeris: what a user has is what is held to the published digits.
"""

from functools import cache

import numpy as np
from harness import Row

from colure import bodies, frames, horizon, nutation, obliquity, phases, sidereal
from colure.arrays import ARCSEC, DEG, cartesian, spherical
from colure.ephemeris import KM_PER_AU
from colure.moment import Moment
from colure.reduction import Directions, Observer, reduce_bodies
from colure.refraction import Atmosphere, apparent_altitude
from colure.sites import Site

EARTH_RADIUS_KM = 6378.1366
ECLIPTIC, MEAN_ECLIPTIC, EQUATOR = "ecliptic/true/date", "ecliptic/mean/date", "equator/true/date"


@cache
def moment(text: str) -> Moment:
    return Moment.parse(text)


def site(row: Row) -> Site | None:
    if "site" not in row.inputs:
        return None
    lon, lat, height = (float(part) for part in row.inputs["site"].split())
    return Site("row", (lon + 180.0) % 360.0 - 180.0, lat, height)


def air(row: Row) -> Atmosphere:
    given = row.inputs
    return Atmosphere(
        float(given.get("pressure", 1010.0)),
        float(given.get("temperature", 10.0)),
        float(given.get("humidity", 0.5)),
        float(given.get("wavelength", 0.55)),
    )


def observer(row: Row) -> Observer:
    where = site(row)
    if where is not None:
        return Observer("site", where, row.inputs.get("polar_motion") != "off", air(row))
    return Observer(row.inputs.get("origin", "earth"))


def seen(row: Row, place: str) -> Directions:
    return reduce_bodies((row.inputs["body"],), moment(row.inputs["at"]), observer=observer(row), place=place)


def angles(row: Row, place: str, frame: str, at: Observer | None = None) -> tuple[float, float]:
    """Return longitude and latitude in degrees."""
    when = moment(row.inputs["at"])
    who = observer(row) if at is None else at
    found = reduce_bodies((row.inputs["body"],), when, observer=who, place=place)
    lon, lat = spherical(frames.from_icrs(found.vectors[0], frames.Frame.parse(frame), when, who.site))
    return float(lon) / DEG, float(lat) / DEG


def parallax_deg(distance_au: float) -> float:
    return float(phases.horizontal_parallax(EARTH_RADIUS_KM / KM_PER_AU, distance_au)) / DEG


def compute(row: Row) -> float:
    """Return the figure that the row's `what` names."""
    what = row.inputs["what"]
    geocentre = Observer("earth")
    match what:
        case "parallax_of_distance":
            return parallax_deg(row.number("distance_au")) * 3600.0
        case "mean_node":
            return float(bodies.moon_mean_node(moment(row.inputs["at"]))) / DEG
        case "diurnal_path":
            return (
                float(horizon.diurnal_path_to_horizon(row.number("dec_deg") * DEG, row.number("lat_deg") * DEG)) / DEG
            )
        case "rho_sin" | "rho_cos":
            where = site(row)
            assert where is not None
            vector = horizon.geocentric_site(where.lat_deg * DEG, where.height_m, 0.0)
            return float(vector[2] if what == "rho_sin" else vector[0]) * KM_PER_AU / 6378.137
        case "topocentric_ra" | "topocentric_dec" | "shift_ra_s" | "shift_dec_arcsec":
            return shifted(row, what)
        case "gast_h":
            return float(sidereal.gast(moment(row.inputs["at"]))) * 12.0 / np.pi
        case "apparent_ra" | "apparent_dec" | "apparent_ra_h":
            pair = angles(row, "apparent", EQUATOR)
            return pair[1] if what.endswith("dec") else pair[0] / (15.0 if what.endswith("_h") else 1.0)
        case "apparent_lon" | "apparent_lat":
            return angles(row, "apparent", ECLIPTIC)[what.endswith("lat")]
        case "apparent_lon_mean_equinox":
            return angles(row, "apparent", MEAN_ECLIPTIC)[0]
        case "mean_lon" | "mean_lat_arcsec":
            lon, lat = angles(row, "geometric", MEAN_ECLIPTIC)
            return lon if what == "mean_lon" else lat * 3600.0
        case "astrometric_ra" | "astrometric_dec":
            return angles(row, "astrometric", "icrs")[what.endswith("dec")]
        case "astrometric_lon" | "astrometric_lat":
            return angles(row, "astrometric", row.inputs["frame"])[what.endswith("lat")]
        case "geometric_lon" | "geometric_lat" | "geometric_lon_rad" | "geometric_lat_rad":
            value = angles(row, "geometric", row.inputs["frame"])["lat" in what]
            return value * DEG if what.endswith("rad") else value
        case "geometric_distance" | "geometric_distance_km":
            return float(seen(row, "geometric").distance_au[0]) * (KM_PER_AU if what.endswith("km") else 1.0)
        case "astrometric_distance":
            return float(seen(row, "astrometric").distance_au[0])
        case "light_time_min":
            return float(seen(row, "astrometric").light_time_s[0]) / 60.0
        case "geometric_x" | "geometric_y" | "geometric_z":
            when = moment(row.inputs["at"])
            found = seen(row, "geometric")
            local = frames.from_icrs(found.vectors[0], frames.Frame.parse(row.inputs["frame"]), when)
            return float((local * found.distance_au[0])["xyz".index(what[-1])])
        case "true_obliquity":
            return float(obliquity.true(moment(row.inputs["at"]))) / DEG
        case "nutation_obliquity_arcsec" | "nutation_obliquity" | "nutation_longitude":
            dpsi, deps = nutation.nutation(moment(row.inputs["at"]))
            value = float(deps if "obliquity" in what else dpsi)
            return value / (ARCSEC if what.endswith("arcsec") else DEG)
        case "semidiameter_arcsec":
            return float(facts(row)["diameter_arcsec"][0]) / 2.0
        case "parallax_deg":
            return parallax_deg(float(seen(row, "geometric").distance_au[0]))
        case "azimuth" | "altitude":
            key = "azimuth_deg" if what == "azimuth" else "altitude_deg"
            return float(facts(row, frame=EQUATOR, site=site(row))[key][0])
        case "observed_altitude" if "model" not in row.inputs:
            when, who = moment(row.inputs["at"]), observer(row)
            found = reduce_bodies((row.inputs["body"],), when, observer=who, place="observed")
            assert who.site is not None
            return float(bodies.horizontal(found.vectors, found.observer, who.site)[1][0]) / DEG
        case "observed_altitude":  # by a named formula
            airless = float(facts(row, frame=EQUATOR, site=site(row))["altitude_deg"][0]) * DEG
            return float(apparent_altitude(airless, air(row), row.inputs["model"])) / DEG
        case "jd_ut1":
            jd1, jd2 = moment(row.inputs["at"]).ut1
            return float(jd1) + float(jd2)
        case "earth_lon" | "earth_lat":
            lon, lat = angles(row, "geometric", MEAN_ECLIPTIC, geocentre)
            return (lon + 180.0) % 360.0 if what == "earth_lon" else -lat
        case "geo_lon":
            return angles(row, "apparent", ECLIPTIC, geocentre)[0]
        case "geo_dec":
            return angles(row, "apparent", EQUATOR, geocentre)[1]
        case "geo_hour_angle" | "hour_angle":
            ra, _ = angles(row, "apparent", EQUATOR, geocentre if what.startswith("geo") else None)
            where = site(row)
            assert where is not None
            return (float(sidereal.gast(moment(row.inputs["at"]))) / DEG + where.lon_deg - ra) % 360.0
        case "equation_of_time_min":
            return float(bodies.equation_of_time(moment(row.inputs["at"]))) / 60.0
        case "heliocentric" | "distance" | "phase_angle" | "magnitude" | "illuminated" | "illuminated_percent":
            key = {
                "heliocentric": "heliocentric_au",
                "distance": "distance_au",
                "phase_angle": "phase_angle_deg",
                "magnitude": "magnitude",
                "illuminated": "illuminated",
                "illuminated_percent": "illuminated",
            }[what]
            return float(facts(row)[key][0]) * (100.0 if what.endswith("percent") else 1.0)
        case "moon_phase":
            lon, _ = bodies.longitudes(("moon", "sun"), moment(row.inputs["at"]))
            return float(phases.moon_phase(lon[0], lon[1])) / DEG
    raise AssertionError(f"{row.id}: no way to compute '{what}'")


def shifted(row: Row, what: str) -> float:
    """Return a given geocentric place of date moved to a site, or by how much it moves."""
    where = site(row)
    assert where is not None
    when = moment(row.inputs["at"])
    ra, dec = row.number("ra_deg"), row.number("dec_deg")
    place = row.number("dist_au") * cartesian(ra * DEG, dec * DEG)
    seen_from = horizon.geocentric_site(where.lat_deg * DEG, where.height_m, sidereal.local(when, where))
    lon, lat = (float(angle) / DEG for angle in spherical(place - seen_from))
    match what:
        case "shift_ra_s":
            return (lon - ra) * 240.0
        case "shift_dec_arcsec":
            return (lat - dec) * 3600.0
    return lat if what.endswith("dec") else lon


def facts(row: Row, frame: str = "icrs", site: Site | None = None) -> dict[str, np.ndarray]:
    return bodies.facts(
        (row.inputs["body"],),
        moment(row.inputs["at"]),
        site=site,
        frame=frame,
        place="apparent" if site is not None else None,
        polar_motion=row.inputs.get("polar_motion") != "off",
    )

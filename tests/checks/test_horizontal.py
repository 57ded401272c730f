from collections.abc import Callable

import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify

from colure import bodies, frames, horizon, sidereal
from colure.arrays import DEG, cartesian, spherical
from colure.moment import Moment
from colure.reduction import Observer, observer_state, reduce_bodies, unreduce
from colure.refraction import true_altitude

UNRUN: dict[str, str] = {}


def root(function: Callable[[float], float], low: float, high: float) -> float:
    """Return where a function of days changes sign between two days."""
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if function(low) * function(middle) > 0 else (low, middle)
    return 0.5 * (low + high)


def hour_angle_dec(row: Row, days: float) -> tuple[float, float, float]:
    """Return geocentric hour angle, declination and latitude in rad, `days` after the row's moment."""
    when = sky_rows.moment(row.inputs["at"]).shifted(days)
    where = sky_rows.site(row)
    assert where is not None
    seen = reduce_bodies((row.inputs["body"],), when, place="apparent")
    ra, dec = spherical(frames.from_icrs(seen.vectors[0], "equator/true/date", when))
    return float(sidereal.local(when, where) - ra), float(dec), where.lat_deg * DEG


def day_fraction(row: Row, function: Callable[[float], float]) -> float:
    start = sky_rows.moment(row.inputs["at"])
    found: Moment = start.shifted(root(function, -0.1, 0.1))
    jd1, jd2 = found.ut1
    return (float(jd1) + float(jd2) + 0.5) % 1.0


def compute(row: Row) -> float:
    what, given = row.inputs["what"], row.inputs
    number = {key: float(value) * DEG for key, value in given.items() if key.endswith("_deg")}
    match what:
        case "azimuth" | "altitude":
            hour_angle = sidereal.gast(sky_rows.moment(given["at"])) + number["lon_deg"] - number["ra_deg"]
            az, alt = horizon.altaz(hour_angle, number["dec_deg"], number["lat_deg"])
            return float(az if what == "azimuth" else alt) / DEG
        case "ha" | "dec":
            ha, dec = horizon.hadec(number["az_deg"], number["alt_deg"], number["lat_deg"])
            return float(ha if what == "ha" else dec) / DEG
        case "az_of_ha":
            return float(horizon.altaz(number["ha_deg"], number["dec_deg"], number["lat_deg"])[0]) / DEG
        case "hour_angle_mean":
            mean = sidereal.gmst(sky_rows.moment(given["at"]))
            return float((mean + number["lon_deg"] - number["ra_deg"]) / DEG) % 360.0
        case "body_altitude" | "body_azimuth":
            key = "altitude_deg" if what.endswith("altitude") else "azimuth_deg"
            return float(sky_rows.facts(row, "equator/true/date", sky_rows.site(row))[key][0])
        case "unreduced_ra" | "unreduced_dec":
            return unreduced(row, number["az_deg"], number["alt_deg"])[what.endswith("dec")]
        case "ecliptic_on_horizon":
            west = horizon.ecliptic_on_horizon(number["obliquity_deg"], number["lat_deg"], number["lst_deg"])
            return (float(west) / DEG + 180.0) % 360.0  # the row asks for the eastern point
        case "ecliptic_to_horizon":
            return (
                float(horizon.ecliptic_to_horizon(number["obliquity_deg"], number["lat_deg"], number["lst_deg"])) / DEG
            )
        case "diurnal_path":
            return float(horizon.diurnal_path_to_horizon(number["dec_deg"], number["lat_deg"])) / DEG
        case "rad_az" | "rad_alt" | "rad_zd" | "rad_pa":
            local = row.number("ha_rad"), row.number("dec_rad"), row.number("lat_rad")
            az, alt = horizon.altaz(*local)
            return float(
                {
                    "rad_az": az,
                    "rad_alt": alt,
                    "rad_zd": np.pi / 2 - alt,
                    "rad_pa": horizon.parallactic_angle(*local),
                }[what]
            )
        case "airmass_hardie":
            return float(horizon.airmass(np.pi / 2 - row.number("zd_rad"), "hardie"))
        case "rise_fraction":

            def height(days: float) -> float:
                return float(horizon.altaz(*hour_angle_dec(row, days))[1]) - number["h0_deg"]

            return day_fraction(row, height)
        case "transit_fraction":
            return day_fraction(row, lambda days: float(np.sin(hour_angle_dec(row, days)[0])))
    raise AssertionError(f"{row.id}: no way to compute '{what}'")


def unreduced(row: Row, az: float, alt: float) -> tuple[float, float]:
    """Return the ICRS right ascension and declination in degrees of a star seen at an azimuth and altitude."""
    when, where, air = sky_rows.moment(row.inputs["at"]), sky_rows.site(row), sky_rows.air(row)
    assert where is not None
    who = Observer("site", where, air=air)
    seen = frames.to_icrs(cartesian(az, float(true_altitude(alt, air)))[None], "horizon", when, where)
    lon, lat = spherical(unreduce(seen, when, observer=who, place="apparent"))
    return float(lon[0]) / DEG, float(lat[0]) / DEG


@pytest.mark.parametrize("row", runnable("horizontal", UNRUN), ids=lambda row: row.id)
def test_horizontal(row: Row) -> None:
    verify(row, compute)


def test_the_horizon_frame_and_the_observer_agree() -> None:
    # Two ways to an altitude: the frame's rotation and the observer's own matrix must be one.
    row = next(row for row in runnable("horizontal", UNRUN) if row.inputs["what"] == "body_altitude")
    when, where = sky_rows.moment(row.inputs["at"]), sky_rows.site(row)
    assert where is not None
    who = Observer("site", where)
    seen = reduce_bodies(("mars", "moon"), when, observer=who, place="apparent")
    az, alt = bodies.horizontal(seen.vectors, observer_state(who, when), where)
    lon, lat = spherical(frames.from_icrs(seen.vectors, "horizon", when, where))
    assert np.allclose(az, lon, rtol=0, atol=1e-12)
    assert np.allclose(alt, lat, rtol=0, atol=1e-12)

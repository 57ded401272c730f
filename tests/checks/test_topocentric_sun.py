import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify

from colure import horizon, phases
from colure.arrays import DEG, cartesian, norm, rotation_x, spherical
from colure.ephemeris import KM_PER_AU

UNRUN: dict[str, str] = {}
EQUATORIAL_RADIUS_AU = 6378.137 / KM_PER_AU


def compute(row: Row) -> float:
    what = row.inputs["what"]
    if not what.startswith("ecliptic_topocentric"):
        return sky_rows.compute(row)
    number = {key: float(value) * DEG for key, value in row.inputs.items() if key.endswith("_deg")}
    # The Moon's place, size and parallax are given: put it at its distance, and look from the site.
    distance = EQUATORIAL_RADIUS_AU / np.sin(number["parallax_deg"])
    radius = distance * np.sin(number["semidiameter_deg"])
    site = horizon.geocentric_site(number["site_lat_deg"], row.number("height_m"), number["lst_deg"])
    seen = distance * cartesian(number["lon_deg"], number["lat_deg"]) - rotation_x(number["obliquity_deg"]) @ site
    if what.endswith("semidiameter"):
        return float(phases.semidiameter(radius, norm(seen))) / DEG
    return float(spherical(seen)[what.endswith("lat")]) / DEG


@pytest.mark.parametrize("row", runnable("topocentric_sun", UNRUN), ids=lambda row: row.id)
def test_topocentric_sun(row: Row) -> None:
    verify(row, compute)

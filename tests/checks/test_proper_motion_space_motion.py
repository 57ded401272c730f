import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify
from test_aberration_apparent_place import star

from colure import frames
from colure.arrays import ARCSEC, DEG, spherical
from colure.reduction import reduce_stars, space_motion

UNRUN: dict[str, str] = {}
LIGHT_YEAR_AU = 63241.077


def compute(row: Row) -> object:
    what = row.inputs["what"]
    position, velocity, parallax = star(row)
    second = what.endswith("dec")
    if what.startswith("moved"):
        moved = space_motion(position, velocity, row.number("years"))
        return float(spherical(moved)[second][0]) / DEG
    if what.startswith("astrometric"):
        when = sky_rows.moment(row.inputs["at"])
        seen = reduce_stars(
            position,
            velocity,
            parallax,
            when,
            place="astrometric",
            epoch_jd=row.number("epoch_jd"),
        )
        value = float(spherical(np.asarray(seen))[second][0]) / DEG
        return value / 15.0 if what.endswith("_h") else value
    if what == "position_au":
        return (position / parallax[:, None])[0]
    if what == "pm_ecliptic_lat":
        axes = "ecliptic/mean/J2000"
        p, v = (frames.from_icrs(vectors, axes)[0] for vectors in (position, velocity))
        _, lat = spherical(p)
        return float(v[2] / np.cos(lat)) / ARCSEC
    # Nearest approach of a straight line.
    years = -float((position * velocity).sum() / (velocity * velocity).sum())
    match what:
        case "nearest_years":
            return years
        case "nearest_years_ad":
            return 2016.0 + years
        case "nearest_ly":
            return float(np.linalg.norm(position + years * velocity) / parallax[0]) / LIGHT_YEAR_AU
    raise AssertionError(f"{row.id}: no way to compute '{what}'")


@pytest.mark.parametrize("row", runnable("proper_motion_space_motion", UNRUN), ids=lambda row: row.id)
def test_proper_motion_space_motion(row: Row) -> None:
    verify(row, compute)

import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify

from colure import phases
from colure.arrays import DEG, cartesian, separation

UNRUN: dict[str, str] = {}


def compute(row: Row) -> float:
    what = row.inputs["what"]
    match what:
        case "phase_from_distances" | "illuminated_from_distances":
            phase = phases.phase_angle_from_distances(row.number("r_au"), row.number("delta_au"), row.number("R_au"))
            return float(phase) / DEG if what.startswith("phase") else float(phases.illuminated(phase))
        case "cos_phase_helio":
            planet = row.number("r") * cartesian(row.number("L") * DEG, row.number("B") * DEG)
            earth = row.number("R") * cartesian(row.number("L0") * DEG, 0.0)
            return float(np.cos(phases.phase_angle(planet, planet - earth)))
        case "cos_phase_rect":
            planet = cartesian(row.number("L") * DEG, row.number("B") * DEG)
            sight = np.array([row.number(axis) for axis in "xyz"])
            return float(np.cos(phases.phase_angle(planet, sight)))
        case "illuminated_from_elongation" | "bright_limb":
            moon = cartesian(row.number("moon_ra") * DEG, row.number("moon_dec") * DEG)
            sun = cartesian(row.number("sun_ra") * DEG, row.number("sun_dec") * DEG)
            if what == "bright_limb":
                return float(phases.bright_limb(moon, sun)) / DEG
            return float(phases.illuminated(np.pi - separation(moon, sun)))
    return sky_rows.compute(row)


@pytest.mark.parametrize("row", runnable("phase_geometry", UNRUN), ids=lambda row: row.id)
def test_phase_geometry(row: Row) -> None:
    verify(row, compute)

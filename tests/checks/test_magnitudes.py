import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify

from colure import minorphotometry, photometry

UNRUN = {
    "hg-chiron-hor": "its distance from the Sun is not printed and would come from orbital elements",
    "41c-venus-muller": "a formula of the 19th century that the 2018 paper replaced",
    "41d-saturn-muller": "a formula of the 19th century that the 2018 paper replaced; sources disagree on its example",
}


def planet(row: Row) -> float | str:
    given = {key: float(value) for key, value in row.inputs.items() if key not in ("what", "body", "rings")}
    r, delta, phase = given["r_au"], given["delta_au"], given["phase_deg"]
    match row.inputs["body"]:
        case "mars":
            value = photometry.mars(r, delta, phase, given["meridian_deg"], given["season_deg"])
        case "saturn" if row.inputs["rings"] == "False":
            value = photometry.saturn_globe(r, delta, phase)
        case "saturn":
            sun, observer = given["sub_sun_lat_planetocentric"], given["sub_obs_lat_planetocentric"]
            value = photometry.saturn(r, delta, phase, sun, observer)
        case "uranus":
            value = photometry.uranus(r, delta, phase, given["sub_sun_lat"], given["sub_obs_lat"])
        case "neptune":
            value = photometry.neptune(r, delta, phase, given["year"])
        case body:
            value = getattr(photometry, body)(r, delta, phase)
    return "no magnitude" if np.isnan(value) else float(value)


def compute(row: Row) -> float | str:
    given = row.inputs
    match given["what"]:
        case "mh":
            return planet(row)
        case "facts":
            return float(sky_rows.facts(row)["magnitude"][0])
        case "hg":
            return float(minorphotometry.hg_reduced(row.number("H"), row.number("G"), row.number("phase_deg")))
        case "hg_apparent":
            keys = ("H", "G", "r_au", "delta_au", "phase_deg")
            return float(minorphotometry.hg(*(row.number(key) for key in keys)))
        case "hg12":
            return float(minorphotometry.hg12_reduced(row.number("H"), row.number("G12"), row.number("phase_deg")))
        case "hg1g2":
            keys = ("H", "G1", "G2", "phase_deg")
            return float(minorphotometry.hg1g2_reduced(*(row.number(key) for key in keys)))
        case "moon_law":
            return float(photometry.moon_phase_law(row.number("phase_deg")))
        case "combined" | "ratio":
            m = np.array([float(part) for part in given["m"].split(",")])
            if given["what"] == "ratio":
                return float(minorphotometry.brightness_ratio(m[0], m[1]))
            counts = np.array([float(part) for part in given.get("counts", "1").split(",")])
            return minorphotometry.combined(m, counts)
    raise AssertionError(f"{row.id}: no way to compute '{given['what']}'")


@pytest.mark.parametrize("row", runnable("magnitudes", UNRUN), ids=lambda row: row.id)
def test_magnitudes(row: Row) -> None:
    verify(row, compute)

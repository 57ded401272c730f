import numpy as np
import pytest
import sky_rows
from harness import Row, runnable, verify

from colure import horizon, refraction, sidereal
from colure.arrays import ARCSEC, DEG

UNRUN: dict[str, str] = {}
ARCMIN = 60.0 * ARCSEC


def compute(row: Row) -> float:
    what, air = row.inputs["what"], sky_rows.air(row)
    model = row.inputs.get("model", "standard")
    if what.startswith("constant"):
        return refraction.constants(air)["ab".index(what[-1])]
    if what.startswith("refracted"):
        return lifted(row)[what.endswith("dec")]
    alt = row.number("alt_deg") * DEG
    units = {"arcmin": ARCMIN, "arcsec": ARCSEC, "deg": DEG, "rad": 1.0}
    unit = units[what.rsplit("_", 1)[1]]
    if what.startswith("saemundsson"):
        return float(refraction.saemundsson(alt, air)) / unit
    if what.startswith("apparent"):
        return float(refraction.apparent_altitude(alt, air, model)) / unit
    return float(refraction.of_apparent(alt, air, model)) / unit


def lifted(row: Row) -> tuple[float, float]:
    """Return right ascension and declination, degrees, of a direction of date after refraction."""
    number = {key: float(value) * DEG for key, value in row.inputs.items() if key.endswith("_deg")}
    when = sky_rows.moment(row.inputs["at"])
    local = sidereal.gmst(when) + number["lon_deg"]
    az, alt = horizon.altaz(local - number["ra_deg"], number["dec_deg"], number["lat_deg"])
    seen = refraction.apparent_altitude(alt, sky_rows.air(row), row.inputs["model"])
    ha, dec = horizon.hadec(az, seen, number["lat_deg"])
    return float((local - ha) / DEG) % 360.0, float(dec) / DEG


@pytest.mark.parametrize("row", runnable("refraction", UNRUN), ids=lambda row: row.id)
def test_refraction(row: Row) -> None:
    verify(row, compute)


@pytest.mark.parametrize("pressure", [1010.0, 700.0, 0.0])
@pytest.mark.parametrize("temperature", [-30.0, 10.0, 40.0])
def test_standard_model_is_one_to_one_and_inverts(pressure: float, temperature: float) -> None:
    air = refraction.Atmosphere(pressure, temperature)
    true = np.linspace(-90.0, 90.0, 36001) * DEG
    seen = refraction.apparent_altitude(true, air)
    assert np.all(np.diff(seen) > 0.0)
    assert np.abs(refraction.true_altitude(seen, air) - true).max() < 1e-10


def test_standard_model_is_continuous_where_its_parts_meet() -> None:
    for join in (refraction.JOIN_DEG, refraction.FADE_FROM_DEG, refraction.FADE_TO_DEG):
        below, above = refraction.of_apparent(np.array([join - 1e-7, join + 1e-7]) * DEG)
        assert abs(above - below) < 0.001 * ARCSEC


def test_standard_model_is_erfas_above_the_join() -> None:
    # ERFA's own pair of constants, A tan z + B tan³ z with the observed zenith distance.
    a, b = refraction.constants(refraction.STANDARD)
    alt = np.linspace(15.0, 90.0, 100) * DEG
    tan_z = np.tan(np.pi / 2 - alt)
    assert np.abs(refraction.of_apparent(alt) - (a + b * tan_z**2) * tan_z).max() < 1e-15

"""Atmospheric refraction: by how much the air lifts a direction, and its exact inverse.

The standard model is A tan z + B tan³ z of the observed zenith distance, with ERFA's constants for pressure,
temperature, humidity and wavelength, above 15° of apparent altitude. Below, where that series fails, Bennett's formula
(1982) takes over, scaled to meet it at 15°. Under the apparent horizon (−1°), where nobody observes, the lift fades
linearly to nothing at −5°, so that the map from true to apparent altitude is one-to-one everywhere. Bennett's and
Sæmundsson's formulas can be had unscaled by name.

Altitudes and refractions are radians, of any shape.
"""

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import erfa
import numpy as np

from colure.arrays import DEG, Float
from colure.errors import SiteError, near_names

HORIZON_REFRACTION = 34.0 / 60.0 * DEG
"""The almanacs' refraction at rising and setting, 34′."""

JOIN_DEG = 15.0
FADE_FROM_DEG, FADE_TO_DEG = -1.0, -5.0


@dataclass(frozen=True, slots=True)
class Atmosphere:
    """The air at a site: pressure in hPa at the site itself, temperature in °C, relative humidity 0 to 1, µm.

    A pressure of 0 means no air: no refraction.
    """

    pressure_hpa: float = 1010.0
    temperature_c: float = 10.0
    humidity: float = 0.5
    wavelength_um: float = 0.55

    def __post_init__(self) -> None:
        for name, value, low, high in (
            ("pressure", self.pressure_hpa, 0.0, 1200.0),
            ("temperature", self.temperature_c, -90.0, 60.0),
            ("humidity", self.humidity, 0.0, 1.0),
            ("wavelength", self.wavelength_um, 0.1, 1e6),
        ):
            if not low <= value <= high:
                raise SiteError(f"atmosphere: {name} {value!r} is outside {low:g} to {high:g}")


STANDARD = Atmosphere()


def constants(air: Atmosphere) -> tuple[float, float]:
    """Return ERFA's A and B in radians (refco), for A tan z + B tan³ z with the observed zenith distance z."""
    a, b = erfa.refco(air.pressure_hpa, air.temperature_c, air.humidity, air.wavelength_um)
    return float(a), float(b)


def _bennett_deg(alt_deg: Float) -> Float:
    """Bennett 1982 at 1010 hPa and 10 °C, degrees; claimed good to 0.07′ at every altitude above the horizon."""
    return np.asarray(1.0 / np.tan((alt_deg + 7.31 / (alt_deg + 4.4)) * DEG) / 60.0)


def _weather(air: Atmosphere) -> float:
    return air.pressure_hpa / 1010.0 * 283.0 / (273.0 + air.temperature_c)


def _bennett(alt_deg: Float, air: Atmosphere) -> Float:
    return _bennett_deg(alt_deg) * _weather(air)


def _bennett_corrected(alt_deg: Float, air: Atmosphere) -> Float:
    """Bennett's own second-order correction, Meeus ch. 16: R − 0.06″·60 sin(14.7 R + 13), good to 0.015′."""
    minutes = _bennett_deg(alt_deg) * 60.0
    return np.asarray((minutes - 0.06 * np.sin((14.7 * minutes + 13.0) * DEG)) / 60.0 * _weather(air))


def _supplement(alt_deg: Float, air: Atmosphere) -> Float:
    """Bennett as in the Explanatory Supplement and USNO code: 0.28 P / (T + 273), nothing outside −1° to 89.9°."""
    degrees = 0.016667 / np.tan((alt_deg + 7.31 / (alt_deg + 4.4)) * DEG)
    inside = (alt_deg >= -1.0 - 1e-9) & (alt_deg <= 89.9)
    return np.where(inside, degrees * (0.28 * air.pressure_hpa / (air.temperature_c + 273.0)), 0.0)


def _rational(alt_deg: Float, air: Atmosphere) -> Float:
    """The Explanatory Supplement's rational formula for low altitudes, used below 15° in hand computation."""
    top = 0.1594 + 0.0196 * alt_deg + 0.00002 * alt_deg**2
    bottom = (273.0 + air.temperature_c) * (1.0 + 0.505 * alt_deg + 0.0845 * alt_deg**2)
    return np.asarray(air.pressure_hpa * top / bottom)


def _standard(alt_deg: Float, air: Atmosphere) -> Float:
    a, b = constants(air)
    cot_join = 1.0 / np.tan(JOIN_DEG * DEG)
    scale = (a + b * cot_join**2) * cot_join / DEG / float(_bennett_deg(np.float64(JOIN_DEG)))  # type: ignore[arg-type]
    low = np.clip(alt_deg, FADE_FROM_DEG, JOIN_DEG)
    fade = np.clip((alt_deg - FADE_TO_DEG) / (FADE_FROM_DEG - FADE_TO_DEG), 0.0, 1.0)
    tan_z = np.tan((90.0 - np.maximum(alt_deg, JOIN_DEG)) * DEG)
    high = (a + b * tan_z**2) * tan_z / DEG
    return np.where(alt_deg >= JOIN_DEG, high, _bennett_deg(low) * scale * fade)


MODELS: dict[str, Callable[[Float, Atmosphere], Float]] = {
    "standard": _standard,
    "bennett": _bennett,
    "bennett-corrected": _bennett_corrected,
    "supplement": _supplement,
    "rational": _rational,
}
"""Refraction in degrees as a function of apparent altitude in degrees, by name."""


def _model(name: str) -> Callable[[Float, Atmosphere], Float]:
    try:
        return MODELS[name]
    except KeyError:
        raise SiteError(
            f"refraction: no model '{name}'{near_names(name, MODELS)}; known: {', '.join(MODELS)}"
        ) from None


def of_apparent(apparent: Float | float, air: Atmosphere = STANDARD, model: str = "standard") -> Float:
    """Return the refraction (...) at an apparent altitude: apparent minus true altitude, radians."""
    formula = _model(model)
    alt_deg = np.asarray(apparent, dtype=np.float64) / DEG
    if air.pressure_hpa == 0.0:
        return np.zeros_like(alt_deg)
    return np.asarray(formula(alt_deg, air) * DEG)


def saemundsson(true: Float | float, air: Atmosphere = STANDARD) -> Float:
    """Return Sæmundsson's refraction (1986) at a true altitude; consistent with Bennett to 0.1′."""
    alt_deg = np.asarray(true, dtype=np.float64) / DEG
    return np.asarray(1.02 / np.tan((alt_deg + 10.3 / (alt_deg + 5.11)) * DEG) / 60.0 * DEG * _weather(air))


@lru_cache(maxsize=16)
def _table(air: Atmosphere) -> tuple[Float, Float, Float]:
    """Return true altitudes and lifts (degrees) of the standard model, good to 0.001″ between, and slopes.

    Slope i, of apparent against true altitude, belongs to the interval that ends at node i; one more stands above.
    """
    low = np.linspace(FADE_TO_DEG, JOIN_DEG, 4001)
    apparent = np.concatenate([low, np.linspace(JOIN_DEG, 90.0, 3001)[1:]])
    lift = _standard(apparent, air)
    true = apparent - lift
    slopes = np.concatenate([[1.0], np.diff(apparent) / np.diff(true), [1.0]])
    return true, lift, slopes


def apparent_altitude(
    true: Float | float, air: Atmosphere = STANDARD, model: str = "standard", *, exact: bool = True
) -> Float:
    """Return the apparent altitude (...) of a true one, by inverting `of_apparent` to better than 1e-10 rad.

    `exact=False` takes the standard model from a table, to 0.001″, in a quarter of the time. `model` may also be
    "saemundsson", which is a formula of the true altitude and needs no inversion.
    """
    alt = np.asarray(true, dtype=np.float64)
    if model == "saemundsson":
        return np.asarray(alt + saemundsson(alt, air))
    formula = _model(model)
    if air.pressure_hpa == 0.0:
        return alt.copy()
    wanted = alt / DEG
    if model == "standard":
        nodes, lifts, slopes = _table(air)
        guess = wanted + np.interp(wanted, nodes, lifts)
        if exact:
            # One step of Newton's with the slope of the table's own interval: the kinks stand on its nodes.
            steep = slopes[np.searchsorted(nodes, wanted)]
            guess = guess - (guess - formula(guess, air) - wanted) * steep
        return np.asarray(guess * DEG)
    step = 1e-5
    guess = wanted + 0.4 * np.exp(-np.maximum(wanted, -1.0) / 4.0)
    for _ in range(7):
        here = formula(guess, air)
        slope = (formula(guess + step, air) - here) / step
        # The true slope lies between −0.5 and 0.25; a kink inside the step must not throw the iteration.
        guess = guess + (wanted - guess + here) / (1.0 - np.clip(slope, -0.8, 0.5))
    return np.asarray(guess * DEG)


def true_altitude(apparent: Float | float, air: Atmosphere = STANDARD, model: str = "standard") -> Float:
    """Return the true altitude (...) of an apparent one."""
    return np.asarray(np.asarray(apparent, dtype=np.float64) - of_apparent(apparent, air, model))


def standard_pressure(height_m: float) -> float:
    """Return the mean pressure in hPa at a height, ISO 2533 standard atmosphere with 1013.25 hPa at the sea."""
    return float(1013.25 * (1.0 - 2.25577e-5 * height_m) ** 5.25588)

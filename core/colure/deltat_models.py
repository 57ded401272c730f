"""Other published models of ΔT, by name, for comparison with works that were computed with them."""

from functools import cache

import numpy as np

from colure import deltat, resources
from colure.arrays import Float
from colure.deltat import Curve
from colure.errors import SpanError

MODELS = ("s15-2020", "s15-2016", "parabola-2016", "lod-2021", "espenak-meeus-2006")

# Espenak & Meeus 2006, "Five Millennium Canon of Solar Eclipses", NASA/TP-2006-214141: from the year given on, the
# origin and unit of the variable, and the coefficients from the constant up. Outside stands −20 + 32 u².
_CANON: tuple[tuple[float, float, float, tuple[float, ...]], ...] = (
    (-500.0, 0.0, 100.0, (10583.6, -1014.41, 33.78311, -5.952053, -0.1798452, 0.022174192, 0.0090316521)),
    (500.0, 1000.0, 100.0, (1574.2, -556.01, 71.23472, 0.319781, -0.8503463, -0.005050998, 0.0083572073)),
    (1600.0, 1600.0, 1.0, (120.0, -0.9808, -0.01532, 1.0 / 7129.0)),
    (1700.0, 1700.0, 1.0, (8.83, 0.1603, -0.0059285, 0.00013336, -1.0 / 1174000.0)),
    (
        1800.0,
        1800.0,
        1.0,
        (13.72, -0.332447, 0.0068612, 0.0041116, -0.00037436, 0.0000121272, -0.0000001699, 0.000000000875),
    ),
    (1860.0, 1860.0, 1.0, (7.62, 0.5737, -0.251754, 0.01680668, -0.0004473624, 1.0 / 233174.0)),
    (1900.0, 1900.0, 1.0, (-2.79, 1.494119, -0.0598939, 0.0061966, -0.000197)),
    (1920.0, 1920.0, 1.0, (21.20, 0.84493, -0.076100, 0.0020936)),
    (1941.0, 1950.0, 1.0, (29.07, 0.407, -1.0 / 233.0, 1.0 / 2547.0)),
    (1961.0, 1975.0, 1.0, (45.45, 1.067, -1.0 / 260.0, -1.0 / 718.0)),
    (1986.0, 2000.0, 1.0, (63.86, 0.3345, -0.060374, 0.0017275, 0.000651814, 0.00002373599)),
    (2005.0, 2000.0, 1.0, (62.92, 0.32217, 0.005589)),
)


@cache
def _table_2016() -> Curve:
    return Curve(np.asarray(resources.load_array("time/deltat_s15_2016.npy", mmap=False)))


def _spline(curve: Curve, years: Float, first: float, last: float, name: str) -> Float:
    outside = (years < first) | (years > last)
    if np.any(outside):
        raise SpanError(f"ΔT by {name}: year {years[outside].flat[0]:g} is outside {first:g} to {last:g}")
    return np.asarray(curve(years))


def _length_of_day(years: Float) -> Float:
    """Integrate the mean length of day 1.72 t − 3.5 sin(2π(t + 0.75)/14) ms, joined to Table S15.2020 at its ends."""

    def integral(year: Float) -> Float:
        t = (year - 1825.0) / 100.0
        turn = 2.0 * np.pi / 14.0
        return np.asarray(36.525 * (0.86 * t * t + 3.5 / turn * np.cos(turn * (t + 0.75))))

    ends = np.array([-720.0, 2019.0])
    constant = np.asarray(deltat.table_2020()(ends)) - integral(ends)
    out = np.asarray(deltat.table_2020()(years))
    return np.where(
        years < ends[0],
        integral(years) + constant[0],
        np.where(years > ends[1], integral(years) + constant[1], out),
    )


def _canon(years: Float) -> Float:
    u = (years - 1820.0) / 100.0
    out = np.asarray(-20.0 + 32.0 * u * u)
    for i, (start, origin, unit, coefficients) in enumerate(_CANON):
        end = _CANON[i + 1][0] if i + 1 < len(_CANON) else 2050.0
        inside = (years >= start) & (years < end)
        out[inside] = np.polynomial.polynomial.polyval((years[inside] - origin) / unit, coefficients)
    late = (years >= 2050.0) & (years < 2150.0)
    out[late] -= 0.5628 * (2150.0 - years[late])
    return out


def delta_t(year: Float | float, model: str) -> Float:
    """Return ΔT in seconds at decimal years (...) by one of `MODELS`, as published (no tidal reduction).

    The splines raise SpanError outside their years. Sources: Morrison et al. 2021 (`s15-2020`, and `lod-2021` for its
    length of day integrated outside the table), Stephenson et al. 2016 (`s15-2016`, `parabola-2016`), Espenak &
    Meeus 2006.
    """
    years = np.asarray(year, dtype=np.float64)
    flat = np.atleast_1d(years)
    match model:
        case "s15-2020":
            out = _spline(deltat.table_2020(), flat, -720.0, 2019.0, model)
        case "s15-2016":
            out = _spline(_table_2016(), flat, -720.0, 2016.0, model)
        case "parabola-2016":
            out = np.asarray(deltat.parabola(flat))
        case "lod-2021":
            out = _length_of_day(flat)
        case "espenak-meeus-2006":
            out = _canon(flat)
        case _:
            raise SpanError(f"ΔT model '{model}': unknown; expected one of {', '.join(MODELS)}")
    return out.reshape(years.shape)

"""ΔT = TT−UT1 and its standard error, one smooth curve from the far past to the far future.

From 1962 to the end of the shipped IERS table ΔT is measured (`orientation`). Before it stands Table S15.2020 of
Morrison et al. (2021, Proc. R. Soc. A 477, 20200776) from −720 on, led to the measurements over 1952–1962; outside,
the parabola −320 + 32.5 t² (t in centuries from 1825; Stephenson et al. 2016, Proc. R. Soc. A 472, 20160404), joined
by cubics over −2000…−720 and from the end of the table to 2500.

Before 1955 ΔT was found from the Moon, and so hangs on the tidal acceleration of the Moon's ephemeris used; it is
reduced here to that of the ephemeris in use. Years are Julian: 2000 + (JD_TT − 2451545)/365.25.
"""

from bisect import bisect_right
from functools import cache
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from colure import orientation, resources
from colure.arrays import Float

TIDAL = {"table": -25.82, "DE422": -25.85, "DE440": -25.82}
"""Tidal acceleration of the Moon, arcsec per century squared: of Table S15 and of the ephemerides.

−25.82 of the table (DE430's, which Stephenson et al. 2016 adopt) and −25.85 of DE422 (as DE421: Williams, Boggs &
Folkner 2008) are from memory. DE440's is measured: 20,000 mean longitudes of its Moon minus DE422's over 1560–2440
have the quadratic term of +0.03 ± 0.02 in this unit, beside a cubic one. 0.03 is 20 s at −720, where σ is 180 s.
"""

_J2000 = 2451545.0
_YEAR = 365.25
_BLEND = (1550.0, 1650.0)
"""Where the shipped ephemeris passes from DE422 to DE440, ΔT passes from the one's acceleration to the other's."""
_OFF = (1952.0, -2000.0, -720.0, 2500.0)


class Curve:
    """A chain of cubics: value, and rate a year, at years scalar or array; the end pieces go on for ever."""

    __slots__ = ("_coefficients", "_rows", "_starts", "_starts_list", "_widths")

    def __init__(self, pieces: NDArray[np.float64]) -> None:
        """Take rows (n, 6): start, end, and a0 to a3 in powers of the part of the piece that has passed."""
        self._starts = np.ascontiguousarray(pieces[:, 0])
        self._widths = np.ascontiguousarray(pieces[:, 1] - pieces[:, 0])
        self._coefficients = np.ascontiguousarray(pieces[:, 2:].T)
        self._starts_list: list[float] = self._starts[1:].tolist()
        self._rows = [tuple(row) for row in pieces.tolist()]

    def __call__(self, year: Float | float) -> Float | float:
        """Return the value at years; a Python float for a Python float."""
        if isinstance(year, float):
            x0, x1, a0, a1, a2, a3 = self._rows[bisect_right(self._starts_list, year)]
            t = (year - x0) / (x1 - x0)
            return float(a0 + t * (a1 + t * (a2 + t * a3)))
        years = np.asarray(year, dtype=np.float64)
        index = np.searchsorted(self._starts[1:], years, side="right")
        part = (years - self._starts[index]) / self._widths[index]
        a, b, c, d = (row[index] for row in self._coefficients)
        return np.asarray(a + part * (b + part * (c + part * d)))

    def rate(self, year: float) -> float:
        """Return the slope at a year, from the piece that starts there if it is a knot."""
        x0, x1, _, a1, a2, a3 = self._rows[bisect_right(self._starts_list, year)]
        t = (year - x0) / (x1 - x0)
        return float((a1 + t * (2.0 * a2 + t * 3.0 * a3)) / (x1 - x0))


def _cubic(x0: float, y0: float, rate0: float, x1: float, y1: float, rate1: float) -> list[float]:
    """Return the piece that has these values and rates at its ends."""
    width, rise = x1 - x0, y1 - y0
    m0, m1 = rate0 * width, rate1 * width
    return [x0, x1, y0, m0, 3.0 * rise - 2.0 * m0 - m1, m0 + m1 - 2.0 * rise]


def parabola(year: Float | float) -> Float | float:
    """Return the long-term ΔT −320 + 32.5 t² in seconds, t in centuries from 1825 (Stephenson et al. 2016)."""
    return -320.0 + 32.5 * ((year - 1825.0) / 100.0) ** 2


def _parabola_rate(year: float) -> float:
    return 0.65 * (year - 1825.0) / 100.0


def _parabola_piece(x0: float, x1: float) -> list[float]:
    y0, y1 = float(parabola(x0)), float(parabola(x1))
    return _cubic(x0, y0, _parabola_rate(x0), x1, y1, _parabola_rate(x1))


@cache
def table_2020() -> Curve:
    """Return Table S15.2020 as published, for years −720 to 2019.

    The printed coefficients leave steps of up to 1 ms at the knots; each piece is tilted to meet the next one.
    """
    pieces = np.array(resources.load_array("time/deltat_s15_2020.npy", mmap=False))
    pieces[:-1, 3] += pieces[1:, 2] - pieces[:-1, 2:].sum(axis=1)
    return Curve(pieces)


def _measured(year: float) -> float:
    return float(orientation.tt_minus_ut1(_J2000, (year - 2000.0) * _YEAR))


def _year(jd: float) -> float:
    return 2000.0 + (jd - _J2000) / _YEAR


@cache
def _curve() -> Curve:
    """Return the whole curve, on the tidal acceleration of Table S15; the years of the IERS table are not meant."""
    join, far, start, late = _OFF
    first, last = (_year(jd) for jd in orientation.span())
    table = table_2020()
    pieces = [_parabola_piece(far - 1000.0, far)]
    pieces.append(_cubic(far, float(parabola(far)), _parabola_rate(far), start, float(table(start)), table.rate(start)))
    rows = np.array(resources.load_array("time/deltat_s15_2020.npy", mmap=False))
    knots = [float(knot) for knot in rows[:, 0] if knot < first]
    # The offset that leads from the table in 1952 to value and rate of the measurements at their start.
    rate = _measured(first + 1.0) - _measured(first)
    just_before = np.nextafter(first, 0.0)
    gap = _measured(first) - float(table(first))
    offset = Curve(np.array([_cubic(join, 0.0, 0.0, first, gap, rate - table.rate(float(just_before)))]))
    knots = sorted({*knots, join, first})
    for x0, x1 in pairwise(knots):
        inside = float(np.nextafter(x1, x0))
        y0, y1, r0, r1 = float(table(x0)), float(table(x1)), table.rate(x0), table.rate(inside)
        if x0 >= join:
            y0, y1 = y0 + float(offset(x0)), y1 + float(offset(x1))
            r0, r1 = r0 + offset.rate(x0), r1 + offset.rate(inside)
        pieces.append(_cubic(x0, y0, r0, x1, y1, r1))
    end_rate = _measured(last) - _measured(last - 1.0)
    pieces.append(_cubic(first, _measured(first), rate, last, _measured(last), end_rate))
    pieces.append(_cubic(last, _measured(last), end_rate, late, float(parabola(late)), _parabola_rate(late)))
    pieces.append(_parabola_piece(late, late + 1000.0))
    return Curve(np.array(pieces))


def tidal_acceleration(year: Float | float) -> Float | float:
    """Return the Moon's tidal acceleration (arcsec/cy²) in the shipped ephemeris at years: DE422, then DE440."""
    low, high = _BLEND
    if isinstance(year, float):
        part = min(max((year - low) / (high - low), 0.0), 1.0)
        return TIDAL["DE422"] + (TIDAL["DE440"] - TIDAL["DE422"]) * part * part * (3.0 - 2.0 * part)
    parts = np.clip((np.asarray(year, dtype=np.float64) - low) / (high - low), 0.0, 1.0)
    return np.asarray(TIDAL["DE422"] + (TIDAL["DE440"] - TIDAL["DE422"]) * parts * parts * (3.0 - 2.0 * parts))


def tidal_reduction(year: Float | float, acceleration: Float | float) -> Float | float:
    """Return the seconds to add to ΔT of Table S15 for a Moon of this tidal acceleration (arcsec/cy²).

    −0.91072 (ṅ − ṅ₀) u² with u in centuries from 1955 and nothing after it, as clocks and not the Moon give ΔT then
    (Espenak & Meeus 2006; Morrison & Stephenson 2004).
    """
    if isinstance(year, float):
        century = min(year - 1955.0, 0.0) / 100.0
        return -0.91072 * (acceleration - TIDAL["table"]) * century * century
    centuries = np.minimum(np.asarray(year, dtype=np.float64) - 1955.0, 0.0) / 100.0
    return np.asarray(-0.91072 * (acceleration - TIDAL["table"]) * centuries**2)


def _modelled(year: Float | float, acceleration: Float | float | None) -> Float | float:
    if acceleration is None:
        acceleration = tidal_acceleration(year)
    return _curve()(year) + tidal_reduction(year, acceleration)


def of_tt(jd1: Float | float, jd2: Float | float, acceleration: float | None = None) -> Float | float:
    """Return TT−UT1 in seconds at TT Julian dates (two parts); scalars give a Python float.

    `acceleration` is the Moon's tidal acceleration (arcsec/cy²) to reduce to, by default the shipped ephemeris's.
    """
    first, last = orientation.span()
    if isinstance(jd1, float) and isinstance(jd2, float):
        jd = jd1 + jd2
        if first <= jd <= last:
            return orientation.tt_minus_ut1(jd1, jd2)
        return _modelled(_year(jd), acceleration)
    date = np.asarray(jd1 + jd2)
    inside = (date >= first) & (date <= last)
    if np.all(inside):
        return orientation.tt_minus_ut1(jd1, jd2)
    out = np.asarray(_modelled(2000.0 + (date - _J2000) / _YEAR, acceleration))
    if np.any(inside):
        j1, j2 = np.broadcast_arrays(jd1, jd2)
        out[inside] = orientation.tt_minus_ut1(j1[inside], j2[inside])
    return out


def delta_t(year: Float | float, acceleration: float | None = None) -> Float | float:
    """Return TT−UT1 in seconds at Julian years (TT), scalar or array; see `of_tt`."""
    if isinstance(year, int | float):
        return of_tt(_J2000, (float(year) - 2000.0) * _YEAR, acceleration)
    years = np.asarray(year, dtype=np.float64)
    return of_tt(np.full(years.shape, _J2000), (years - 2000.0) * _YEAR, acceleration)


@cache
def _sigma_table() -> NDArray[np.float64]:
    return np.asarray(resources.load_array("time/deltat_sigma.npy", mmap=False))


def sigma(year: Float | float) -> Float | float:
    """Return the standard error of ΔT in seconds at Julian years, scalar or array.

    Before 1952 and after the IERS table from the tables beside Morrison et al. (2021), interpolated; between them the
    errors that the IERS states; before −2000 and after 2500 growing with the square of the time from 1825.
    """
    table = _sigma_table()
    years = np.asarray(year, dtype=np.float64)
    inside = np.interp(years, table[:, 0], table[:, 1])
    growth = ((years - 1825.0) / 100.0) ** 2
    ends = [table[i, 1] / ((table[i, 0] - 1825.0) / 100.0) ** 2 for i in (0, -1)]
    out = np.where(years < table[0, 0], growth * ends[0], np.where(years > table[-1, 0], growth * ends[1], inside))
    return float(out) if out.ndim == 0 else out

"""Hypotheses with one unknown: equinox year, time offset, age of elements, zero of longitude; never certain."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np

from colure import precession
from colure.arrays import ARCSEC, DEG, TWO_PI, Float, norm, rotate, spherical, unit
from colure.audit.hypotheses import MODEL_ARCSEC, bases
from colure.audit.numbers import Numbers
from colure.audit.reference import Question
from colure.audit.sights import Sky
from colure.ephemeris import default
from colure.errors import MomentError, SpanError
from colure.reduction import C_AU_DAY, observer_state

YEARS = (-1000.0, 2300.0)
AYANAMSA_DEG = (15.0, 30.0)
"""Longitudes between the equinox and the origins of sidereal zodiacs that have been in use, degrees."""
MOST_DAYS = 400.0
WITHIN = 3.0


@dataclass(frozen=True, slots=True)
class Fit:
    """One fitted hypothesis: code, words, value ± sigma in `unit`, and the distance that is left, in σ.

    `frame` is the name of the frame that the fit amounts to, None where it is none.
    """

    code: str
    words: str
    value: float
    sigma: float
    unit: str
    n_sigma: float
    frame: str | None


Predict = Callable[[Float], tuple[Float, Float]]
"""From values of the unknown (k,) to longitudes and latitudes (k,), rad."""


def fits(numbers: Numbers, question: Question) -> tuple[Fit, ...]:
    """Return the hypotheses with one unknown that come within 3σ of one position, nearest first."""
    if len(numbers) != 1 or np.isnan(numbers.x[0]) or np.isnan(numbers.y[0]):
        return ()
    found = [*_equinoxes(numbers, question), *_zodiacs(numbers, question)]
    if question.is_body:
        found += _times(numbers, question)
    return tuple(sorted((fit for fit in found if fit.n_sigma <= WITHIN), key=lambda fit: fit.n_sigma))


def _scaled(numbers: Numbers, lon: Float, lat: Float) -> tuple[Float, Float]:
    """Return the residuals (k,) of longitude and latitude in σ."""
    floor = MODEL_ARCSEC * ARCSEC
    off = (numbers.x[0] * DEG - lon + np.pi) % TWO_PI - np.pi
    s_lon = np.hypot(numbers.half_x[0] * DEG, floor / np.maximum(np.cos(lat), 1e-9))
    s_lat = np.hypot(numbers.half_y[0] * DEG, floor)
    return np.asarray(off / s_lon), np.asarray((numbers.y[0] * DEG - lat) / s_lat)


def _minimum(
    numbers: Numbers, predict: Predict, grid: Float, first: tuple[Float, Float] | None = None
) -> tuple[float, float, float] | None:
    """Return the value of the unknown that fits, its σ, and the distance left; None where none comes near.

    The best points of a grid are narrowed where the way to their neighbours leads past the numbers. Among several
    values that fit, the one closest to `grid`'s middle is taken: the Sun is back after a year.
    """
    lon, lat = first if first is not None else predict(grid)
    off = _scaled(numbers, lon, lat)
    distance = np.hypot(*off)
    stride = np.hypot(*(np.diff(part) for part in off))
    reach = WITHIN + np.maximum(np.append(stride, stride[-1]), np.insert(stride, 0, stride[0]))
    low = np.ones(len(grid), dtype=np.bool_)
    low[1:] &= distance[1:] <= distance[:-1]
    low[:-1] &= distance[:-1] <= distance[1:]
    near = np.flatnonzero(low & (distance <= reach))
    near = near[np.argsort(distance[near] / reach[near])][:MOST_MINIMA]
    found = [_narrowed(numbers, predict, float(grid[at]), float(grid[1] - grid[0])) for at in near]
    middle = float(grid[0] + grid[-1]) / 2.0
    fit = [one for one in found if one[2] <= WITHIN]
    return min(fit, key=lambda one: abs(one[0] - middle)) if fit else None


MOST_MINIMA = 4


def _narrowed(numbers: Numbers, predict: Predict, at: float, step: float) -> tuple[float, float, float]:
    left = np.inf
    for _ in range(6):
        around = at + np.linspace(-step, step, 33)
        distance = np.hypot(*_scaled(numbers, *predict(around)))
        best = int(np.argmin(distance))
        at, left = float(around[best]), float(distance[best])
        step /= 8.0
    width = max(step, 1e-6)
    lon, lat = predict(np.array([at - width, at + width]))
    off = _scaled(numbers, lon, lat)
    slope = float(np.hypot(off[0][1] - off[0][0], off[1][1] - off[1][0])) / (2.0 * width)
    return at, 1.0 / max(slope, 1e-12), left


@cache
def _year_grid(plane: str) -> tuple[Float, Float]:
    """Return years and the matrices (k, 3, 3) of their mean equator or ecliptic."""
    years = np.arange(YEARS[0], YEARS[1] + 0.5, 4.0)
    return years, _matrices(plane, years)


def _matrices(plane: str, years: Float) -> Float:
    at = (precession.J2000, (years - 2000.0) * precession.YEAR)
    return (precession.bias_precession_matrix if plane == "equator" else precession.ecliptic_matrix)(at)


def _equinoxes(numbers: Numbers, question: Question) -> list[Fit]:
    direction = Sky(question)["astrometric"][0]
    found = []
    for plane in ("equator", "ecliptic"):
        years, matrices = _year_grid(plane)

        def predict(at: Float, plane: str = plane) -> tuple[Float, Float]:
            return spherical(_matrices(plane, at) @ direction)

        best = _minimum(numbers, predict, years, spherical(matrices @ direction))
        if best is None or not YEARS[0] < best[0] < YEARS[1]:
            continue
        year, sigma, left = best
        decimals = 2 if sigma < 0.1 else 1 if sigma < 1.0 else 0
        label = f"{year:.{decimals}f}"
        frame = f"{plane}/mean/{label if year < 0 else 'J' + label}"
        words = f"mean {plane} and equinox of {label.replace('-', '−')} ± {sigma:.{max(decimals, 1)}f}, astrometric"
        found.append(Fit("B3" if plane == "equator" else "C2", words, year, sigma, "yr", left, frame))
    return found


def _zodiacs(numbers: Numbers, question: Question) -> list[Fit]:
    if question.moment is None:
        return []
    lon, lat = spherical(rotate(precession.ecliptic_matrix(question.moment), Sky(question)["astrometric"]))
    offset = float((lon[0] - numbers.x[0] * DEG + np.pi) % TWO_PI - np.pi) / DEG
    if not AYANAMSA_DEG[0] <= offset <= AYANAMSA_DEG[1]:
        return []
    left = abs(float(numbers.y[0] * DEG - lat[0])) / (float(numbers.half_y[0]) * DEG)
    words = f"sidereal zodiac, its origin {offset:.4f}° from the equinox of date (not an astronomical frame)"
    return [Fit("C11", words, offset, float(numbers.half_x[0]), "deg", left, None)]


def _times(numbers: Numbers, question: Question) -> list[Fit]:
    assert question.moment is not None
    assert isinstance(question.reference, str)
    body, moment = question.reference, question.moment[0]
    reach = 15.0 if body == "moon" else MOST_DAYS
    grid = np.linspace(-reach, reach, 2001)
    found = []
    for axes, place in bases(question):
        sight = place if place != "observed" else "refracted"

        def along(days: Float, axes=axes, sight=sight) -> tuple[Float, Float]:  # type: ignore[no-untyped-def]
            at = moment.shifted(days)
            return axes.lonlat(Sky(question.at(at))[sight], at)  # type: ignore[no-any-return]

        def stale(days: Float, axes=axes) -> tuple[Float, Float]:  # type: ignore[no-untyped-def]
            return axes.lonlat(_stale(body, question, days), question.at(moment.shifted(0.0 * days)).moment)  # type: ignore[no-any-return]

        attempts: list[tuple[Predict, str, str]] = [(along, "E2", f"moment wrong: {axes.words}, {place}, as for")]
        if body not in ("sun", "moon"):
            attempts.append((stale, "D13", f"stale elements: {axes.words}, the body where it should be"))
        for function, code, words in attempts:
            try:
                best = _minimum(numbers, function, grid)
            except (SpanError, MomentError):
                continue
            if best is None:
                continue
            days, sigma, left = best
            way = "later" if days > 0 else "earlier"
            text = f"{words} {_span(abs(days))} ± {_span(sigma)} {way}"
            found.append(Fit(code, text, days, sigma, "d", left, None))
    return found


def _span(days: float) -> str:
    seconds = days * 86400.0
    if seconds < 600.0:
        return f"{seconds:.3g} s"
    return f"{days * 24.0:.4g} h" if days < 3.0 else f"{days:.4g} d"


def _stale(body: str, question: Question, days: Float) -> Float:
    """Return astrometric directions (k, 3) of a body that is `days` ahead on its orbit, the Earth where it is."""
    assert question.moment is not None
    state = observer_state(question.observer, question.moment[0])
    tdb1, tdb2 = question.moment[0].tdb
    late = np.asarray(tdb2 + days)
    sight = np.zeros((len(days), 3))
    for _ in range(3):
        pos = default().position((body, "sun"), tdb1, late)
        sight = pos[0] - pos[1] + state.sun_pos - state.pos
        late = tdb2 + days - norm(sight) / C_AU_DAY
    return unit(sight)

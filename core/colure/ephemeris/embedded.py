"""The ephemeris that is shipped: Chebyshev tables fitted to DE440 (1550 to 2650) and DE422 (years −2999 to 3000)."""

import threading
from collections.abc import Sequence
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike

from colure.arrays import ARCSEC, Float, Int, rotation_x
from colure.ephemeris.protocol import BODIES, Days, check_bodies, check_each, check_span
from colure.ephemeris.tables import Table, basis, combine, index, slopes, tables

CHOICES = 32
"""Choices of bodies whose last segments are kept, at some 8 kB each."""
CHUNK = 3400
"""Moments evaluated at a time, so that a body's coefficients (1.4 MB) stay in the processor's cache."""


class Embedded:
    """The shipped tables behind the Ephemeris protocol; nothing is read before the first answer.

    Positions of Mars to Pluto are those of the systems' barycentres. The arrays returned keep the three components
    apart in memory (component by component), so that work on one component at a time is fastest.
    """

    name = "Colure's tables"

    def __init__(self) -> None:
        self._last = _Last()

    @property
    def span(self) -> tuple[float, float]:
        """First and last Julian date (TDB)."""
        first, last = index()["span"]
        return float(first), float(last)

    @cached_property
    def _tables(self) -> dict[str, Table]:
        return tables()

    @cached_property
    def _axes(self) -> Float:
        """The matrix from the tables' axes, the mean ecliptic of J2000, to those of the ICRS."""
        return rotation_x(-float(index()["tilt_arcsec"]) * ARCSEC)

    @cached_property
    def _moon_share(self) -> float:
        """The Earth's distance from the Earth-Moon barycentre as a share of the Moon's from the Earth."""
        return 1.0 / (1.0 + float(index()["emrat"]))

    def posvel(self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, *, each: bool = False) -> tuple[Float, Float]:
        """Return positions (au) and velocities (au/day), both (bodies, *shape, 3), barycentric, ICRS axes."""
        return self._evaluate(bodies, tdb1, tdb2, each, rates=True)

    def position(self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, *, each: bool = False) -> Float:
        """Return positions (bodies, *shape, 3) in au, barycentric, ICRS axes."""
        return self._evaluate(bodies, tdb1, tdb2, each, rates=False)[0]

    def source(self, tdb: float) -> str:
        """Return "DE440 fit", "DE422 fit" or, inside the two windows between them, "DE422 to DE440 fit"."""
        (first, start), (end, last) = index()["blend"]
        if start <= tdb <= end:
            return "DE440 fit"
        if first < tdb < last:
            return "DE422 to DE440 fit"
        return "DE422 fit"

    def uncertainty_arcsec(
        self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, distance: ArrayLike | None = None
    ) -> Float:
        """Return bounds (bodies, *shape) in arcsec on the error of a geocentric direction.

        `distance` is the geocentric distance in au, a scalar or (bodies, *shape); without it the least that the body
        can have is taken. Terms: see `colure.ephemeris.uncertainty`.
        """
        from colure.ephemeris import uncertainty  # late: a chart shows directions only

        check_bodies(bodies, BODIES, self.name)
        jd = np.asarray(tdb1, dtype=np.float64) + np.asarray(tdb2, dtype=np.float64)
        return uncertainty.bound(bodies, jd, distance, fitted=True)

    def _evaluate(
        self, bodies: Sequence[str], tdb1: Days, tdb2: Days, each: bool, *, rates: bool
    ) -> tuple[Float, Float]:
        day, part = np.asarray(tdb1, dtype=np.float64), np.asarray(tdb2, dtype=np.float64)
        if day.shape != part.shape:
            day, part = np.broadcast_arrays(day, part)
        jd = day + part
        check_bodies(bodies, BODIES, self.name)
        if each:
            check_each(jd.shape, bodies)
        check_span(jd, self.span, self.name)
        if (jd.ndim == 1 and each) or jd.ndim == 0:
            return self._last.evaluate(self, tuple(bodies), day, part, rates)
        shape = jd.shape[1:] if each else jd.shape
        lead = (len(bodies), -1) if each else (-1,)
        day, part, jd = day.reshape(lead), part.reshape(lead), jd.reshape(lead)
        count = jd.shape[-1]
        # One block for both: numpy asks for large pages from 4 MiB on, and touching small ones is most of the cost.
        both = np.empty((1 + rates, len(bodies), 3, count))
        pieces = -(-count // CHUNK)
        bounds = [count * i // pieces for i in range(pieces + 1)] if pieces else []
        work = np.empty((5, max(table.order for table in self._tables.values()) * -(-count // max(pieces, 1))))
        order = sorted(range(len(bodies)), key=lambda row: self._turn_of(bodies[row]))
        for a, b in pairwise(bounds):
            shared = None if each else _Moments(jd[a:b], day[a:b], part[a:b], work)
            for row in order:
                moments = shared or _Moments(jd[row, a:b], day[row, a:b], part[row, a:b], work)
                self._fill(bodies[row], moments, both[:, row, :, a:b])
        vectors = np.moveaxis(both.reshape(*both.shape[:3], *shape), 2, -1)
        return vectors[0], vectors[1] if rates else np.empty((0, 3))

    def _turn_of(self, body: str) -> tuple[float, int]:
        """Return a key to sort by: one segment length after the other, the highest order first, Earth and Moon last."""
        table = self._tables.get(body)
        return (np.inf, 0) if table is None or body == "moon" else (table.length, -table.order)

    def _fill(self, body: str, moments: "_Moments", out: Float) -> None:
        """Write the position and, where there is room for it, the velocity (1 or 2, 3, N) of one body on ICRS axes."""
        rates = len(out) > 1
        if body in ("earth", "moon"):
            emb, moon = (moments.state(self._tables[name], rates) for name in ("emb", "moon"))
            share = -self._moon_share if body == "earth" else 1.0 - self._moon_share
            state = [a + share * b for a, b in zip(emb, moon, strict=True)]
        else:
            state = moments.state(self._tables[body], rates)
        for components, value in zip(out, state, strict=True):
            np.matmul(self._axes, value, out=components)


class _Moments:
    """A batch of N moments with what bodies share: the last Chebyshev basis, and the parts that make Earth and Moon.

    `work` is memory for the coefficients (three rows) and for the basis and its derivatives (one row each).
    """

    def __init__(self, jd: Float, day: Float, part: Float, work: Float) -> None:
        self.jd, self.day, self.part, self._work = jd, day, part, work
        self._place: tuple[float, Int, list[Float]] | None = None
        self._states: dict[str, list[Float]] = {}

    def state(self, table: Table, rates: bool) -> list[Float]:
        """Return [position (3, N), velocity (3, N) if asked for] on the table's axes."""
        if table.body in self._states:
            return self._states[table.body]
        if self._place is None or self._place[0] != table.length or len(self._place[2][0]) < table.order:
            number = table.locate(self.jd)
            x = table.argument(number, self.day, self.part)
            functions = [
                f(x, table.order, out) for f, out in zip((basis, slopes)[: 1 + rates], self._work[3:], strict=False)
            ]
            self._place = (table.length, number, functions)
        _, number, functions = self._place
        state = combine(table, number, [f[: table.order] for f in functions], self._work[:3].reshape(-1))
        if rates:
            state[1] *= 2.0 / table.length
        if table.body in ("emb", "moon"):
            self._states[table.body] = state
        return state


class _Last(threading.local):
    """The series of the segments last used for single moments: one set for each thread and each choice of bodies."""

    def __init__(self) -> None:
        self._choices: dict[tuple[str, ...], _Choice] = {}

    def evaluate(
        self, owner: Embedded, bodies: tuple[str, ...], day: Float, part: Float, rates: bool
    ) -> tuple[Float, Float]:
        """Return (bodies, 3) positions and velocities at one moment, or at one moment for each body."""
        choice = self._choices.get(bodies)
        if choice is None:
            if len(self._choices) >= CHOICES:
                self._choices.clear()
            choice = self._choices[bodies] = _Choice(owner, bodies)
        return choice.evaluate(day, part, rates)


class _Choice:
    """The decoded segments that a choice of bodies needs at one moment, summed by a single product.

    A term is one table's share in one body: most bodies have one, the Earth and the Moon two. The series are kept as
    ordinary polynomials on ICRS axes, times their share, padded to one length.
    """

    def __init__(self, owner: Embedded, bodies: tuple[str, ...]) -> None:
        share = owner._moon_share
        parts = {"earth": {"emb": 1.0, "moon": -share}, "moon": {"emb": 1.0, "moon": 1.0 - share}}
        terms = [
            (row, native, factor)
            for row, body in enumerate(bodies)
            for native, factor in parts.get(body, {body: 1.0}).items()
        ]
        self._tables = [owner._tables[native] for _, native, _ in terms]
        self._factors = [factor for *_, factor in terms]
        self._row = np.array([row for row, *_ in terms], dtype=np.intp)
        self._sum = np.zeros((len(bodies), len(terms)))
        self._sum[self._row, np.arange(len(terms))] = 1.0
        width = max((table.order for table in self._tables), default=1)
        self._series = np.zeros((len(terms), 3, width))
        self._exponent = np.arange(1.0, width)
        self._from, self._until = np.full(len(terms), np.inf), np.full(len(terms), -np.inf)
        self._middle = np.zeros(len(terms))
        self._rate = np.array([2.0 / table.length for table in self._tables])
        self._powers = _powers(width)
        self._turn = owner._axes

    def evaluate(self, day: Float, part: Float, rates: bool) -> tuple[Float, Float]:
        """Return (bodies, 3) positions in au and velocities in au/day, or an empty array without `rates`."""
        if day.ndim:
            day, part = day[self._row], part[self._row]
        jd = day + part
        stale = (jd < self._from) | (jd >= self._until)
        if stale.any():
            self._refresh(np.broadcast_to(jd, stale.shape), np.flatnonzero(stale).tolist())
        x = (day - self._middle + part) * self._rate
        terms, _, width = self._series.shape
        functions = np.zeros((terms, 1 + rates, width))
        powers = functions[:, 0]
        powers[:, 0] = 1.0
        powers[:, 1:] = x[:, None]
        np.multiply.accumulate(powers, axis=1, out=powers)
        if rates:
            np.multiply(powers[:, :-1], self._exponent, out=functions[:, 1, 1:])
            functions[:, 1] *= self._rate[:, None]
        state = self._sum @ (functions @ self._series.transpose(0, 2, 1)).reshape(terms, -1)
        return state[:, :3], state[:, 3:] if rates else np.empty((0, 3))

    def _refresh(self, jd: Float, terms: list[int]) -> None:
        for term in terms:
            table = self._tables[term]
            number = table.locate(jd[term : term + 1])
            series = table.decode(number)[:, :, 0] @ self._powers[: table.order]
            self._series[term] = self._factors[term] * (self._turn @ series)
            self._middle[term] = table.middle(number)[0]
            self._from[term] = table.start + table.length * number[0]
            last = number[0] == table.segments - 1  # the end of the span belongs to the last segment
            self._until[term] = np.inf if last else self._from[term] + table.length


def _powers(order: int) -> Float:
    """Return the matrix that turns Chebyshev coefficients into those of powers: row k is T_k."""
    out = np.zeros((order, order))
    out[0, 0] = 1.0
    if order > 1:
        out[1, 1] = 1.0
    for k in range(2, order):
        out[k, 1:] = 2.0 * out[k - 1, :-1]
        out[k] -= out[k - 2]
    return out

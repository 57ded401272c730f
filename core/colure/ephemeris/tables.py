"""Chebyshev segments as whole numbers in memory-mapped rows: find the rows, decode them, sum the series.

One table holds one body: equal segments, one row each. A row's words of 32, 16 and 8 bits hold the coefficients in
units of one step; a wide coefficient may lend the low bits of its word to a narrow one. A word is read as
`word × 2^−shift` for the wide one, whose encoder has allowed for the low bits, and as `word & mask` less its bias for
the narrow one.
"""

import json
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache, cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure import resources
from colure.arrays import Float, Int
from colure.errors import ResourceError

FEW = 128
"""Below this number of rows one fancy index over all words is faster than a pass over each column."""


@cache
def index() -> dict[str, Any]:
    """Return what is known of the tables as a whole: span, windows, layout, errors; read once."""
    file = "ephemeris/index.json"
    try:
        found: dict[str, Any] = json.loads(resources.path(file).read_text(encoding="utf-8"))
    except (ValueError, OSError) as fault:
        raise ResourceError(f"data file '{file}': {fault}; run 'colure selfcheck'") from fault
    return found


def tables() -> dict[str, "Table"]:
    """Return the table of every body that has one: all but the Earth; the Moon's is from the Earth."""
    first, last = index()["span"]
    return {
        body: Table(
            body=body,
            length=float(entry["length"]),
            start=float(entry["start"]),
            segments=int(entry["segments"]),
            order=int(entry["order"]),
            step=float(entry["step"]),
            words=tuple(tuple(word) for word in entry["words"]),
            span=(float(first), float(last)),
        )
        for body, entry in index()["bodies"].items()
    }


@dataclass(frozen=True)
class Table:
    """The segments of one body; positions and velocities are in au and au/day on the table's own axes."""

    body: str
    length: float
    start: float
    segments: int
    order: int
    step: float
    words: tuple[tuple[int, int, int, int, int, int], ...]
    span: tuple[float, float]

    @cached_property
    def rows(self) -> NDArray[Any]:
        """The mapped rows, a structured array (segments,) with fields w32, w16, w8."""
        file = f"ephemeris/{self.body}.npy"
        # A plain view: the memmap class costs more at every slice than the arithmetic on it.
        rows = resources.load_array(file).view(np.ndarray)
        if rows.shape != (self.segments,) or rows.dtype.names is None:
            raise ResourceError(
                f"data file '{file}': {rows.dtype} of shape {rows.shape}, expected {self.segments} rows of words; "
                "run 'colure selfcheck'"
            )
        return rows

    @cached_property
    def _plan(self) -> tuple[Int, Int, Float, Float, Int]:
        """For each stored coefficient its row in (3 × order), its word, and value = (word & mask) × scale − bias."""
        first = {}
        count = 0
        for size in (32, 16, 8):
            first[size] = count
            count += 1 + max((word[3] for word in self.words if word[2] == size), default=-1)
        target = np.array([component * self.order + k for component, k, *_ in self.words])
        word = np.array([first[size] + column for _, _, size, column, _, _ in self.words])
        shift = np.array([shift for *_, shift, _ in self.words])
        low = np.array([low for *_, low in self.words], dtype=bool)
        mask = np.where(low, (1 << shift) - 1, -1)
        scale = np.where(low, 1.0, 2.0**-shift) * self.step
        bias = np.where(low, 2.0 ** (shift - 1) * self.step, 0.0)
        return target, word, mask, scale, bias

    @cached_property
    def _unstored(self) -> Int:
        """The rows of (3 × order) that no word holds: coefficients that never reach one step."""
        stored = np.zeros(3 * self.order, dtype=bool)
        stored[self._plan[0]] = True
        return np.flatnonzero(~stored)

    def locate(self, jd: Float) -> Int:
        """Return the segment number of each Julian date within the span."""
        number = ((jd - self.start) * (1.0 / self.length)).astype(np.int64)
        return np.minimum(number, self.segments - 1)

    def middle(self, number: Any) -> Any:
        """Return the middle date of segments; the first and the last are moved inwards to lie in the span."""
        half = 0.5 * self.length
        return np.clip(self.start + (number + 0.5) * self.length, self.span[0] + half, self.span[1] - half)

    def argument(self, number: Int, day: Float, part: Float) -> Float:
        """Return the Chebyshev argument, −1 to 1, of the dates day + part in their segments."""
        x: Float = day - self.middle(number)
        x += part
        x *= 2.0 / self.length
        return x

    def decode(self, number: Int, scratch: Float | None = None) -> Float:
        """Return the coefficients (3, order, N) of N segments in au, in the memory of `scratch` if it is given."""
        target, word, mask, scale, bias = self._plan
        size = 3 * self.order * number.size
        out = (np.empty(size) if scratch is None else scratch[:size]).reshape(3 * self.order, number.size)
        out[self._unstored] = 0.0
        rows = np.take(self.rows, number)
        if number.size < FEW:
            names = rows.dtype.names or ()
            flat = np.concatenate([rows[name].astype(np.int64) for name in names], axis=1)
            out[target] = ((flat[:, word] & mask) * scale - bias).T
        else:
            for place, (_, _, wide, column, _, low), m, s, b in zip(target, self.words, mask, scale, bias, strict=True):
                values = rows[f"w{wide}"][:, column]
                if low:
                    np.multiply(values & int(m), s, out=out[place])
                    out[place] -= b
                else:
                    np.multiply(values, s, out=out[place])
        return out.reshape(3, self.order, number.size)


def basis(x: Float, order: int, memory: Float) -> Float:
    """Return the Chebyshev polynomials T_k(x) as (order, N), in `memory`."""
    return _recurrence(x, x, memory[: order * x.size].reshape(order, x.size))


def slopes(x: Float, order: int, memory: Float) -> Float:
    """Return the derivatives T'_k(x) = k U_(k−1)(x) as (order, N), in `memory`."""
    out = memory[: order * x.size].reshape(order, x.size)
    out[0] = 0.0
    if order > 1:
        _recurrence(x, 2.0 * x, out[1:])
        out[1:] *= np.arange(1.0, order)[:, None]
    return out


def _recurrence(x: Float, second: Float, out: Float) -> Float:
    out[0] = 1.0
    if len(out) > 1:
        out[1] = second
    twice = 2.0 * x
    for k in range(2, len(out)):
        np.multiply(twice, out[k - 1], out=out[k])
        out[k] -= out[k - 2]
    return out


def combine(table: Table, number: Int, functions: Sequence[Float], scratch: Float) -> list[Float]:
    """Return Σ c_k f_k as (3, N) for each set of functions (order, N), the coefficients taken from segments `number`.

    `scratch` holds at least 3 × order × N numbers: fresh memory of that size would cost more than the work done in it.

    Dense sorted moments cost one small matrix product a segment; moments that share few segments decode each once.
    """
    count = number.size
    few, many = int(number.min()), int(number.max())
    spread = many - few + 1
    if spread == 1:
        one = table.decode(number[:1])[:, :, 0]
        return [one @ f for f in functions]
    steps = np.diff(number)
    if count >= 12 and (steps >= 0).all():
        bounds = np.flatnonzero(steps) + 1
        if count >= 8 * (bounds.size + 1):
            first = np.concatenate(([0], bounds))
            last = np.concatenate((bounds, [count]))
            coefficients = np.ascontiguousarray(np.moveaxis(table.decode(number[first]), 2, 0))
            outs = [np.empty((3, count)) for _ in functions]
            for one, a, b in zip(coefficients, first.tolist(), last.tolist(), strict=True):
                for out, f in zip(outs, functions, strict=True):
                    np.matmul(one, f[:, a:b], out=out[:, a:b])
            return outs
    if 2 * spread < count:
        decoded = table.decode(np.arange(few, many + 1)).reshape(3 * table.order, spread)
        coefficients = scratch[: decoded.shape[0] * count].reshape(decoded.shape[0], count)
        # Without `clip` the result is buffered; every index is in range.
        np.take(decoded, number - few, axis=1, out=coefficients, mode="clip")
        coefficients = coefficients.reshape(3, table.order, count)
    else:
        coefficients = table.decode(number, scratch)
    return [np.einsum("ikn,kn->in", coefficients, f) for f in functions]

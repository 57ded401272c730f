"""The frames that an overlay's numbers may really be in, and how well each explains its stars."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colure import precession
from colure.arrays import ARCSEC, Float, Int, cartesian, separation, spherical
from colure.errors import ColureError
from colure.framenames import Frame
from colure.overlays.directions import to_icrs
from colure.overlays.fitting import offsets
from colure.overlays.systems import digits

EQUATORIAL = (
    "icrs",
    "equator/mean/J2000@iau1976",
    "equator/fk4/B1950",
    "equator/mean/B1950",
    "equator/fk4/B1900",
    "equator/fk4/B1875",
)
ECLIPTIC = ("ecliptic/mean/J2000", "ecliptic/mean/B1950", "ecliptic/mean/B1900", "ecliptic/iau76/J2000")
OTHER = ("galactic", "supergalactic")
OF_DATE = ("equator/mean/date", "equator/true/date", "ecliptic/mean/date", "ecliptic/true/date", "cirs")
FIRST_YEAR, LAST_YEAR = -200.0, 2100.0
"""Equinoxes that are looked through when none of the usual frames explains the positions."""
NAMES = {
    "icrs": "the numbers were ICRS (J2000)",
    "equator/mean/J2000@iau1976": "the equinox were J2000 (FK5)",
    "equator/fk4/B1950": "the equinox were B1950 (FK4)",
    "equator/mean/B1950": "the equinox were B1950 (without the E-terms of FK4)",
    "equator/fk4/B1900": "the equinox were B1900 (FK4)",
    "equator/fk4/B1875": "the equinox were B1875 (FK4)",
    "ecliptic/mean/J2000": "they were ecliptic, of equinox J2000",
    "ecliptic/mean/B1950": "they were ecliptic, of equinox B1950",
    "ecliptic/mean/B1900": "they were ecliptic, of equinox B1900",
    "ecliptic/iau76/J2000": "they were ecliptic J2000, with the obliquity of IAU 1976",
    "galactic": "they were galactic",
    "supergalactic": "they were supergalactic",
}


@dataclass(frozen=True, slots=True)
class Reading:
    """One frame in which the numbers may be read.

    `rms_arcsec` is the robust scatter left against the catalogue (per position, both coordinates), `pattern_arcsec` how
    far this reading is from the best one, `separable` whether the scatter and the number of stars can tell the two
    apart. `year` and `year_sigma` are those of a fitted equinox.
    """

    frame: str
    words: str
    rms_arcsec: float
    pattern_arcsec: float = 0.0
    separable: bool = True
    year: float | None = None
    year_sigma: float | None = None


def candidates(declared: str, epoch: float | None) -> tuple[str, ...]:
    """Return the frames to be tried, the declared one first; those of date only where the epoch is known."""
    dated = OF_DATE if epoch is not None else ()
    return tuple(dict.fromkeys([declared, *EQUATORIAL, *ECLIPTIC, *OTHER, *dated]))


def words(frame: str, declared: str, epoch: float | None) -> str:
    """Return a reading as the end of "as if …", a date with its year."""
    parsed = Frame.parse(frame)
    year = f" ({epoch:.2f})" if parsed.needs_moment and epoch is not None else ""
    if frame == declared:
        return f"declared ({parsed.label()}{year})"
    return NAMES.get(frame, f"the frame were {parsed.label()}{year}")


def read_in(vectors: Float, frame: str, epoch: float | None) -> Float | None:
    """Return directions (N, 3), ICRS, of numbers read in a frame; None where the frame cannot be had."""
    try:
        return np.asarray(to_icrs(vectors, frame, epoch))
    except ColureError:
        return None


def plane(frame: str) -> str | None:
    """Return "equator" or "ecliptic" for a frame whose equinox may be another, else None."""
    parsed = Frame.parse(frame)
    if parsed.plane in ("equator", "ecliptic"):
        return parsed.plane
    return "equator" if parsed.is_equatorial else None


def matrices(name: str, years: Float) -> Float:
    """Return the matrices (Y, 3, 3) from ICRS axes to the mean plane ("equator" or "ecliptic") of Julian years."""
    at = (np.full(len(years), precession.J2000), (years - 2000.0) * precession.YEAR)
    return precession.bias_precession_matrix(at) if name == "equator" else precession.ecliptic_matrix(at)


def scatter(given: Float, true: Float) -> float:
    """Return the robust rms distance in radians: of the median, as a normal scatter in two coordinates has it."""
    return float(np.median(separation(given, true)) / 1.1774 * np.sqrt(2.0))


def fit_year(vectors: Float, true: Float, name: str, start: float) -> tuple[float, float, float] | None:
    """Return the equinox (Julian year) of a plane that best carries numbers (M, 3) on stars (M, 3), its σ, the scatter.

    Least squares in one unknown with Tukey's weights; the scatter is in radians. None where it does not converge.
    """
    year, sigma, step = start, np.inf, 0.5
    weight = np.ones(len(vectors))
    for turn in range(15):
        here, there = (vectors @ m for m in matrices(name, np.array([year, year + step])))
        rest, slope = offsets(here, true), offsets(here, there) / step
        length = np.hypot(rest[:, 0], rest[:, 1])
        robust = max(float(np.median(length)) / 1.1774, 1e-5 * ARCSEC)
        ratio = length / (4.685 * robust)
        weight = np.where(ratio < 1.0, (1.0 - ratio**2) ** 2, 0.0) if turn else (ratio < 2.0).astype(np.float64)
        normal = float((weight[:, None] * slope**2).sum())
        if not normal > 0.0:
            return None
        change = float((weight[:, None] * slope * rest).sum()) / normal
        year += change
        spread = float((weight[:, None] * rest**2).sum()) / max(2.0 * float((weight > 0).sum()) - 1.0, 1.0)
        sigma = float(np.sqrt(spread / normal))
        if not FIRST_YEAR - 3000.0 < year < LAST_YEAR + 3000.0:
            return None
        if abs(change) < 1e-3 * sigma + 1e-9:
            break
    return year, sigma, scatter(vectors @ matrices(name, np.array([year]))[0], true)


def readings(
    vectors: Float, true: Float, declared: str, epoch: float | None, found: Sequence[tuple[str, float]]
) -> tuple[Reading, ...]:
    """Return how well each frame explains matched numbers (M, 3) and stars (M, 3), the best first.

    `found` are the planes and years of equinoxes to begin a fit from. Frames that leave more than a hundred times the
    best scatter are left out, except the declared one.
    """
    rows: list[tuple[Reading, Float]] = []
    for frame in candidates(declared, epoch):
        at = read_in(vectors, frame, epoch)
        if at is not None:
            rows.append((Reading(frame, words(frame, declared, epoch), scatter(at, true) / ARCSEC), at))
    for name, start in dict(found).items():
        fitted = fit_year(vectors, true, name, start)
        if fitted is None:
            continue
        year, sigma, rms = fitted
        shown = digits(round(year, max(0, int(np.ceil(-np.log10(max(sigma, 1e-6)))) + 1)))
        text = f"the mean equinox were that of {shown} ± {sigma:.2g}" + (" (ecliptic)" if name == "ecliptic" else "")
        frame = f"{name}/mean/{'' if year < 0 else 'J'}{shown}"
        at = vectors @ matrices(name, np.array([year]))[0]
        rows.append((Reading(frame, text, rms / ARCSEC, year=year, year_sigma=sigma), at))
    rows.sort(key=lambda row: row[0].rms_arcsec)
    best, best_at = rows[0]
    # A fitted year costs an unknown: where a frame without one does as well, that frame is the answer.
    limit = 3.0 * best.rms_arcsec / np.sqrt(len(vectors))
    plain = [row for row in rows if row[0].year is None and _pattern(row[1], best_at) <= limit]
    if best.year is not None and plain:
        mine = [row for row in plain if row[0].frame == declared]
        best, best_at = (mine or plain)[0]
    elif mine := [row for row in rows if row[0].frame == declared and _pattern(row[1], best_at) <= limit]:
        best, best_at = mine[0]
    out = []
    for reading, at in rows:
        pattern = _pattern(at, best_at)
        if reading.rms_arcsec > max(100.0 * best.rms_arcsec, 1.0) and reading.frame != declared:
            continue
        out.append(
            Reading(
                reading.frame, reading.words, reading.rms_arcsec, pattern, pattern > limit, reading.year,
                reading.year_sigma,
            )
        )  # fmt: skip
    out.sort(key=lambda reading: (reading.frame != best.frame or reading.year != best.year, reading.rms_arcsec))
    return tuple(out)


def _pattern(a: Float, b: Float) -> float:
    """Return the rms difference of two readings in arcseconds."""
    return float(np.sqrt((separation(a, b) ** 2).mean())) / ARCSEC


def spread_sample(count: int, most: int) -> Int:
    """Return at most `most` indices spread evenly over `count` rows."""
    return np.unique(np.linspace(0, count - 1, min(count, most)).astype(np.int64)) if count else np.empty(0, np.int64)


def shifted(vectors: Float, angle: float) -> Float:
    """Return directions moved in declination by an angle, away from the nearer pole: where stars are by chance only."""
    lon, lat = spherical(vectors)
    return cartesian(lon, np.where(lat > 0.0, lat - angle, lat + angle))

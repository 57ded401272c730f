"""A table of stars with unknown equinox, held against the catalogue: its axes, equinox year, obliquity and epoch."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from colure import fk4, precession
from colure.arrays import ARCSEC, DEG, Bool, Float, Int, cartesian, unit
from colure.audit.matching import nearest
from colure.audit.rotation import Turned, fit, rotation_vector
from colure.errors import SpanError, TableError
from colure.stars import EPOCH, catalogue

YEARS = (-3000.0, 3000.0)
FK4_YEARS = (1700.0, 2100.0)
SURE_COST = 9.0
"""Difference of χ² below which two models are not told apart (3σ)."""
FEWEST = 5
"""Rows below which no rotation is fitted: each gives two equations for three unknowns and an epoch."""
SURE_EPOCH = 30.0
"""Years: an epoch known worse than this is taken to be that of the equinox."""
SAMPLE = 160
MATCH_ARCSEC = 60.0
LEAST_SHARE = 0.3
"""Of the sample this share must meet a star, or the table is said to match nothing."""


@dataclass(frozen=True, slots=True)
class Model:
    """One kind of axes with its best equinox: name of the frame, year ± sigma, and what is left.

    `left_arcsec` (3,) is the rotation about the table's x, y, z that no equinox explains, ± `left_sigma` (3,);
    `cost` the sum of squares (σ²) of rows and of that rotation, by which models are compared.
    """

    kind: str
    year: float
    sigma: float
    left_arcsec: tuple[float, float, float]
    left_sigma_arcsec: tuple[float, float, float]
    cost: float
    sigma_row_arcsec: float

    @property
    def frame(self) -> str:
        """The frame at the fitted year, to the decimals that the year is known to."""
        decimals = 2 if self.sigma < 0.05 else 1 if self.sigma < 0.5 else 0
        text = f"{self.year:.{decimals}f}"
        if self.kind == "fk4":
            return f"equator/fk4/B{text}"
        return f"{self.kind}/mean/{text if self.year < 0 else 'J' + text}"


@dataclass(frozen=True, slots=True)
class TableFit:
    """What a table is: `models` from the best to the worst, and what the rows say.

    `rows` (n,) are the catalogue rows held against each position (−1: none), `good` (n,) which agree, `off_arcsec` (n,)
    the distance of each from its star after the rotation; `obliquity_arcsec` the error of the obliquity that an
    ecliptic table was made with, NaN for an equator; `epoch` ± `epoch_sigma` the date of the places.
    """

    models: tuple[Model, ...]
    rows: Int
    good: Bool
    off_arcsec: Float
    sigma_arcsec: float
    obliquity_arcsec: float
    obliquity_sigma_arcsec: float
    epoch: float
    epoch_sigma: float
    matrix: Float

    @property
    def best(self) -> Model:
        """The model that leaves least."""
        return self.models[0]


def _matrix(kind: str, year: float) -> Float:
    at = (precession.J2000, (year - 2000.0) * precession.YEAR)
    if kind == "ecliptic":
        return precession.ecliptic_matrix(at)
    if kind == "fk4":
        import erfa

        return precession.bias_precession_matrix(erfa.epb2jd(year), "newcomb")
    return precession.bias_precession_matrix(at)


def _span(kind: str) -> tuple[float, float]:
    return FK4_YEARS if kind == "fk4" else YEARS


def _equinox(kind: str, turned: Turned, start: float | None = None) -> tuple[float, float, Float, float]:
    """Return year, σ, the rotation left (3,) rad, and its weight in σ², for one kind of axes."""
    information = np.linalg.inv(turned.covariance[:3, :3])

    def left(year: float) -> Float:
        return rotation_vector(turned.matrix @ _matrix(kind, year).T)

    first, last = _span(kind)
    if start is None:
        grid = np.arange(first, last + 1.0, 100.0)
        sizes = [float(vector @ vector) for vector in map(left, grid)]
        start = float(grid[int(np.argmin(sizes))])
    year, sigma = start, np.inf
    for _ in range(12):
        low, high = max(year - 0.5, first), min(year + 0.5, last)
        slope = (left(high) - left(low)) / (high - low)
        curvature = float(slope @ information @ slope)
        step = -float(slope @ information @ left(year)) / curvature
        sigma = curvature**-0.5
        year = float(np.clip(year + step, first, last))
        if abs(step) < 1e-6:
            break
    rest = left(year)
    return year, sigma, rest, float(rest @ information @ rest)


def fit_identified(lon_deg: Float, lat_deg: Float, rows: Int, *, half_arcsec: float | None = None) -> TableFit:
    """Return what a table (n,) is whose stars are known by their catalogue rows (n,), −1 where they are not.

    Wrong identifications are allowed: they get no weight. `half_arcsec` is half the last digit if it is known, the
    least scatter that is believed. Raises TableError where too few rows can be used, SpanError where no equinox fits.
    """
    known = np.flatnonzero(rows >= 0)
    if len(known) < FEWEST:
        raise TableError(f"audit of a table: {len(known)} of {len(rows)} rows have a star; expected {FEWEST} or more")
    table = cartesian(lon_deg[known] * DEG, lat_deg[known] * DEG)
    place, motion = (np.asarray(part) for part in catalogue().rows(rows[known]).vectors(np.float64))
    least = max(half_arcsec or 0.0, 1e-4) * ARCSEC / 2.0
    first = fit(table, place, None, star_epoch=EPOCH, epoch=EPOCH, least_sigma=least)
    kind, year = _nearest_kind(first)
    options: dict[str, Any] = {"star_epoch": EPOCH, "least_sigma": least}
    models, results = [], {}
    for name in [kind, "fk4"] if kind == "equator" else [kind]:
        if name == "fk4" and not FK4_YEARS[0] <= year <= FK4_YEARS[1]:
            continue
        freed = fk4.remove_e_terms(table, year) if name == "fk4" else table
        turned = fit(freed, place, motion, epoch=year, **options)
        if turned.epoch_sigma > SURE_EPOCH:
            # Places this rough do not tell their own date: take that of the equinox, in two rounds.
            epoch, epoch_sigma = turned.epoch, turned.epoch_sigma
            found = year
            for _ in range(3):
                turned = fit(freed, place, motion, epoch=found, free_epoch=False, **options)
                found = _equinox(name, turned, found)[0]
        else:
            epoch, epoch_sigma = turned.epoch, turned.epoch_sigma
        found, sigma, rest, weight = _equinox(name, turned, year)
        spread = np.sqrt(np.diag(turned.covariance)[:3])
        cost = 2.0 * float(turned.good.sum()) * 2.0 * np.log(turned.sigma / ARCSEC) + weight
        models.append(
            Model(
                name,
                found,
                sigma,
                tuple((rest / ARCSEC).tolist()),
                tuple((spread / ARCSEC).tolist()),
                cost,
                turned.sigma / ARCSEC,
            )
        )
        results[name] = (turned, freed, epoch, epoch_sigma)
    models.sort(key=lambda model: model.cost)
    turned, freed, epoch, epoch_sigma = results[models[0].kind]
    stars = unit(place + motion * (turned.epoch - EPOCH))
    off = np.full(len(rows), np.nan)
    off[known] = np.sqrt(((freed - stars @ turned.matrix.T) ** 2).sum(axis=1)) / ARCSEC
    good = np.zeros(len(rows), dtype=np.bool_)
    good[known] = turned.good
    best = models[0]
    tilt = best.kind == "ecliptic"
    return TableFit(
        tuple(models),
        rows,
        good,
        off,
        turned.sigma / ARCSEC,
        # Vectors turned by −δ about x are those of an ecliptic whose obliquity is δ too large.
        -best.left_arcsec[0] if tilt else np.nan,
        best.left_sigma_arcsec[0] if tilt else np.nan,
        epoch,
        epoch_sigma,
        turned.matrix,
    )


def _nearest_kind(turned: Turned) -> tuple[str, float]:
    """Return which plane, at which year, comes nearest to a rotation; raise SpanError where none is within a degree."""
    found = []
    for kind in ("equator", "ecliptic"):
        year, _, rest, _ = _equinox(kind, turned)
        found.append((float(np.sqrt(rest @ rest)), kind, year))
    size, kind, year = min(found)
    if size > 3.0 * DEG:
        raise SpanError(
            f"audit of a table: no equinox from {YEARS[0]:g} to {YEARS[1]:g} fits; the nearest "
            f"({kind} of {year:.0f}) is {size / DEG:.1f}° away".replace("-", "−")
        )
    return kind, year


def fit_unidentified(
    lon_deg: Float,
    lat_deg: Float,
    *,
    vmag: Float | None = None,
    radius_arcsec: float | None = None,
    half_arcsec: float | None = None,
) -> TableFit:
    """Return what a table (n,) is whose stars are not named: they are matched to the catalogue by position.

    Equinoxes are tried on a sample until enough of it meets stars, then every row is matched. `vmag` (n,), where
    given, keeps faint rows out of the sample; `radius_arcsec` is how far a row may be from its star.
    """
    if len(lon_deg) < FEWEST:
        raise TableError(f"audit of a table: {len(lon_deg)} rows; expected {FEWEST} or more")
    table = cartesian(lon_deg * DEG, lat_deg * DEG)
    usable = np.arange(len(lon_deg))
    limit = 10.5
    if vmag is not None and np.isfinite(vmag).sum() >= FEWEST:
        bright = np.flatnonzero(vmag < 11.0)
        usable = bright if len(bright) >= FEWEST else usable
    sample = usable[np.linspace(0, len(usable) - 1, min(SAMPLE, len(usable))).astype(np.int64)]
    radius = (radius_arcsec or MATCH_ARCSEC) * ARCSEC
    kind, year, share = _search(table[sample], radius, limit)
    if share < LEAST_SHARE:
        kind, year, share = _search(table[sample], radius, 30.0)
    if share < LEAST_SHARE:
        raise TableError(
            f"audit of a table: {share:.0%} of a sample of {len(sample)} rows meet a star of the catalogue within "
            f"{radius / ARCSEC:.0f}″ at any equinox from {_TRIED[0]:.0f} to {_TRIED[-1]:.0f}; "
            "name the stars by a column of identifiers"
        )
    matrix = _matrix(kind, year)
    # A first fit on a few thousand rows finds axes, epoch and scatter; then the radius follows the scatter, which
    # leaves fewer wrong neighbours.
    few = usable[np.linspace(0, len(usable) - 1, min(FEW, len(usable))).astype(np.int64)]
    first = _matched(lon_deg, lat_deg, table, few, matrix, radius, year, half_arcsec)
    reach = min(radius, max(6.0 * first.sigma_arcsec, 1.0) * ARCSEC)
    epoch = first.epoch if first.epoch_sigma < SURE_EPOCH else first.best.year
    return _matched(lon_deg, lat_deg, table, usable, first.matrix, reach, epoch, half_arcsec)


FEW = 4000


def _matched(
    lon_deg: Float,
    lat_deg: Float,
    table: Float,
    usable: Int,
    matrix: Float,
    radius: float,
    epoch: float,
    half_arcsec: float | None,
) -> TableFit:
    """Match the usable rows on axes that are nearly known, and fit."""
    rows = np.full(len(table), -1, dtype=np.int64)
    rows[usable] = nearest(table[usable] @ matrix, radius, year=epoch).rows
    return fit_identified(lon_deg, lat_deg, rows, half_arcsec=half_arcsec)


_TRIED = np.arange(1700.0, 2101.0, 2.0)


def _search(sample: Float, radius: float, vmag: float) -> tuple[str, float, float]:
    """Return the plane and equinox at which most of a sample (n, 3) meets stars, and the share that does."""
    best = ("equator", 2000.0, -1.0, np.inf)
    usual = np.array([2000.0, 1950.0, 2025.0, 1900.0, 1875.0])
    for years in (usual, _TRIED):
        for kind in ("equator", "ecliptic"):
            matrices = np.stack([_matrix(kind, float(year)) for year in years])
            turned = np.einsum("nj,yjk->ynk", sample, matrices)
            matched = nearest(turned.reshape(-1, 3), radius, vmag)
            distance = matched.distance.reshape(len(years), len(sample))
            share = (matched.rows.reshape(distance.shape) >= 0).mean(axis=1)
            # Neighbouring trials meet the same stars: the nearer one wins.
            score = share - np.median(np.minimum(distance, radius), axis=1) / radius * 0.1
            at = int(np.argmax(score))
            if score[at] > best[2] - (0.1 * best[3] / radius if np.isfinite(best[3]) else 0.0):
                best = (kind, float(years[at]), float(share[at]), float(np.median(np.minimum(distance[at], radius))))
        if best[2] > 0.7:
            break
    return best[0], best[1], best[2]

"""What a table file tells the audit: rounding by its digits, stars by its identifiers, moments by its dates."""

import re

import numpy as np

from colure import names
from colure.arrays import Bool, Float, Int
from colure.audit.tablefit import TableFit, fit_identified, fit_unidentified
from colure.errors import ColureError, TableError
from colure.moment import Moment
from colure.stars import catalogue
from colure.tables import Column, Positions, Table

IDENTIFIERS = ("hip", "hipparcos", "tyc", "tycho", "gaia", "source_id", "star", "name", "id", "identifier")
MAGNITUDES = ("vmag", "v", "mag", "magnitude", "hpmag", "vtmag", "gmag")
DATES = ("utc", "tt_jd", "jd", "mjd", "date", "date_obs", "date-obs", "time", "moment", "epoch")
"""Names by which columns are known, in order of preference."""
PRECESSION_ARCSEC = 50.3
"""A year's precession in longitude."""
DEEPEST = 9
"""Decimals beyond which a number is taken to be unrounded."""
_NUMBER = re.compile(r"\d+(?:\.\d*)?|\.\d+", re.ASCII)
_FACTORS = {"h": 15.0, "hr": 15.0, "hour": 15.0, "hourangle": 15.0, "rad": 180.0 / np.pi, "arcsec": 1.0 / 3600.0}


def half_digit_deg(column: Column, *, hours: bool = False) -> float:
    """Return half the last digit of a column of angles, in degrees; `hours` where sexagesimal text counts hours.

    The finest row decides: trailing zeros are lost in numbers.
    """
    unit = column.unit.strip().casefold()
    if column.is_text:
        halves = []
        for cell in column.values[:2000].tolist():
            parts = _NUMBER.findall(cell)
            if parts:
                halves.append(0.5 * 10.0 ** -len(parts[-1].partition(".")[2]) / 60.0 ** (len(parts) - 1))
        if not halves:
            raise TableError(f"column '{column.name}': holds no angles, so its rounding is not known; give --rounding")
        timed = hours or "h" in unit or any("h" in cell.casefold() for cell in column.values[:20].tolist())
        return min(halves) * (15.0 if timed else 1.0)
    values = column.values[np.isfinite(column.values)][:2000].astype(np.float64)
    for decimals in range(DEEPEST + 1):
        scaled = values * 10.0**decimals
        if np.all(np.abs(scaled - np.rint(scaled)) < 1e-5 + 1e-14 * np.abs(scaled)):
            return 0.5 * 10.0**-decimals * _FACTORS.get(unit, 1.0)
    return 0.5 * 10.0**-DEEPEST * _FACTORS.get(unit, 1.0)


def pick(table: Table, name: str | None, known: tuple[str, ...]) -> Column | None:
    """Return the column named, else the first of the known names that is there, else None."""
    if name is not None:
        return table.column(name)
    for candidate in known:
        if (found := table.find(candidate)) is not None:
            return found
    return None


def star_rows(column: Column) -> tuple[Int, tuple[str, ...]]:
    """Return the catalogue rows (n,) of a column of identifiers, −1 where one is in no list, with the reasons."""
    values = column.values
    if not column.is_text:
        by_gaia = column.name.casefold() in ("gaia", "source_id")
        rows, numbers = catalogue().gaia if by_gaia else catalogue().hip
        wanted = np.where(np.isfinite(values), values, 0).astype(np.int64)
        order = np.argsort(numbers, kind="stable")
        place = np.searchsorted(numbers[order], wanted)
        place[place == len(order)] = 0
        hit = (numbers[order][place] == wanted) & (wanted > 0)
        return np.where(hit, rows[order][place].astype(np.int64), -1), ()
    prefix = {"hip": "HIP ", "hipparcos": "HIP ", "tyc": "TYC ", "tycho": "TYC "}.get(column.name.casefold(), "")
    found = np.full(len(values), -1, dtype=np.int64)
    reasons = []
    for at, cell in enumerate(values.tolist()):
        text = cell if not prefix or not cell[:1].isdigit() else prefix + cell
        try:
            found[at] = names.find(text)
        except ColureError as fault:
            reasons.append(f"row {at + 1}: {fault}")
    return found, tuple(reasons)


def moments(column: Column) -> Moment:
    """Return the moments (n,) of a column of dates: text as everywhere, numbers as JD or MJD by their name or size."""
    if not column.is_text:
        values = column.values.astype(np.float64)
        if not np.all(np.isfinite(values)):
            bad = int(np.flatnonzero(~np.isfinite(values))[0]) + 1
            raise TableError(f"column '{column.name}', row {bad}: no date")
        scale = "TT" if "tt" in column.name.casefold() else "TDB" if "tdb" in column.name.casefold() else "UTC"
        whole = np.floor(values)
        if np.all(values < 1e6):
            return Moment.from_jd(whole + 2400000.5, values - whole, scale)
        return Moment.from_jd(whole, values - whole, scale)
    each = []
    for at, cell in enumerate(column.values.tolist()):
        try:
            each.append(Moment.parse(cell))
        except ColureError as fault:
            raise TableError(f"column '{column.name}', row {at + 1}: {fault}") from None
    return Moment(np.array([one.tt1 for one in each]), np.array([one.tt2 for one in each]), each[0].scale)


def date_table(
    read: Positions,
    *,
    identifiers: str | None = None,
    magnitudes: str | None = None,
    half_arcsec: float | None = None,
) -> tuple[TableFit, tuple[str, ...]]:
    """Return what a star table is, and remarks.

    Stars are known by a column of identifiers where there is one in which most rows are found, else by position.
    """
    column = pick(read.table, identifiers, IDENTIFIERS)
    notes: list[str] = []
    if half_arcsec is None:
        half_arcsec = 3600.0 * half_digit_deg(read.table.column(read.lat_name))
    if column is not None:
        rows, reasons = star_rows(column)
        share = float((rows >= 0).mean()) if len(rows) else 0.0
        if share >= 0.5 or identifiers is not None:
            notes += [f"column '{column.name}': {int((rows >= 0).sum())} of {len(rows)} stars known", *reasons[:5]]
            if len(reasons) > 5:
                notes.append(f"… and {len(reasons) - 5} more")
            found = fit_identified(read.lon_deg, read.lat_deg, rows, half_arcsec=half_arcsec)
            return found, (*notes, *_cut_off(read, found))
        notes.append(f"column '{column.name}': {share:.0%} of its entries are stars known here; matched by position")
    bright = pick(read.table, magnitudes, MAGNITUDES)
    vmag: Float | None = None
    if bright is not None and not bright.is_text:
        vmag = bright.values.astype(np.float64)
        notes.append(f"column '{bright.name}' taken for magnitudes: rows fainter than 11 are left out of the matching")
    found = fit_unidentified(read.lon_deg, read.lat_deg, vmag=vmag, half_arcsec=half_arcsec)
    met: Bool = found.rows >= 0
    notes.append(f"{int(met.sum())} of {len(met)} rows meet a star by position")
    return found, (*notes, *_cut_off(read, found))


def _cut_off(read: Positions, found: TableFit) -> tuple[str, ...]:
    """Return a remark where digits that were cut off, not rounded, would move the equinox by more than its σ."""
    years = 3600.0 * half_digit_deg(read.table.column(read.lon_name)) / PRECESSION_ARCSEC
    if years < 2.0 * found.best.sigma:
        return ()
    return (f"if the longitudes were cut off at their last digit, not rounded, the equinox is {years:.2g} yr later",)

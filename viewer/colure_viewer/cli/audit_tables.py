"""What `colure audit` says of tables: stars of unknown equinox, and positions of one body at many moments."""

from typing import Any

import click
import numpy as np

from colure import audit
from colure.angles import MINUS
from colure.audit import Stars, TableFit
from colure.errors import MomentError
from colure.frames import Frame
from colure_viewer.cli.audit_answers import (
    Asked,
    Found,
    exit_code,
    heading,
    held_against,
    offset_text,
    question_of,
    records_of,
    size_text,
    worded,
)
from colure_viewer.cli.output import Answer


def table(asked: Asked) -> Found:
    """Return the exit code and the answer on a table of stars, or of a body's positions."""
    from colure.tables import read_positions

    assert asked.table is not None
    equatorial = asked.claim is None or Frame.parse(asked.claim).is_equatorial
    read = read_positions(
        asked.table, lon=asked.lon_name, lat=asked.lat_name, equatorial=equatorial, skip_bad=asked.skip_bad
    )
    for line in (*read.notes, *read.rejected):
        click.echo(f"colure: {asked.table}: {line}", err=True)
    if asked.against is not None:
        return _body_table(asked, read)
    half = asked.rounding
    fit, notes = audit.date_table(read, identifiers=asked.id_name, magnitudes=asked.mag_name, half_arcsec=half)
    records = _fit_records(fit, asked)
    if asked.at is None:
        return 0, Answer(records, lambda: _fit_text(fit, asked, notes))
    # With a moment the stars that agree can be reduced: place and equinox of date are told apart as well.
    known = np.flatnonzero(fit.good)
    numbers = _table_numbers(asked, read).take(known)
    whole = audit.ask(numbers, question_of(asked, Stars.of_ids(fit.rows[known]), asked.moment))
    head = f"{heading(whole, asked)} · {len(numbers)} rows together"
    return 0, Answer(
        [*records, *records_of(whole, asked)], lambda: f"{_fit_text(fit, asked, notes)}\n\n{worded(whole, asked, head)}"
    )


def _table_numbers(asked: Asked, read: Any) -> Any:
    """Return the positions of a table with the rounding of its digits, or the one given."""
    if asked.rounding is not None:
        return audit.Numbers.of(read.lon_deg, read.lat_deg, asked.rounding / 3600.0, asked.rounding / 3600.0)
    half_x = audit.half_digit_deg(read.table.column(read.lon_name))
    half_y = audit.half_digit_deg(read.table.column(read.lat_name))
    return audit.Numbers.of(read.lon_deg, read.lat_deg, half_x, half_y)


def _body_table(asked: Asked, read: Any) -> Found:
    """Explain the positions of one body at many moments together."""
    from colure.audit.tablefile import DATES, pick

    column = pick(read.table, asked.time_name, DATES)
    if column is None and asked.at is None:
        raise MomentError(f"table '{asked.table}': no column of moments is known by its name; name it with --time")
    moment = audit.moments(column) if column is not None else asked.moment
    numbers = _table_numbers(asked, read)
    found = audit.ask(numbers, question_of(asked, held_against(asked, moment), moment))
    head = heading(found, asked) + f" · {len(numbers)} rows together"
    return exit_code(found), Answer(records_of(found, asked), lambda: worded(found, asked, head))


def _fit_records(fit: TableFit, asked: Asked) -> list[dict[str, Any]]:
    outliers = (np.flatnonzero((fit.rows >= 0) & ~fit.good) + 1).tolist()
    return [
        {
            "rank": rank,
            "frame": model.frame,
            "kind": model.kind,
            "equinox": model.year,
            "equinox_sigma": model.sigma,
            "epoch": fit.epoch,
            "epoch_sigma": fit.epoch_sigma,
            "rows": len(fit.rows),
            "matched": int((fit.rows >= 0).sum()),
            "agreeing": int(fit.good.sum()),
            "sigma_arcsec": model.sigma_row_arcsec,
            "left_x_arcsec": model.left_arcsec[0],
            "left_y_arcsec": model.left_arcsec[1],
            "left_z_arcsec": model.left_arcsec[2],
            "obliquity_error_arcsec": fit.obliquity_arcsec,
            "obliquity_error_sigma_arcsec": fit.obliquity_sigma_arcsec,
            "cost": model.cost,
            "disagreeing_rows": outliers if rank == 1 else [],
            "mend": f"colure convert --table {asked.table} --from {model.frame} --to {asked.claim or 'icrs'}",
        }
        for rank, model in enumerate(fit.models, 1)
    ]


def _fit_text(fit: TableFit, asked: Asked, notes: tuple[str, ...]) -> str:
    best = fit.best
    lines = [f"{asked.table} · {len(fit.rows)} rows", *notes]
    letter = "B" if best.kind == "fk4" else "J"
    plane = {"fk4": "FK4 mean equator", "equator": "mean equator", "ecliptic": "mean ecliptic"}[best.kind]
    lines.append(f"equinox {letter}{_pm(best.year, best.sigma)} ({plane} and equinox), as {best.frame}")
    for other in fit.models[1:]:
        apart = other.cost - best.cost
        said = "these rows cannot tell the two apart" if apart < audit.SURE_COST else "fits worse"
        lines.append(f"or {other.frame} ({_pm(other.year, other.sigma)}): {said} (Δχ² {apart:.1f})")
    agree = f"{int(fit.good.sum())} of {int((fit.rows >= 0).sum())} stars agree"
    lines.append(f"{agree}, scatter {size_text(fit.sigma_arcsec)} in a coordinate")
    left = ", ".join(
        f"{axis} {offset_text(value)} ± {size_text(sigma)}"
        for axis, value, sigma in zip("xyz", best.left_arcsec, best.left_sigma_arcsec, strict=True)
    )
    lines.append(f"turn that no equinox explains, about the table's axes: {left}")
    if np.isfinite(fit.obliquity_arcsec):
        error = f"{offset_text(fit.obliquity_arcsec)} ± {size_text(fit.obliquity_sigma_arcsec)}"
        lines.append(f"error of the obliquity that the table implies: {error}")
    if np.isfinite(fit.epoch_sigma):
        lines.append(f"mean epoch of the places by proper motion: {_pm(fit.epoch, fit.epoch_sigma)}")
    bad = np.flatnonzero((fit.rows >= 0) & ~fit.good) + 1
    if len(bad):
        shown = ", ".join(map(str, bad[:20])) + (f" … {len(bad)} in all" if len(bad) > 20 else "")
        lines.append(f"rows that do not agree with their star: {shown}")
    lines.append(f"mend: colure convert --table {asked.table} --from {best.frame} --to {asked.claim or 'icrs'}")
    return "\n".join(lines)


def _pm(value: float, sigma: float) -> str:
    decimals = 4 if sigma < 1e-3 else 3 if sigma < 0.01 else 2 if sigma < 0.1 else 1 if sigma < 2.0 else 0
    return f"{value:.{decimals}f} ± {sigma:.{decimals}f}".replace("-", MINUS)

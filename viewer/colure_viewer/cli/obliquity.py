"""`colure obliquity`: the mean and true obliquity of given years by one model or by all."""

from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import Command
from colure_viewer.cli.output import Answer, aligned, output_options


@click.command(cls=Command)
@click.argument("years", metavar="YEAR…", nargs=-1, required=True)
@click.option("--model", default="auto", show_default=True, help="A model's name, `auto`, or `all`.")
@output_options
def command(years: tuple[str, ...], model: str, form: str, output: Path | None) -> None:
    """Print the obliquity of the ecliptic for Julian epoch YEARs (astronomical numbering; there is a year 0).

    The true obliquity adds the nutation, as far from now as its series is taken to hold. ± is how far the models that
    cover a year differ from the one given.
    """
    records = [record for year in years for record in _records(year, model)]
    Answer(records, lambda: _text(records)).emit(form, output)


def _records(text: str, model: str) -> list[dict[str, Any]]:
    import math

    from colure import obliquity, precession
    from colure.arrays import ARCSEC, DEG
    from colure.errors import MomentError, SpanError

    try:
        year = float(text)
    except ValueError:
        year = math.nan
    if not math.isfinite(year):
        raise MomentError(f"year '{text}': not a number; expected a Julian epoch year such as 2026.5 or -1200")
    at = obliquity.at_years(year)
    if model == "all":
        names = [name for name, one in obliquity.MODELS.items() if one.span[0] <= year <= one.span[1]]
        if not names:
            reach = max(obliquity.MODELS.values(), key=lambda one: one.span[1] - one.span[0])
            raise SpanError(
                f"year {year:g}: outside every model; {reach.name} reaches {reach.span[0]:g} to {reach.span[1]:g}"
            )
    else:
        names = [obliquity.check_model(model)]
    found = []
    for name in names:
        mean = float(obliquity.mean(at, name))
        try:
            true: float | None = float(obliquity.true(at, name)) / DEG
        except SpanError:
            true = None  # the nutation series ends before the precession model does
        found.append(
            {
                "year": year,
                "model": precession.model_at(at) if name == "auto" else name,
                "kind": "default" if name == "auto" else "by name",
                "obliquity_deg": mean / DEG,
                "true_obliquity_deg": true,
                "uncertainty_arcsec": float(obliquity.disagreement(year, name)) / ARCSEC,
            }
        )
    return found


def _text(records: list[dict[str, Any]]) -> str:
    from colure.angles import format_dms, format_number

    rows = [
        (
            format_number(record["year"], 0 if record["year"] == round(record["year"]) else 2),
            record["model"],
            format_dms(record["obliquity_deg"], 3, plus=False),
            "—" if record["true_obliquity_deg"] is None else format_dms(record["true_obliquity_deg"], 3, plus=False),
            f"± {record['uncertainty_arcsec']:.3f}″",
        )
        for record in records
    ]
    table = aligned(("year", "model", "mean obliquity", "true obliquity", "models differ by"), rows, left=(1,))
    return f"Obliquity of the ecliptic, Julian epoch years (TT)\n{table}"

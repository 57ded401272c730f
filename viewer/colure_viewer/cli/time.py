"""`colure time`: one moment in every scale and both calendars, with ΔT and the sidereal times."""

from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import Command
from colure_viewer.cli.output import Answer, moment_keys, output_options, pairs

HOUR = 3600.0


@click.command(cls=Command)
@click.argument("moment")
@click.option("--site", help="For local sidereal time: a name, an MPC code, or `LON LAT HEIGHT`.")
@output_options
def command(moment: str, site: str | None, form: str, output: Path | None) -> None:
    """Print MOMENT in every time scale, as Julian dates and in both calendars, with ΔT and sidereal times."""
    record = _record(moment, site)
    Answer([record], lambda: _text(record)).emit(form, output)


def _record(text: str, site_text: str | None) -> dict[str, Any]:
    import numpy as np

    from colure import bodies, sidereal
    from colure.arrays import DEG
    from colure.errors import SpanError
    from colure.moment import Moment
    from colure.sites import Site

    moment = Moment.parse(text)
    site = Site.parse(site_text) if site_text else None
    tdb1, tdb2 = moment.tdb
    record: dict[str, Any] = {
        **moment_keys(moment),
        "ut1": moment.isot("UT1"),
        "tt": moment.isot("TT"),
        "tdb": moment.isot("TDB"),
        "tdb_jd": float(tdb1) + float(tdb2),
        "delta_t_sigma_s": float(moment.delta_t_sigma_s),
        "year": float(moment.julian_year),
        "gregorian": moment.with_scale(moment.shown_scale, "gregorian").isot(),
        "julian": moment.with_scale(moment.shown_scale, "julian").isot(),
        "scale": moment.shown_scale,
        "gmst_deg": float(sidereal.gmst(moment)) / DEG,
        "gast_deg": float(sidereal.gast(moment)) / DEG,
        "era_deg": float(sidereal.era(moment)) / DEG,
        "equation_of_origins_arcsec": float(sidereal.equation_of_origins(moment)) / DEG * HOUR,
    }
    try:
        record["equation_of_time_s"] = float(np.asarray(bodies.equation_of_time(moment)))
    except SpanError:
        record["equation_of_time_s"] = None  # the Sun's table ends before the time scales do
    if site is not None:
        record["site"] = str(site)
        record["last_deg"] = float(sidereal.local(moment, site)) / DEG
    return record


def _text(record: dict[str, Any]) -> str:
    from colure.angles import format_hms, format_number

    sigma = record["delta_t_sigma_s"]
    decimals = 3 if sigma < 0.05 else 1 if sigma < 5 else 0
    equation = record["equation_of_time_s"]
    rows = [
        ("UTC", record["utc"] or "not defined here (from 1972 to the end of the shipped IERS table)"),
        ("UT1", record["ut1"]),
        ("TT", record["tt"]),
        ("TDB", record["tdb"]),
        ("JD (TT)", f"{record['tt_jd']:.8f}"),
        ("JD (UT1)", f"{record['ut1_jd']:.8f}"),
        ("MJD (TT)", f"{record['tt_jd'] - 2400000.5:.8f}"),
        ("Julian epoch", f"J{record['year']:.6f}"),
        ("Gregorian", f"{record['gregorian']} {record['scale']}"),
        ("Julian", f"{record['julian']} {record['scale']} (Julian calendar)"),
        ("ΔT = TT − UT1", f"{format_number(record['delta_t_s'], decimals)} s ± {sigma:.{max(decimals, 1)}f} s"),
        ("sidereal, mean", f"{format_hms(record['gmst_deg'], 4)} at Greenwich"),
        ("sidereal, apparent", f"{format_hms(record['gast_deg'], 4)} at Greenwich"),
        ("rotation angle", f"{record['era_deg']:.7f}°"),
        ("origins", f"{format_number(record['equation_of_origins_arcsec'], 3)}″"),
        (
            "equation of time",
            "beyond the ephemeris"
            if equation is None
            else f"{format_number(equation, 1, plus=True)} s (apparent − mean)",
        ),
    ]
    if "last_deg" in record:
        rows.append(("local sidereal", f"{format_hms(record['last_deg'], 4)} apparent, {record['site']}"))
    return pairs(rows)

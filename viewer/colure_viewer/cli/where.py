"""`colure where`: the places of bodies at one moment or many, with what is to be said of their light and motion."""

from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import Command
from colure_viewer.cli.output import Answer, aligned, output_options

ORIGINS = ("earth", "sun", "ssb", "emb", "site")
MOST_RECORDS = 2_000_000


@click.command(cls=Command)
@click.argument("bodies", metavar="BODY…", nargs=-1, required=True)
@click.option("--at", "at", default="now", show_default=True, help="The moment, or the first of a span.")
@click.option("--until", help="The last moment of a span; needs --step.")
@click.option("--step", help="A number and a unit: s, min, h, d, sidereal-d, month, yr, century.")
@click.option("--site", help="A name, an MPC code, or `LON LAT HEIGHT`; makes the site the origin.")
@click.option("--origin", type=click.Choice(ORIGINS), help="Where it is seen from.  [default: earth, or the site]")
@click.option("--frame", default="icrs", show_default=True, help="PLANE[/KIND][/EQUINOX][@MODEL]")
@click.option(
    "--place",
    type=click.Choice(("geometric", "astrometric", "apparent", "observed")),
    help="How far it is reduced.  [default: astrometric; apparent in a frame of date; observed in `horizon`]",
)
@click.option(
    "--kernel", type=click.Path(path_type=Path), help="A DE kernel file (SPK) in place of the shipped tables."
)
@click.option("--no-polar-motion", is_flag=True, help="Leave out polar motion at a site.")
@output_options
def command(
    bodies: tuple[str, ...],
    at: str,
    until: str | None,
    step: str | None,
    site: str | None,
    origin: str | None,
    frame: str,
    place: str | None,
    kernel: Path | None,
    no_polar_motion: bool,
    form: str,
    output: Path | None,
) -> None:
    """Print where each BODY is.

    Bodies: sun moon mercury venus earth mars jupiter saturn uranus neptune pluto emb, or `all`. Mars to Pluto are the
    barycentres of their systems.
    """
    from colure import bodies as core
    from colure.ephemeris import open_kernel
    from colure.errors import BodyError, MomentError, SiteError
    from colure.moment import Moment
    from colure.session import DEMO_BODIES
    from colure.sites import Site

    if (until is None) != (step is None):
        raise MomentError("--until and --step: one was given without the other; a span needs both")
    start = Moment.parse(at)
    moment = start if until is None or step is None else Moment.range(start, Moment.parse(until), step)
    names = tuple(dict.fromkeys(one for name in bodies for one in (DEMO_BODIES if name == "all" else (name.lower(),))))
    if len(names) * max(moment.size, 1) > MOST_RECORDS:
        raise BodyError(f"{len(names)} bodies at {moment.size} moments: at most {MOST_RECORDS} records can be printed")
    where = Site.parse(site) if site else None
    if origin == "site" and where is None:
        raise SiteError("--origin site: no --site was given")
    if where is not None and origin not in (None, "site") and frame != "horizon":
        raise SiteError(f"--site {site} and --origin {origin}: contradictory; leave one out")
    answer = core.facts(
        names,
        moment,
        site=where,
        frame=frame,
        place=place,
        origin=origin,
        ephemeris=open_kernel(kernel) if kernel else None,
        polar_motion=not no_polar_motion,
    )
    records = _records(core.records(answer), moment, where, len(names))
    Answer(records, lambda: _text(records, moment, where)).emit(form, output)


def _records(rows: list[dict[str, Any]], moment: Any, site: Any, count: int) -> list[dict[str, Any]]:
    """Put the keys of the moment before those of the body, moments outermost."""
    import numpy as np

    size = max(moment.size, 1)
    flat = np.ravel

    def column(values: Any) -> Any:
        return np.broadcast_to(flat(values), (size,))

    defined = column(moment.has_utc)
    utc = [
        str(moment[at].isot("UTC") if moment.shape else moment.isot("UTC")) if defined[at] else None
        for at in range(size)
    ]
    tt, delta = column(moment.jd_tt), column(moment.delta_t_s)
    ut1 = column(np.asarray(moment.ut1[0]) + np.asarray(moment.ut1[1]))
    calendar = column(moment.calendar_used)
    found = []
    for at in range(size):
        for body in range(count):
            row = rows[body * size + at]
            dated = {
                "body": row["body"],
                "utc": utc[at],
                "tt_jd": float(tt[at]),
                "ut1_jd": float(ut1[at]),
                "delta_t_s": float(delta[at]),
                "calendar": str(calendar[at]),
            }
            if site is not None:
                dated["site"] = str(site)
            found.append({**dated, **{key: value for key, value in row.items() if key != "tt_jd"}})
    return found


def _text(records: list[dict[str, Any]], moment: Any, site: Any) -> str:
    import numpy as np

    from colure.angles import format_number
    from colure.frames import Frame

    first = records[0]
    frame = Frame.parse(first["frame"])
    from_where = str(site) if first["origin"] == "site" else first["origin"]
    sources = ", ".join(dict.fromkeys(record["ephemeris"] for record in records))
    head = [f"{frame.label()} ({frame}) · place {first['place']} · origin {from_where} · {sources}"]
    size = max(moment.size, 1)
    texts = np.ravel(moment.text())
    if size == 1:
        head.append(f"{texts[0]} · ΔT {format_number(first['delta_t_s'], 2)} s")
    count = len(records) // size
    longitude = (
        "α" if frame.is_equatorial else "A" if frame.plane == "horizon" else "λ" if frame.plane == "ecliptic" else "l"
    )
    latitude = {"α": "δ", "A": "altitude", "λ": "β", "l": "b"}[longitude]
    header = ["body", longitude, latitude, "±", "Δ au", "mag", "size", "lit", "elongation", "motion /h", "PA", "in"]
    if site is not None and frame.plane != "horizon":
        header += ["altitude", "azimuth"]
    if size > 1:
        header.insert(0, "moment")
    rows = []
    for at, record in enumerate(records):
        row = _cells(record, frame.is_equatorial)
        if "altitude" in header[-2:]:
            row += [_degrees(record.get("altitude_deg"), 2, plus=True), _degrees(record.get("azimuth_deg"), 2)]
        rows.append([str(texts[at // count]), *row] if size > 1 else row)
    table = aligned(header, rows, left=(0, 1) if size > 1 else (0,))
    tail = [f"{record['body']}: {record['magnitude_note']}" for record in records[:count] if record["magnitude_note"]]
    near = sorted({record["body"] for record in records if record.get("caution") and record["body"] != "sun"})
    if any(record["body"] == "sun" for record in records) and first["origin"] in ("earth", "site", "emb"):
        near.append("the Sun itself")
    if near:
        tail.append(
            f"CAUTION: within 20° of the Sun: {', '.join(near)}. Pointing optics near the Sun injures eyes and"
            " instruments; follow the rules of your site."
        )
    return "\n".join([*head, table, *tail])


def _degrees(value: float | None, decimals: int, *, plus: bool = False) -> str:
    from colure.angles import format_degrees

    return "—" if value is None else format_degrees(value, decimals, plus=plus)


def _cells(record: dict[str, Any], equatorial: bool) -> list[str]:
    from colure.angles import format_dms, format_hms, format_number

    doubt = record["uncertainty_arcsec"]
    decimals = 2 if doubt < 0.1 else 1 if doubt < 1 else 0
    lon = (
        format_hms(record["lon_deg"], decimals + 1)
        if equatorial
        else format_dms(record["lon_deg"], decimals, longitude=True)
    )
    motion = (record["rate_lon_arcsec_h"] ** 2 + record["rate_lat_arcsec_h"] ** 2) ** 0.5
    size = record["diameter_arcsec"]
    return [
        record["body"],
        lon,
        format_dms(record["lat_deg"], decimals),
        f"{doubt:.2f}″" if doubt < 10 else f"{doubt:.0f}″",
        f"{record['distance_au']:.7f}",
        format_number(record["magnitude"], 2),
        f"{size:.1f}″" if size == size else "—",
        format_number(record["illuminated"], 3),
        _degrees(record["elongation_deg"], 1, plus=True),
        f"{motion:.1f}″",
        _degrees(record["pa_deg"], 0),
        str(record["constellation"]),
    ]

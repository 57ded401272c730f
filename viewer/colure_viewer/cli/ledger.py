"""`colure ledger`: every step of one direction's reduction, or the same direction in every frame."""

from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import MINUS, Command
from colure_viewer.cli.output import Answer, aligned, output_options

ORIGINS = ("earth", "sun", "ssb", "emb", "site")
PLACES = ("geometric", "astrometric", "apparent", "observed")


def _number(ctx: click.Context, param: click.Parameter, value: Any) -> Any:
    """Return the finite number, or numbers, of an option: several values may begin with either minus sign."""
    if value is None:
        return None
    if isinstance(value, tuple):
        return tuple(_number(ctx, param, one) for one in value)
    try:
        found = float(value.replace(MINUS, "-"))
    except ValueError:
        found = float("nan")
    if found - found != 0.0:
        raise click.BadParameter(f"'{value}' is not a finite number", ctx, param)
    return found


@click.command(cls=Command)
@click.argument("target", metavar="TARGET")
@click.option("--at", "at", default="now", show_default=True, help="The moment.")
@click.option("--site", help="A name, an MPC code, or `LON LAT HEIGHT`; makes the site the origin.")
@click.option("--origin", type=click.Choice(ORIGINS), help="Where it is seen from.  [default: earth, or the site]")
@click.option("--frame", default="icrs", show_default=True, help="Where it leads: PLANE[/KIND][/EQUINOX][@MODEL]")
@click.option(
    "--place",
    type=click.Choice(PLACES),
    help="How far it is reduced.  [default: astrometric; apparent in a frame of date; observed in `horizon`]",
)
@click.option("--from", "source", default="icrs", show_default=True, help="The frame of a position typed without one.")
@click.option("--epoch", help="The epoch of a position, such as J2016.0 or B1950.  [default: its equinox, or J2000]")
@click.option(
    "--pm", nargs=2, callback=_number, metavar="LON LAT", help="Proper motion, mas/yr; longitude's times cos lat."
)
@click.option("--parallax", callback=_number, help="Parallax of a position, mas.")
@click.option("--rv", callback=_number, help="Radial velocity of a position, km/s, positive away.")
@click.option(
    "--covariance",
    metavar="NUMBERS",
    help="Upper triangle by rows, mas and mas/yr: lon, lat (3 numbers); with motions (10); lon, lat, parallax, motions"
    " (15); with the radial velocity (21).",
)
@click.option("--seen", type=click.Choice(PLACES), help="The place at which a position was read.  [astrometric]")
@click.option("--omit", multiple=True, metavar="STEP", help="Leave a step out; may be given several times.")
@click.option("--matrices", is_flag=True, help="Print the matrices of the turns as well.")
@click.option("--every-frame", is_flag=True, help="Print the end in every frame instead of the steps.")
@click.option("--against", metavar="FRAME", help="The frame that --every-frame compares with.  [default: --frame]")
@click.option("--pa", callback=_number, help="A position angle from the north of --against, carried by --every-frame.")
@click.option("--kernel", type=click.Path(path_type=Path), help="A DE kernel file (SPK) in place of the tables.")
@click.option("--no-polar-motion", is_flag=True, help="Leave out polar motion at a site.")
@output_options
def command(
    target: str,
    at: str,
    site: str | None,
    origin: str | None,
    frame: str,
    place: str | None,
    source: str,
    epoch: str | None,
    pm: tuple[float, float] | None,
    parallax: float | None,
    rv: float | None,
    covariance: str | None,
    seen: str | None,
    omit: tuple[str, ...],
    matrices: bool,
    every_frame: bool,
    against: str | None,
    pa: float | None,
    kernel: Path | None,
    no_polar_motion: bool,
    form: str,
    output: Path | None,
) -> None:
    """Print the steps that lead TARGET to a place and a frame, each with its size, direction, model and 1σ.

    TARGET is a body, a star (by name, HIP, TYC or Gaia DR3 number), an object, or a position in one pair of quotes:
    "LON LAT" in the frame of --from, or "FRAME LON LAT".
    """
    from colure import ledger
    from colure.ephemeris import open_kernel
    from colure.errors import FrameError, SiteError
    from colure.moment import Moment
    from colure.reduction import Observer
    from colure.sites import Site

    where = Site.parse(site) if site else None
    if origin == "site" and where is None:
        raise SiteError("--origin site: no --site was given")
    if where is not None and origin not in (None, "site"):
        raise SiteError(f"--site {site} and --origin {origin}: contradictory; leave one out")
    if (against is not None or pa is not None) and not every_frame:
        raise FrameError(f"--{'against' if against else 'pa'}: belongs to --every-frame, which was not given")
    moment = Moment.parse(at)
    observer = Observer(origin or ("earth" if where is None else "site"), where, not no_polar_motion)
    moves = (pm, parallax, rv) != (None, None, None)
    east, north = pm or (0.0, 0.0)

    def at_moment(when: Any) -> Any:
        return ledger.of(
            target,
            when,
            source_frame=source,
            epoch=_epoch(epoch),
            motion=ledger.Motion(east, north, parallax or 0.0, rv or 0.0) if moves else None,
            covariance=None if covariance is None else ledger.upper(_numbers(covariance)),
            seen=seen,
            observer=observer,
            place=place,
            frame=frame,
            omitted=omit,
            ephemeris=open_kernel(kernel) if kernel else None,
        )

    found = at_moment(moment)
    if every_frame:
        ahead = at_moment(moment.shifted(1.0 / 1440.0)).direction if found.kind == "body" else None
        _table(found, ahead, against or frame, pa).emit(form, output)
        return
    records = ledger.full_records(found, matrices=matrices)
    Answer(records, lambda: ledger.as_text(found, matrices=matrices)).emit(form, output)


def _epoch(text: str | None) -> Any:
    """Return the moment of an epoch; a bare year is a Julian one."""
    from colure.moment import Moment

    if text is None:
        return None
    plain = text.strip().replace(MINUS, "-")
    try:
        year = float(plain)
    except ValueError:
        return Moment.parse(plain)
    return Moment.parse(f"J{year!r}") if year == year else Moment.parse(plain)


def _numbers(text: str) -> tuple[float, ...]:
    from colure.errors import ColureError

    found = []
    for word in text.replace(",", " ").split():
        try:
            found.append(float(word))
        except ValueError:
            raise ColureError(f"--covariance: '{word}' is not a number") from None
    return tuple(found)


def _table(found: Any, ahead: Any, against: str, pa: float | None) -> Answer:
    """Return the end of a ledger in every frame, with the differences from one of them."""
    from dataclasses import asdict

    from colure import everyframe
    from colure.errors import FrameError
    from colure.frames import Frame
    from colure.ledger.printing import heading

    chosen = Frame.parse(against)
    site, moment, direction = found.observer.site, found.moment, found.direction
    also = (str(chosen), found.frame)
    motion = None if ahead is None else ahead - direction
    rows = everyframe.table(direction, moment, site=site, sigma_arcsec=max(found.uncertainty_arcsec, 1e-4), also=also)
    off = everyframe.differences(direction, moment, chosen, site=site, motion=motion, also=also)
    try:
        among = tuple(row.frame for row in rows)
        turns = everyframe.norths(direction, moment, pa_deg=pa or 0.0, source=chosen, site=site, among=among)
    except FrameError:
        if pa is not None:
            raise
        turns = ()
    common = heading(found) | {"against": str(chosen)}
    records = []
    for number, (row, difference) in enumerate(zip(rows, off, strict=True)):
        record = {**common, "frame": row.frame, "lon_deg": row.lon_deg, "lat_deg": row.lat_deg}
        record |= {key: value for key, value in asdict(difference).items() if key.endswith("_arcsec")}
        record["shift_pa_deg"] = difference.pa_deg
        record["north_deg"] = turns[number].turn_deg if turns else None
        if pa is not None:
            record["pa_deg"] = turns[number].pa_deg
        record["fault"] = row.fault
        records.append(record)
    return Answer(records, lambda: _table_text(found, rows, off, turns, chosen, pa))


def _table_text(found: Any, rows: Any, off: Any, turns: Any, chosen: Any, pa: float | None) -> str:
    from colure.angles import UNKNOWN, format_degrees
    from colure.ledger.printing import size_text

    def shift(value: float) -> str:
        return UNKNOWN if value != value else ("−" if value < 0.0 else "+") + size_text(abs(value), 1e-3)

    header = ["frame", "longitude", "latitude", "Δlon cos lat", "Δlat", "Δα cos δ", "Δδ", "Δλ cos β", "Δβ", "north at"]
    moving = any(one.along_arcsec == one.along_arcsec for one in off)
    if moving:
        header += ["along", "across"]
    if pa is not None:
        header.append("PA")
    lines = []
    for number, (row, one) in enumerate(zip(rows, off, strict=True)):
        cells = [row.frame, f"{row.lon_name} {row.lon_text}", f"{row.lat_name} {row.lat_text}"]
        parts = (one.dlon_arcsec, one.dlat_arcsec, one.dra_arcsec, one.ddec_arcsec, one.dlam_arcsec, one.dbeta_arcsec)
        cells += [shift(value) for value in parts]
        north = turns[number].turn_deg if turns else float("nan")
        cells.append(UNKNOWN if north != north else format_degrees(round(north, 3) % 360.0, 3))
        if moving:
            cells += [shift(one.along_arcsec), shift(one.across_arcsec)]
        if pa is not None:
            angle = turns[number].pa_deg
            cells.append(UNKNOWN if angle != angle else format_degrees(round(angle, 3) % 360.0, 3))
        lines.append(cells)
    seen_from = str(found.observer.site) if found.observer.origin == "site" else found.observer.origin
    head = (
        f"{found.target} · {found.place} place · {found.moment.text()} · from {seen_from}\n"
        f"differences: what each row's figures would be off by, read as {chosen.label()} ({chosen})"
    )
    faults = [f"{row.frame}: {row.fault}" for row in rows if row.fault]
    return "\n".join([head, aligned(header, lines), *faults])

"""`colure convert`: one position, or a table of them, carried from one frame to another."""

import sys
from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import Command
from colure_viewer.cli.output import Answer, moment_keys, output_options

ENDINGS = {".csv": "csv", ".ecsv": "ecsv", ".vot": "votable", ".xml": "votable", ".fits": "fits", ".fit": "fits"}


@click.command(cls=Command)
@click.argument("position", metavar="[LON LAT]", required=False)
@click.option("--table", type=click.Path(path_type=Path), help="A table: CSV, ECSV, VOTable or FITS.")
@click.option("--from", "source", required=True, metavar="FRAME", help="The frame that the position is given in.")
@click.option("--to", "target", required=True, metavar="FRAME", help="The frame wanted.")
@click.option("--at", help="The moment; needed by a frame of date.")
@click.option("--site", help="A name, an MPC code, or `LON LAT HEIGHT`; needed by `horizon`.")
@click.option("--epoch", type=float, help="Besselian year of observation of an FK4 position.  [default: its equinox]")
@click.option("--lon", "lon_name", help="The table's column of longitudes.")
@click.option("--lat", "lat_name", help="The table's column of latitudes.")
@click.option("--skip-bad", is_flag=True, help="Take the good rows and list the rejected ones on stderr.")
@output_options
def command(
    position: str | None,
    table: Path | None,
    source: str,
    target: str,
    at: str | None,
    site: str | None,
    epoch: float | None,
    lon_name: str | None,
    lat_name: str | None,
    skip_bad: bool,
    form: str,
    output: Path | None,
) -> None:
    """Carry LON LAT (in one pair of quotes), or a --table, from one frame to another.

    The axes change and nothing else: no proper motion, aberration or refraction is applied. Decimals are degrees; a
    sexagesimal longitude on an equator needs `h` or `°`.
    """
    from colure.errors import AngleError, FrameError, TableError
    from colure.frames import Frame
    from colure.moment import Moment
    from colure.sites import Site

    if (position is None) == (table is None):
        raise AngleError("convert: give one position in quotes, or --table FILE, and not both")
    frames = (Frame.parse(source), Frame.parse(target))
    for frame in frames:
        if frame.needs_moment and at is None:
            raise FrameError(f"frame '{frame}': moves with time; give --at MOMENT")
        if frame.needs_site and site is None:
            raise FrameError(f"frame '{frame}': belongs to a place; give --site")
    if epoch is not None and all(frame.is_rotation for frame in frames):
        raise FrameError(f"--epoch {epoch:g}: only an FK4 position takes an observation epoch; neither frame is FK4")
    job = _Job(*frames, Moment.parse(at) if at else None, Site.parse(site) if site else None, epoch)
    if position is not None:
        record = job.one(position)
        Answer([record], lambda: job.text(record)).emit(form, output)
        return
    assert table is not None
    if output is not None and form == "text":
        form = ENDINGS.get(output.suffix.lower(), "csv")
    elif form == "text":
        form = "csv"
    if form == "fits" and output is None:
        raise TableError("convert: a FITS table is written to a file only; give -o FILE")
    job.table(table, lon_name, lat_name, skip_bad, form, output)


class _Job:
    """A conversion with everything it needs."""

    def __init__(self, source: Any, target: Any, moment: Any, site: Any, epoch: float | None) -> None:
        self.source, self.target, self.moment, self.site, self.epoch = source, target, moment, site, epoch

    def carry(self, lon_deg: Any, lat_deg: Any) -> tuple[Any, Any]:
        from colure import frames
        from colure.arrays import DEG, cartesian, spherical

        vectors = cartesian(lon_deg * DEG, lat_deg * DEG)
        lon, lat = spherical(
            frames.convert(vectors, self.source, self.target, self.moment, self.site, epoch=self.epoch)
        )
        return lon / DEG, lat / DEG

    def echo(self) -> dict[str, Any]:
        """Return the keys that say what was done."""
        echo: dict[str, Any] = {"from_frame": str(self.source), "frame": str(self.target)}
        if self.moment is not None:
            echo |= moment_keys(self.moment)
        if self.site is not None:
            echo["site"] = str(self.site)
        if not (self.source.is_rotation and self.target.is_rotation):
            echo["epoch"] = self.epoch if self.epoch is not None else self._fk4_epoch()
        return echo

    def _fk4_epoch(self) -> float:
        fk4 = self.target if self.source.is_rotation else self.source
        return float(fk4.besselian_year())

    def one(self, position: str) -> dict[str, Any]:
        import numpy as np

        from colure.angles import parse_position

        lon, lat = parse_position(position, equatorial=self.source.is_equatorial)
        new_lon, new_lat = self.carry(np.asarray(lon), np.asarray(lat))
        return {
            **self.echo(),
            "from_lon_deg": lon,
            "from_lat_deg": lat,
            "lon_deg": float(new_lon),
            "lat_deg": float(new_lat),
        }

    def text(self, record: dict[str, Any]) -> str:
        lines = [
            _worded(self.source, record["from_lon_deg"], record["from_lat_deg"]),
            _worded(self.target, record["lon_deg"], record["lat_deg"]),
        ]
        if self.moment is not None:
            lines.append(f"at {self.moment.text()}" + (f", {self.site}" if self.site is not None else ""))
        if "epoch" in record:
            lines.append(f"FK4 position observed at B{record['epoch']:.2f}")
        return "\n".join(lines)

    def table(
        self, path: Path, lon_name: str | None, lat_name: str | None, skip_bad: bool, form: str, output: Path | None
    ) -> None:
        from colure.files import atomic_write
        from colure.tables import dumps, read_positions

        read = read_positions(
            path,
            lon=lon_name,
            lat=lat_name,
            equatorial=self.source.is_equatorial,
            skip_bad=skip_bad,
        )
        for line in (*read.notes, *read.rejected):
            click.echo(f"colure: {path}: {line}", err=True)
        lon, lat = self.carry(read.lon_deg, read.lat_deg)
        table = read.table.with_columns(
            {"lon_deg": (lon, "deg"), "lat_deg": (lat, "deg")}, meta={key: str(v) for key, v in self.echo().items()}
        )
        body = dumps(table, form)
        if output is None:
            sys.stdout.buffer.write(body)
        else:
            atomic_write(output, body)


def _worded(frame: Any, lon_deg: float, lat_deg: float) -> str:
    from colure.angles import format_degrees, format_dms, format_hms

    lon = format_hms(lon_deg, 3) if frame.is_equatorial else format_dms(lon_deg, 2, longitude=True)
    decimals = f"{format_degrees(lon_deg, 6)} {format_degrees(lat_deg, 6, plus=True)}"
    return f"{lon} {format_dms(lat_deg, 2)}   {decimals}   {frame.label()} ({frame})"

"""`colure chart`: a chart of a session, with what the options change, in a PNG, SVG or PDF file."""

import re
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from colure.session import PLACES, PROJECTIONS
from colure_viewer.cli.main import Command
from colure_viewer.themes import THEMES

if TYPE_CHECKING:
    from colure.session import Session

_SIZE = re.compile(r"(\d{2,5})\s*[x×]\s*(\d{2,5})(?:\s*@\s*(\d+(?:\.\d+)?))?\Z")


@click.command(cls=Command)
@click.argument("session", metavar="[SESSION]", required=False)
@click.option("-o", "--output", required=True, type=click.Path(path_type=Path), help="x.png, x.svg or x.pdf")
@click.option("--at", help="The moment.")
@click.option("--site", help="A name, an MPC code, or `LON LAT HEIGHT`.")
@click.option("--centre", help="A body, star or object, or `LON LAT` in --frame.")
@click.option("--frame", help="The frame of --centre and of the grid.  [default: ecliptic/mean/date]")
@click.option("--place", type=click.Choice(PLACES), help="How far every direction on the chart is reduced.")
@click.option("--width", help="The angle across the chart: degrees, or such as 30′.")
@click.option("--projection", type=click.Choice(PROJECTIONS), help="How the sphere is laid on the page.")
@click.option("--up", help="A frame whose north is up, or `zenith`.")
@click.option("--parity", type=click.Choice(("sky", "map")), help="East to the left, or to the right.")
@click.option("--limit", type=float, help="The faintest star drawn.  [default: follows the width]")
@click.option(
    "--circle",
    "circles",
    multiple=True,
    metavar="FRAME[;lat=DEG][;colour=#RRGGBB]",
    help="One more circle; repeatable.",
)
@click.option("--no-circles", is_flag=True, help="Begin with no circle.")
@click.option("--theme", type=click.Choice(tuple(THEMES)), default="paper", show_default=True)
@click.option("--size", default="1600x1000", show_default=True, metavar="WxH[@RATIO]", help="Pixels, and pixel ratio.")
def command(output: Path, size: str, theme: str, **wanted: Any) -> None:
    """Draw a chart of SESSION (a session file; by default the demo) to a file. Needs no display."""
    width, height, ratio = _size(size)
    session = _session(wanted)
    from colure_viewer import export
    from colure_viewer.compose import compose

    export.kind(output)
    export.application()
    chart = compose(session, width, height, ratio)
    export.write(chart.scene, THEMES[theme], output)
    for line in filter(None, (export.remarks(chart.scene),)):
        click.echo(line, err=True)


def _size(text: str) -> tuple[int, int, float]:
    from colure.errors import SessionError

    found = _SIZE.match(text.strip())
    if not found:
        raise SessionError(f"size '{text}': expected WIDTHxHEIGHT in pixels, such as 1600x1000 or 800x600@2")
    width, height, ratio = int(found[1]), int(found[2]), float(found[3] or 1.0)
    if not (320 <= width <= 16384 and 240 <= height <= 16384 and 0.5 <= ratio <= 8.0):
        raise SessionError(f"size '{text}': expected 320x240 to 16384x16384, and a ratio of 0.5 to 8")
    return width, height, ratio


def _session(wanted: dict[str, Any]) -> "Session":
    """Return the session of the file, or the demo, changed as the options ask."""
    from colure import session_file
    from colure.moment import Moment
    from colure.session import Session
    from colure.sites import Site

    if wanted["session"]:
        session, report = session_file.read(Path(wanted["session"]))
        for line in report:
            click.echo(f"colure: {wanted['session']}: {line}", err=True)
    else:
        session = Session.demo()
    if wanted["at"]:
        session = replace(session, moment=Moment.parse(wanted["at"]))
    if wanted["site"]:
        session = replace(session, site=Site.parse(wanted["site"]))
    if wanted["place"]:
        session = replace(session, place=wanted["place"])
    if wanted["frame"]:
        session = replace(session, layers=replace(session.layers, grid=wanted["frame"]))
    circles = () if wanted["no_circles"] else session.circles
    session = replace(session, circles=(*circles, *(_circle(text) for text in wanted["circles"])))
    return replace(session, view=_view(session, wanted))


def _view(session: "Session", wanted: dict[str, Any]) -> Any:
    view = session.view
    changes: dict[str, Any] = {}
    if wanted["projection"]:
        changes["projection"] = wanted["projection"]
    if wanted["up"]:
        changes["up"] = wanted["up"]
    if wanted["parity"]:
        changes["east_left"] = wanted["parity"] == "sky"
    if wanted["limit"] is not None:
        changes["limit_mag"] = wanted["limit"]
    if wanted["width"]:
        from colure.angles import parse_extent

        changes["width_deg"] = parse_extent(wanted["width"], "--width")
    if wanted["centre"]:
        changes["centre"] = _centre(wanted["centre"], wanted["frame"] or view.centre.frame, session)
    elif wanted["frame"] and view.centre.body is None:
        changes["centre"] = _in_frame(session, wanted["frame"])
    return replace(view, **changes)


def _in_frame(session: "Session", frame: str) -> Any:
    """Return the centre of a session, the same point of the sky, in another frame."""
    import numpy as np

    from colure import convert
    from colure.session import Centre

    old = session.view.centre
    lon, lat = np.array([old.lon_deg]), np.array([old.lat_deg])
    new = convert.columns(lon, lat, old.frame, frame, session.moment, session.site)
    return Centre(frame, float(new.lon_deg[0]), float(new.lat_deg[0]))


def _centre(text: str, frame: str, session: "Session") -> Any:
    from colure import lookup
    from colure.session import Centre

    target = lookup.find(text, frame=frame, year=float(session.moment.julian_year))
    if target.frame is None or target.lon_deg is None or target.lat_deg is None:
        return Centre(body=str(target.ref))
    return Centre(target.frame, target.lon_deg, target.lat_deg)


def _circle(text: str) -> Any:
    """Return the circle that `FRAME[;lat=DEG][;colour=#RRGGBB]` stands for."""
    from colure.angles import parse_latitude
    from colure.errors import SessionError
    from colure.session import Circle

    frame, *rest = (part.strip() for part in text.split(";"))
    values: dict[str, Any] = {}
    for part in rest:
        key, equals, value = part.partition("=")
        if key.strip() == "lat" and equals:
            values["lat_deg"] = parse_latitude(value, f"circle '{text}': lat")
        elif key.strip() == "colour" and equals:
            values["colour"] = value.strip()
        else:
            raise SessionError(f"circle '{text}': '{part}' not understood; expected lat=DEG or colour=#RRGGBB")
    return Circle(frame, **values)

"""`colure audit`: which frame, place, origin, time or reading of digits explains a coordinate, an angle or a table."""

from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import Command
from colure_viewer.cli.output import output_options

PLACES = ("geometric", "astrometric", "apparent", "observed")


@click.command(cls=Command)
@click.argument("position", metavar="[LON LAT]", required=False)
@click.option("--table", type=click.Path(path_type=Path), help="A table: CSV, ECSV, VOTable or FITS.")
@click.option(
    "--against",
    metavar="TARGET",
    help="What it is a position of: a body, a star, an object, or `FRAME LON LAT`.  [default: look in the catalogue]",
)
@click.option("--at", help="The moment of the position.")
@click.option("--site", help="A name, an MPC code, or `LON LAT HEIGHT`: where it was seen from.")
@click.option("--claim", metavar="FRAME", help="The frame that the numbers are said to be in.")
@click.option("--place", type=click.Choice(PLACES), help="How far they are said to be reduced.")
@click.option("--origin", type=click.Choice(("earth", "site")), help="Where they are said to be seen from.")
@click.option("--exposure", type=float, metavar="S", help="Length of an exposure that began at the moment.")
@click.option("--rounding", type=float, metavar="ARCSEC", help="Their uncertainty.  [default: half the last digit]")
@click.option("--pa", metavar="DEG", help="A position angle to be explained; needs --true and --against.")
@click.option("--mirrored/--not-mirrored", default=None, help="Whether the image's hand is the opposite one.")
@click.option("--offset", metavar="'X Y'", help="An offset or rate to be explained; needs --true and --against.")
@click.option("--true", "true", metavar="VALUE", help="The right position angle, or the right 'X Y' (X times cos δ).")
@click.option("--lon", "lon_name", help="The table's column of longitudes.")
@click.option("--lat", "lat_name", help="The table's column of latitudes.")
@click.option("--id", "id_name", help="The table's column of star identifiers.")
@click.option("--mag", "mag_name", help="The table's column of magnitudes.")
@click.option("--time", "time_name", help="The table's column of moments, for a body.")
@click.option("--skip-bad", is_flag=True, help="Take the good rows and list the rejected ones on stderr.")
@click.option("--most", type=click.IntRange(1, 1000), default=8, show_default=True, help="Explanations to list.")
@output_options
def command(position: str | None, form: str, output: Path | None, most: int, **options: Any) -> int:
    """Say which frame LON LAT (in one pair of quotes), or a --table, is really in.

    The last digits give the uncertainty, so write the numbers as you have them; `?` stands for a coordinate that is
    not known. A table of stars with unknown equinox is dated; a table of a body's positions is explained as a whole.
    Exit code 1 where nothing explains the numbers.
    """
    from colure_viewer.cli import audit_answers as answers

    asked = answers.Asked(position=position, most=most, **options)
    code, answer = answers.answer(asked)
    answer.emit(form, output)
    return code

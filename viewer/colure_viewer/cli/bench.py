"""`colure bench`: the performance figures, each beside a floor or a peer of the same run, as one JSON object."""

import json
import os
import sys
from importlib import import_module
from pathlib import Path
from typing import Any

import click

from colure_viewer.cli.main import Command

FIGURES = {
    "frame_full_v8": "frames",
    "frame_pan_v8": "frames",
    "frame_full_v65": "frames",
    "frame_full_v8_4k": "frames",
    "start_first_chart": "startup",
    "memory_first_chart": "startup",
    "memory_idle": "startup",
    "ephemeris_10x10k": "skies",
    "ephemeris_one": "skies",
    "stars_apparent_120k": "skies",
    "cone_1deg": "skies",
    "audit_one": "audits",
    "audit_table_100k": "audits",
    "pointer_ledger": "ledgers",
    "pointer_panel": "panels",
    "overlay_pan_100k": "overlays",
    "overlay_match_100k": "overlays",
}
"""The figures in the order of the documentation, and the module that measures each."""


@click.command(cls=Command)
@click.argument("names", metavar="[NAME…]", nargs=-1)
@click.option("-o", "--output", type=click.Path(dir_okay=False, path_type=Path), help="Write to a file.")
def command(names: tuple[str, ...], output: Path | None) -> int:
    """Measure the performance figures (all, or those NAMEd) and print them as JSON.

    Peers that are not installed are reported as absent. Exit code 1 when a target is missed.
    """
    from colure.errors import TargetError, near_names

    # Windows and pictures are measured without a display, whatever display there is.
    os.environ["QT_QPA_PLATFORM"] = "offscreen"
    for name in names:
        if name not in FIGURES:
            raise TargetError(f"figure '{name}': unknown; expected {', '.join(FIGURES)}{near_names(name, FIGURES)}")
    from colure_viewer.bench.measure import machine, versions

    figures: dict[str, Any] = {}
    for name in dict.fromkeys(names) or FIGURES:
        if sys.stderr.isatty():
            click.echo(f"measuring {name} …", err=True)
        figures[name] = getattr(import_module(f"colure_viewer.bench.{FIGURES[name]}"), name)().record()
    body = json.dumps({"machine": machine(), "versions": versions(), "figures": figures}, indent=1, ensure_ascii=False)
    if output is None:
        click.echo(body)
    else:
        from colure.files import atomic_write

        atomic_write(output, (body + "\n").encode())
    missed = any(target["met"] is False for figure in figures.values() for target in figure["targets"]) or any(
        not figure["error"]["met"] for figure in figures.values() if "error" in figure
    )
    return 1 if missed else 0

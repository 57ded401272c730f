"""`colure selfcheck`: are the shipped files whole, and on what does this installation stand?"""

from pathlib import Path

import click

from colure_viewer.cli.main import Command
from colure_viewer.cli.output import Answer, output_options


@click.command(cls=Command)
@output_options
def command(form: str, output: Path | None) -> int:
    """Check every shipped data file against its checksum, and print versions and platform; exit code 1 on a fault."""
    from colure import selfcheck

    report = selfcheck.run()
    Answer(report.records(), report.text).emit(form, output)
    return 0 if report.ok else 1

"""The `hubtack` command."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from io import TextIOWrapper

import click

from cli.adjust import adjust_command
from cli.blunders import blunders_command
from cli.check import check_command
from cli.export import export_command
from cli.grid_sheet import grid_sheet_command
from cli.reduce import reduce_command

INTERRUPTED = 130
"""Exit status after Ctrl-C: 128 + SIGINT, as shells expect."""


@click.group(epilog="Example: hubtack adjust field_data/fen_levels")
@click.version_option(package_name="hubtack", prog_name="hubtack")
def hubtack() -> None:
    """Adjust geodetic control networks by least squares.

    A job is a folder of CSV tables with one job.toml; the results are coordinates with their uncertainties, tested
    residuals and a verdict.
    """


hubtack.add_command(adjust_command)
hubtack.add_command(check_command)
hubtack.add_command(blunders_command)
hubtack.add_command(reduce_command)
hubtack.add_command(grid_sheet_command)
hubtack.add_command(export_command)


def run(arguments: Sequence[str]) -> int:
    """Run the command line and return the exit status. Only what a user can mend is turned into a message."""
    try:
        status = hubtack.main(list(arguments), prog_name="hubtack", standalone_mode=False)
    except click.ClickException as error:
        error.show()
        return error.exit_code
    except (KeyboardInterrupt, click.Abort):
        click.echo("Stopped. Earlier results are as they were.", err=True)
        return INTERRUPTED
    return int(status or 0)


def main() -> None:
    """Entry point. Letters that a console cannot show are replaced rather than fatal."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, TextIOWrapper):
            stream.reconfigure(errors="replace")
    sys.exit(run(sys.argv[1:]))

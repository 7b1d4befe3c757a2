"""`hubtack check`: does a job close before it is adjusted?"""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from cli.adjust import ACCEPTED, DOUBTFUL, UNUSABLE, decisions_option
from cli.progress import ProgressLine

if TYPE_CHECKING:
    from adjust.network.closures import Check

READ, CHECKED = 0.2, 0.8
"""Shares of the waiting time that lie behind when the job is read, and when it is checked."""


@click.command("check", epilog="Example: hubtack check field_data/fen_levels --out results")
@click.argument("job", type=click.Path(path_type=Path))
@click.option(
    "--out", type=click.Path(path_type=Path), metavar="DIR", help="Folder for the reports.  [default: JOB/out]"
)
@decisions_option
def check_command(job: Path, out: Path | None, decisions: Path | None) -> int:
    """Check JOB, a job folder or its job.toml, before it is adjusted.

    Closes loops, lines, traverses, angle sums and whatever else comes back to where it began, looks for marks and rows
    that cannot be right, and writes check.json and check.txt, both or none. Nothing is adjusted.

    \b
    Exit status:
      0  everything keeps within its tolerance
      1  something exceeds its tolerance
      2  the field data or the job file cannot be used, or the reports not written
    """
    from adjust.errors import HubtackError

    folder = out or (job if job.is_dir() else job.parent) / "out"
    try:
        check = _check_and_write(job, folder, decisions)
    except HubtackError as error:
        click.echo(str(error), err=True)
        return UNUSABLE
    _summarise(check, folder)
    return ACCEPTED if check.passed else DOUBTFUL


def _check_and_write(job: Path, folder: Path, decisions: Path | None) -> Check:
    with ProgressLine(sys.stderr) as progress:
        progress("reading the field book", 0.0)
        from adjust import read_job
        from adjust.network.closures import check_job
        from adjust.reports.check_files import write_check_reports

        field_book = read_job(job, decisions)
        progress("closing loops", READ)
        check = check_job(field_book)
        progress("writing the reports", CHECKED)
        write_check_reports(check, folder)
    return check


def _summarise(check: Check, folder: Path) -> None:
    """The verdict, how each kind of closure went and what cannot be right on stdout, the rest on stderr."""
    from adjust.reports.check_files import CHECK_REPORTS
    from adjust.reports.check_listing import summary
    from adjust.reports.check_words import check_verdict

    click.echo(check_verdict(check))
    for line in summary(check):
        click.echo(line)
    for remark in check.remarks:
        click.echo(remark.text, err=not remark.exceeds)
    click.echo(f"Wrote {' and '.join(CHECK_REPORTS)} into {folder}.")
    for note in check.notes:
        click.echo(f"Note: {note}", err=True)

"""`hubtack blunders`: which observations are wrong, by how much, and what somebody probably did."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from cli.adjust import ACCEPTED, DOUBTFUL, decisions_option, status_of
from cli.progress import ProgressLine

if TYPE_CHECKING:
    from adjust import Adjustment, Job
    from adjust.blunders import Findings

READ, ADJUSTED, SEARCHED = 0.1, 0.4, 0.95
"""Shares of the waiting time that lie behind when the job is read, adjusted, and searched."""


@click.command("blunders", epilog="Example: hubtack blunders field_data/town_traverse --write decisions.csv")
@click.argument("job", type=click.Path(path_type=Path))
@click.option(
    "--write",
    "table",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Write a table of decisions to edit: every suspect is kept until it says otherwise.",
)
@decisions_option
@click.option(
    "--out", type=click.Path(path_type=Path), metavar="DIR", help="Folder for the reports.  [default: JOB/out]"
)
def blunders_command(job: Path, table: Path | None, decisions: Path | None, out: Path | None) -> int:
    """Search JOB, a job folder or its job.toml, for blunders.

    Says which errors too small to be seen may hide, then names every observation, and everything that observations
    share, that is wrong: by how much, what the network expects in its place, what else it could be and what would
    decide, and what somebody probably did. Writes blunders.json and blunders.txt, both or none. Nothing is left out or
    corrected: that takes a table of decisions (hubtack adjust JOB --decisions FILE).

    \b
    Exit status:
      0  nothing found
      1  something found
      2  the field data or the job file cannot be used, or the reports not written
      3  the network cannot be solved as given
    """
    from adjust.errors import HubtackError

    folder = out or (job if job.is_dir() else job.parent) / "out"
    try:
        field_book, findings, adjustment = _search_and_write(job, decisions, folder)
        written = _write_table(field_book, findings, job, table, decisions)
    except HubtackError as error:
        click.echo(str(error), err=True)
        return status_of(error)
    _summarise(field_book, findings, adjustment, folder)
    if written:
        click.echo(written)
    return DOUBTFUL if findings.blunders else ACCEPTED


def _search_and_write(job: Path, decisions: Path | None, folder: Path) -> tuple[Job, Findings, Adjustment | None]:
    """Read, adjust as far as that settles, search and report. Raises HubtackError."""
    with ProgressLine(sys.stderr) as progress:
        progress("reading the field book", 0.0)
        from adjust import ConvergenceError, adjust, read_job
        from adjust.blunders import find_blunders, find_blunders_of
        from adjust.reports.blunder_files import write_blunder_reports

        field_book = read_job(job, decisions)
        adjustment = None
        try:
            adjustment = adjust(field_book, lambda stage, done: progress(stage, READ + (ADJUSTED - READ) * done))
            progress("looking for blunders", ADJUSTED)
            findings = find_blunders(adjustment, job)
        except ConvergenceError:
            progress("looking for blunders that keep the adjustment from settling", ADJUSTED)
            findings = find_blunders_of(field_book, job)
        progress("writing the reports", SEARCHED)
        write_blunder_reports(field_book, findings, adjustment, folder)
    return field_book, findings, adjustment


def _write_table(field_book: Job, findings: Findings, job: Path, table: Path | None, decisions: Path | None) -> str:
    """Write the table of decisions where one was asked for, and say so. Raises OutputError."""
    if table is None:
        return ""
    from adjust.reports.decision_table import write_decisions

    earlier = decisions is not None and decisions.exists() and table.exists() and decisions.samefile(table)
    rows = write_decisions(field_book, findings, job, table, earlier=earlier)
    if not rows:
        return f"There is nothing to decide; {table} is not written."
    return f"Wrote {rows} row{'' if rows == 1 else 's'} to decide into {table}."


def _summarise(field_book: Job, findings: Findings, adjustment: Adjustment | None, folder: Path) -> None:
    """What would show, what was found, and where it is written."""
    from adjust.reports.blunder_files import BLUNDER_REPORTS, told

    for line in told(field_book, findings, adjustment):
        click.echo(line)
    click.echo(f"\nWrote {' and '.join(BLUNDER_REPORTS)} into {folder}.")

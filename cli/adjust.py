"""`hubtack adjust`: a job folder in, five result files out."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import click

from cli.progress import ProgressLine

if TYPE_CHECKING:
    from adjust import Adjustment

ACCEPTED, DOUBTFUL, UNUSABLE, UNSOLVABLE = 0, 1, 2, 3
"""Exit statuses."""

READ, ADJUSTED = 0.15, 0.85
"""Shares of the waiting time that lie behind when the job is read, and when it is adjusted."""


@click.command("adjust", epilog="Example: hubtack adjust field_data/town_traverse --out results")
@click.argument("job", type=click.Path(path_type=Path))
@click.option(
    "--out", type=click.Path(path_type=Path), metavar="DIR", help="Folder for the results.  [default: JOB/out]"
)
@click.option(
    "--order",
    type=click.Choice(["worst", "book"]),
    default="worst",
    show_default=True,
    help="Order of the observations in the listing: the worst fit first, or as they stand in the field book.",
)
def adjust_command(job: Path, out: Path | None, order: Literal["worst", "book"]) -> int:
    """Adjust JOB, a job folder or its job.toml.

    Writes results.json, coordinates.csv, residuals.csv, listing.txt and the page report.html, all or none of them, and
    prints a verdict.

    \b
    Exit status:
      0  adjusted, nothing stands out
      1  adjusted, but the global test failed or an observation is suspect
      2  the field data or the job file cannot be used, or the results not written
      3  the network cannot be solved as given
    """
    from adjust.errors import HubtackError, NetworkError

    folder = out or (job if job.is_dir() else job.parent) / "out"
    try:
        adjustment = _adjust_and_write(job, folder, order)
    except HubtackError as error:
        click.echo(str(error), err=True)
        return UNSOLVABLE if isinstance(error, NetworkError) else UNUSABLE
    _summarise(adjustment, folder)
    return ACCEPTED if adjustment.accepted else DOUBTFUL


def _adjust_and_write(job: Path, folder: Path, order: Literal["worst", "book"]) -> Adjustment:
    with ProgressLine(sys.stderr) as progress:
        progress("reading the field book", 0.0)
        from adjust import adjust, read_job
        from adjust.network.closures import check_job
        from adjust.reports import write_reports

        field_book = read_job(job)
        progress("closing loops", READ)
        check = check_job(field_book)
        adjustment = adjust(field_book, lambda stage, done: progress(stage, READ + (ADJUSTED - READ) * done))
        progress("writing the results", ADJUSTED)
        write_reports(adjustment, folder, order, check)
    return adjustment


def _summarise(adjustment: Adjustment, folder: Path) -> None:
    """The verdict and where the rest is on stdout, what else to bear in mind on stderr."""
    from adjust.reports import REPORTS, cautions, verdict

    sentence = verdict(adjustment)
    click.echo(sentence)
    click.echo(f"Wrote {', '.join(REPORTS[:-1])} and {REPORTS[-1]} into {folder}.")
    for caution in cautions(adjustment):
        if caution not in sentence:
            click.echo(f"Caution: {caution}", err=True)

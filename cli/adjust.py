"""`hubtack adjust`: a job folder in, five result files out."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import click

from cli.progress import ProgressLine

if TYPE_CHECKING:
    from adjust import Adjustment
    from adjust.blunders import Findings

ACCEPTED, DOUBTFUL, UNUSABLE, UNSOLVABLE = 0, 1, 2, 3
"""Exit statuses."""

READ, ADJUSTED, SEARCHED = 0.15, 0.6, 0.85
"""Shares of the waiting time that lie behind when the job is read, adjusted, and searched for blunders."""

MOST_SEARCHED = 100_000
"""Observations of a job that is searched for blunders whenever it is adjusted: a search of so many takes some five
times as long as the adjustment, and of more, longer still."""

decisions_option = click.option(
    "--decisions",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Table of what was decided of single lines, as hubtack blunders --write makes it.",
)


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
@decisions_option
@click.option(
    "--watch",
    is_flag=True,
    help="Adjust again whenever a file of the job is saved, show what changed, and serve a page that refreshes itself.",
)
def adjust_command(
    job: Path, out: Path | None, order: Literal["worst", "book"], decisions: Path | None, watch: bool
) -> int:
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
    from adjust.errors import HubtackError

    folder = out or (job if job.is_dir() else job.parent) / "out"
    if watch:
        from cli.watch import watch_job

        return watch_job(job, folder, order, decisions)
    try:
        adjustment, findings = adjust_and_write(job, folder, order, decisions)
    except HubtackError as error:
        click.echo(str(error), err=True)
        return status_of(error)
    summarise(adjustment, findings, folder)
    return status_of(adjustment)


def status_of(outcome: Adjustment | Exception) -> int:
    """The exit status of an adjustment, or of the error that prevented it."""
    from adjust.errors import NetworkError

    if isinstance(outcome, Exception):
        return UNSOLVABLE if isinstance(outcome, NetworkError) else UNUSABLE
    return ACCEPTED if outcome.accepted else DOUBTFUL


def adjust_and_write(
    job: Path, folder: Path, order: Literal["worst", "book"], decisions: Path | None = None
) -> tuple[Adjustment, Findings | None]:
    """Read, check, adjust, search for blunders and report, with a progress line. Raises HubtackError."""
    with ProgressLine(sys.stderr) as progress:
        progress("reading the field book", 0.0)
        from adjust import adjust, read_job
        from adjust.network.closures import check_job
        from adjust.reports import write_reports

        field_book = read_job(job, decisions)
        progress("closing loops", READ)
        check = check_job(field_book)
        share = ADJUSTED - READ
        adjustment = adjust(field_book, lambda stage, done: progress(stage, READ + share * done), check.start)
        progress("looking for blunders", ADJUSTED)
        findings = _search(adjustment, job)
        progress("writing the results", SEARCHED)
        write_reports(adjustment, folder, order, check, findings)
    return adjustment, findings


def _search(adjustment: Adjustment, job: Path) -> Findings | None:
    """What a search for blunders finds; None where it cannot be made, or would take too long."""
    from adjust.blunders import find_blunders
    from adjust.errors import NetworkError

    if adjustment.solution.observations > MOST_SEARCHED:
        return None
    try:
        return find_blunders(adjustment, job)
    except NetworkError:
        return None


def summarise(adjustment: Adjustment, findings: Findings | None, folder: Path) -> None:
    """The verdict and where the rest is on stdout, what else to bear in mind on stderr."""
    from adjust.reports import REPORTS, cautions, verdict
    from adjust.reports.blunder_words import findings_verdict

    sentence = verdict(adjustment)
    click.echo(sentence)
    if findings is not None and findings.blunders:
        click.echo(findings_verdict(adjustment.job, findings))
    click.echo(f"Wrote {', '.join(REPORTS[:-1])} and {REPORTS[-1]} into {folder}.")
    if adjustment.solution.observations > MOST_SEARCHED:
        click.echo("Note: no blunders were searched for in so large a job; hubtack blunders searches.", err=True)
    for caution in cautions(adjustment):
        if caution not in sentence:
            click.echo(f"Caution: {caution}", err=True)

"""`hubtack reduce`: a folder of raw readings in, the same job in reduced tables out."""

from __future__ import annotations

from pathlib import Path

import click

from cli.adjust import ACCEPTED, DOUBTFUL, UNUSABLE


@click.command("reduce", epilog="Example: hubtack reduce field_data/quarry_raw --out reduced")
@click.argument("job", type=click.Path(path_type=Path))
@click.option(
    "--out", type=click.Path(path_type=Path), metavar="DIR", help="Folder for the tables.  [default: JOB/reduced]"
)
def reduce_command(job: Path, out: Path | None) -> int:
    """Reduce the raw readings of JOB, a job folder or its job.toml.

    Writes the job in tables of directions, zenith angles, distances and levels, which adjusts to the same result, and
    reduction.txt and reduction.json, which say what the readings told of the instruments and of themselves.

    \b
    Exit status:
      0  reduced, the readings scatter as the job file states
      1  reduced, but some kind of reading scatters significantly more
      2  the field data or the job file cannot be used, or the tables not written
    """
    from adjust import read_job
    from adjust.errors import HubtackError
    from adjust.reports.reduced_job import write_reduced_job
    from adjust.reports.reduction_text import reduction_verdict, wider_than_stated

    folder = out or (job if job.is_dir() else job.parent) / "reduced"
    try:
        field_book = read_job(job)
        written = write_reduced_job(field_book, folder)
    except HubtackError as error:
        click.echo(str(error), err=True)
        return UNUSABLE
    click.echo(reduction_verdict(field_book))
    click.echo(f"Wrote {', '.join(written[:-1])} and {written[-1]} into {folder}.")
    for note in field_book.notes:
        click.echo(f"Note: {note}", err=True)
    pointings = field_book.reduction.pointings
    return DOUBTFUL if pointings is not None and wider_than_stated(field_book, pointings) else ACCEPTED

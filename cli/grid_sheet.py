"""`hubtack grid-sheet`: what the map projection does at every mark and along every line."""

from __future__ import annotations

from pathlib import Path

import click

from cli.adjust import ACCEPTED, UNSOLVABLE, UNUSABLE


@click.command("grid-sheet", epilog="Example: hubtack grid-sheet field_data/dam_control --out sheet")
@click.argument("job", type=click.Path(path_type=Path))
@click.option("--out", type=click.Path(path_type=Path), metavar="DIR", help="Folder for the sheet.  [default: JOB/out]")
def grid_sheet_command(job: Path, out: Path | None) -> int:
    """Adjust JOB and write its grid sheet.

    For a job with a projected CRS: point scale factor, convergence, height factor and combined factor of every mark;
    ground, ellipsoid and grid length, factors, bearings and arc-to-chord corrections of every observed line. Writes
    grid_sheet.txt, grid_marks.csv and grid_lines.csv, all or none of them.

    \b
    Exit status:
      0  written, whatever the tests of the adjustment say
      2  the field data or the job file cannot be used, or the sheet not written
      3  the network cannot be solved as given
    """
    from adjust import adjust, read_job
    from adjust.errors import HubtackError, NetworkError
    from adjust.reports.grid_sheet import GRID_SHEET, write_grid_sheet

    folder = out or (job if job.is_dir() else job.parent) / "out"
    try:
        write_grid_sheet(adjust(read_job(job)), folder)
    except HubtackError as error:
        click.echo(str(error), err=True)
        return UNSOLVABLE if isinstance(error, NetworkError) else UNUSABLE
    click.echo(f"Wrote {', '.join(GRID_SHEET[:-1])} and {GRID_SHEET[-1]} into {folder}.")
    return ACCEPTED

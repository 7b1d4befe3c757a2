"""`hubtack export`: saved results in the formats of GIS, CAD and spreadsheets."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from cli.adjust import ACCEPTED, UNUSABLE

if TYPE_CHECKING:
    from adjust.reports.exports import Table

NAMES = ("geojson", "gpkg", "dxf", "landxml", "csv", "xlsx")
"""Those of `adjust.reports.exports.FORMATS`, which is not imported for a page of help."""


@click.command("export", epilog="Example: hubtack export field_data/fen_levels/out --to csv")
@click.argument("results", type=click.Path(path_type=Path))
@click.option("--to", "form", type=click.Choice(NAMES), required=True, help="The format.")
@click.option(
    "--out", type=click.Path(path_type=Path), metavar="FILE", help="The file.  [default: results.* beside RESULTS]"
)
@click.option(
    "--exaggeration",
    type=click.FloatRange(min=0, min_open=True),
    metavar="TIMES",
    help="Draw ellipses so many times their size.  [default: 1; dxf: a round number that makes them easy to see]",
)
@click.option(
    "--table",
    type=click.Choice(["marks", "lines", "observations"]),
    default="marks",
    show_default=True,
    help="Which table a csv holds.",
)
def export_command(results: Path, form: str, out: Path | None, exaggeration: float | None, table: Table) -> int:
    """Export RESULTS, a results.json or a folder that holds one.

    \b
    geojson  RFC 7946: WGS 84 longitude and latitude; says by which transformation
    gpkg     OGC GeoPackage in the job's CRS: marks, lines, ellipses  [extra gis]
    dxf      CAD drawing in metres: marks, labels, lines, ellipses    [extra cad]
    landxml  LandXML 1.2 points with their figures as features
    csv      one table, units in the column names
    xlsx     workbook with all tables                                 [extra office]

    \b
    Exit status:
      0  written
      2  the results cannot be used, or not be written in this format
    """
    from adjust.errors import HubtackError
    from adjust.reports.exports import FORMATS, Options, export, read_results

    beside = results if results.is_dir() else results.parent
    path = out or beside / f"results{FORMATS[form].suffix}"
    try:
        sentences = export(read_results(results), form, path, Options(exaggeration, table))
    except HubtackError as error:
        click.echo(str(error), err=True)
        return UNUSABLE
    click.echo(f"Wrote {path}.")
    for sentence in sentences:
        click.echo(f"Note: {sentence}", err=True)
    return ACCEPTED

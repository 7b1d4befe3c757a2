"""Exports: saved results where people go on working with them, in GIS, CAD and spreadsheets."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from importlib import import_module
from pathlib import Path

from adjust.reports.exports.options import Options, Table
from adjust.reports.publish import publish
from adjust.reports.saved import SavedResults, read_results

__all__ = ["FORMATS", "Format", "Options", "SavedResults", "Table", "export", "read_results"]

Write = Callable[[SavedResults, Path, Options], tuple[str, ...]]


@dataclass(frozen=True)
class Format:
    """A format of exports: the ending of its files, and the function that writes one, named as `module.function`."""

    suffix: str
    _write: str

    def write(self, results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
        """Write the file; returns sentences that its user has to bear in mind.

        Raises FieldDataError where the format cannot hold such results, OutputError where a library is missing.
        """
        module, _, name = self._write.rpartition(".")
        write: Write = getattr(import_module(f"adjust.reports.exports.{module}"), name)
        return write(results, path, options)


FORMATS = {
    "geojson": Format(".geojson", "geojson.write_geojson"),
    "gpkg": Format(".gpkg", "geopackage.write_geopackage"),
    "dxf": Format(".dxf", "drawing.write_drawing"),
    "landxml": Format(".xml", "landxml.write_landxml"),
    "csv": Format(".csv", "tables.write_table"),
    "xlsx": Format(".xlsx", "workbook.write_workbook"),
}


def export(results: SavedResults, form: str, path: Path, options: Options | None = None) -> tuple[str, ...]:
    """Write results to `path` in one of `FORMATS`: the whole file, or none and what was there before.

    Returns sentences that the file's user has to bear in mind. Raises FieldDataError where the format cannot hold such
    results, OutputError where a library it needs is missing or the file cannot be written.
    """
    sentences: list[str] = []

    def write(aside: Path) -> None:
        sentences.extend(FORMATS[form].write(results, aside, options or Options()))

    publish(path.parent, {path.name: write})
    return tuple(sentences)

"""A spreadsheet workbook (Office Open XML): a summary and one sheet for each table."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Iterable
from datetime import datetime
from pathlib import Path
from typing import Any

from adjust.errors import OutputError
from adjust.reports.exports.options import Options, Table
from adjust.reports.exports.rows import Cell, Row
from adjust.reports.exports.tables import table_rows
from adjust.reports.exports.text import legal
from adjust.reports.libraries import library
from adjust.reports.saved import SavedResults

SHEETS: dict[str, Table] = {"Marks": "marks", "Lines": "lines", "Observations": "observations"}

MOST_ROWS = 1_048_576
"""Of a sheet. Source: ECMA-376 leaves it to the program; from memory, the limit of those in use."""

WRITTEN = datetime(1980, 1, 1)
"""Date inside the file, the earliest that its archive can hold: the same results make the same bytes."""

NUMBER_FORMATS = {"_mm2": "0.000", "_mm": "0.00", "_m": "0.0000", "_deg": "0.000000000"}
"""Digits shown, by the ending of the column's name; cells hold all of them."""

WIDTH = 14
"""Of a column, in characters: a coordinate with its decimals."""


def write_workbook(results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
    """Summary, marks, lines and observations. Text is always text: a mark named `=1+1` is no formula, `007` no number.

    Raises OutputError where openpyxl is not installed, or a table has more rows than a sheet.
    """
    openpyxl = library("openpyxl", "office")
    longest = max(len(results.marks), len(results.relative), len(results.observations))
    if longest >= MOST_ROWS:
        raise OutputError(f"a sheet holds at most {MOST_ROWS:,} rows and a table has {longest:,}; export csv instead")
    workbook = openpyxl.Workbook(write_only=True)
    _summary(workbook, results)
    for title, table in SHEETS.items():
        _sheet(workbook, title, (row for row in table_rows(results, table)))
    _save(workbook, path)
    return ()


def _summary(workbook: Any, results: SavedResults) -> None:
    sheet = workbook.create_sheet("Summary")
    sheet.column_dimensions["A"].width = 2 * WIDTH
    facts: dict[str, Cell] = {**dict(results.job), **dict(results.solution)}
    facts |= {f"global_test_{key}": value for key, value in results.solution.global_test}
    del facts["global_test"]
    for key, value in facts.items():
        sheet.append(_cells(sheet, {"key": key, key: value}.items()))
    for title, sentences in (("caution", results.cautions), ("note", results.notes), ("suspect", results.suspects)):
        for sentence in sentences:
            sheet.append(_cells(sheet, [("key", title), (title, sentence)]))


def _sheet(workbook: Any, title: str, rows: Iterable[Row]) -> None:
    """A header row that stays in view and can filter, then the rows.

    Each column has one cell that takes the values of all rows in turn: a row is written as it is appended, and making a
    cell with its format anew for every figure takes most of the time.
    """
    from openpyxl.utils import get_column_letter

    sheet = workbook.create_sheet(title)
    sheet.freeze_panes = "B2"
    count, columns = 0, []
    for count, row in enumerate(rows, 1):
        if count == 1:
            for number in range(1, len(row) + 1):
                sheet.column_dimensions[get_column_letter(number)].width = WIDTH
            sheet.append(_cells(sheet, ((name, name) for name in row)))
            columns = [_column(sheet, name) for name in row]
        sheet.append([_filled(cell, value) for cell, value in zip(columns, row.values(), strict=True)])
    if count:
        sheet.auto_filter.ref = f"A1:{get_column_letter(len(columns))}{count + 1}"


def _cells(sheet: Any, values: Iterable[tuple[str, Cell]]) -> list[Any]:
    return [_filled(_column(sheet, name), value) for name, value in values]


def _column(sheet: Any, name: str) -> Any:
    """A cell that shows figures with the digits that suit the unit in the column's name."""
    from openpyxl.cell import WriteOnlyCell

    cell = WriteOnlyCell(sheet)
    form = next((form for end, form in NUMBER_FORMATS.items() if name.endswith(end)), None)
    if form is not None:
        cell.number_format = form
    return cell


def _filled(cell: Any, value: Cell) -> Any:
    """The cell with its value, None where there is none; text stays text, whatever it looks like."""
    if value is None:
        return None
    cell.value = legal(value) if isinstance(value, str) else value
    if isinstance(value, str):
        cell.data_type = "s"
    return cell


def _save(workbook: Any, path: Path) -> None:
    """As openpyxl writes it, with the time of day taken out of the archive and of its properties."""
    from openpyxl.xml.functions import tostring

    written = io.BytesIO()
    workbook.save(written)
    workbook.properties.created = workbook.properties.modified = WRITTEN
    properties = tostring(workbook.properties.to_tree())
    with zipfile.ZipFile(written) as archive, zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as copy:
        for name in archive.namelist():
            entry = zipfile.ZipInfo(name, WRITTEN.timetuple()[:6])
            content = properties if name == "docProps/core.xml" else archive.read(name)
            copy.writestr(entry, content, zipfile.ZIP_DEFLATED)

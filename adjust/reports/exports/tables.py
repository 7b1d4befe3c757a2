"""One table of the results as comma-separated values, with units in the column names."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from pathlib import Path

from adjust.reports.exports.options import Options, Table
from adjust.reports.exports.rows import Row, line_row, lines_observed, mark_row, observation_row
from adjust.reports.saved import SavedResults


def table_rows(results: SavedResults, table: Table) -> Iterator[Row]:
    """The rows of the marks, the lines or the observations."""
    if table == "marks":
        yield from map(mark_row, results.marks)
    elif table == "observations":
        yield from map(observation_row, results.observations)
    else:
        kinds, suspects = lines_observed(results)
        for line in results.relative:
            pair = frozenset((line.start, line.to))
            yield line_row(line, kinds.get(pair, ()), suspects.get(pair, ()))


def write_table(results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
    """Cautions as comment lines, a header row, and one row for each record, empty cells for what does not exist."""
    with path.open("w", encoding="utf-8", newline="") as file:
        file.writelines(f"# Caution: {caution}\n" for caution in results.cautions)
        table = csv.writer(file, lineterminator="\n")
        for count, row in enumerate(table_rows(results, options.table)):
            if count == 0:
                table.writerow(row)
            table.writerow(row.values())
    return ()

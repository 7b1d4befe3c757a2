"""An adjustment at a glance, for the prompt and for notebooks."""

from __future__ import annotations

from collections.abc import Sequence
from html import escape

import numpy as np

from adjust.adjustment import Adjustment
from adjust.reports.layout import Column, facts, paragraph, table
from adjust.reports.listing import basis_words, datum_words, frame_words
from adjust.reports.records import Record, mark_records
from adjust.reports.verdict import cautions, verdict
from adjust.reports.wording import counted, decimals, dms

GLANCE = 20
"""Marks shown: one screen."""

_FIGURES = ("sd_easting_mm", "sd_northing_mm", "sd_height_mm", "horizontal_95_mm", "height_95_mm")


def text(adjustment: Adjustment) -> str:
    """The adjustment as plain text: title, verdict, a few facts, the first marks."""
    columns, rows = _marks(adjustment)
    lines = [*paragraph(adjustment.job.title), *paragraph(verdict(adjustment)), "", *facts(_facts(adjustment)), ""]
    return "\n".join([*lines, *table(columns, rows), *_rest(adjustment)])


def html(adjustment: Adjustment) -> str:
    """The same for a notebook; every text from the job is escaped."""
    columns, rows = _marks(adjustment)
    kept = [place for place in range(len(columns)) if any(row[place] for row in rows)]
    head = "".join(f"<th>{escape(_heading(columns[place]))}</th>" for place in kept)
    body = "".join(_html_row([row[place] for place in kept]) for row in rows)
    listed = "".join(f"<tr><th>{escape(name)}</th><td>{escape(value)}</td></tr>" for name, value in _facts(adjustment))
    warned = "".join(f"<li>{escape(caution)}</li>" for caution in cautions(adjustment))
    return (
        f"<div><h4>{escape(adjustment.job.title)}</h4><p>{escape(verdict(adjustment))}</p>"
        f"<table>{listed}</table><table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"
        + "".join(f"<p>{escape(line)}</p>" for line in _rest(adjustment))
        + (f"<ul>{warned}</ul>" if warned else "")
        + "</div>"
    )


def _heading(column: Column) -> str:
    return f"{column.heading} ({column.unit})" if column.unit else column.heading


def _html_row(cells: Sequence[str]) -> str:
    return "<tr>" + "".join(f"<td>{escape(cell)}</td>" for cell in cells) + "</tr>"


def _facts(adjustment: Adjustment) -> list[tuple[str, str]]:
    solution = adjustment.solution
    return [
        ("Frame", frame_words(adjustment)),
        ("Datum", datum_words(adjustment)),
        ("Observations", f"{solution.observations}, unknowns {solution.unknowns}"),
        ("Degrees of freedom", str(solution.degrees_of_freedom)),
        ("Standard deviations", basis_words(adjustment)),
    ]


def _marks(adjustment: Adjustment) -> tuple[tuple[Column, ...], list[list[str]]]:
    """The first marks, by easting and northing where the frame has them, else by latitude and longitude."""
    records = mark_records(adjustment, np.arange(min(GLANCE, len(adjustment.job.marks))))
    columns = (
        Column("mark", text=True),
        *(Column(name, unit) for name, unit in (("easting", "m"), ("northing", "m"))),
        *(Column(name, "d-m-s") for name in ("latitude", "longitude")),
        Column("height", "m"),
        *(Column(f"sd {axis}", "mm") for axis in "ENH"),
        Column("95 % circle", "mm"),
        Column("95 % height", "mm"),
    )
    gridded = any(record["easting_m"] is not None for record in records)
    return columns, [_cells(record, gridded) for record in records]


def _cells(record: Record, gridded: bool) -> list[str]:
    grid = [decimals(record[key], 4) for key in ("easting_m", "northing_m")]
    geographic = ["" if gridded else dms(record[key], 4) for key in ("latitude_deg", "longitude_deg")]
    figures = [decimals(record[key], 2) for key in _FIGURES]
    return [record["mark"], *grid, *geographic, decimals(record["height_m"], 4), *figures]


def _rest(adjustment: Adjustment) -> list[str]:
    hidden = len(adjustment.job.marks) - GLANCE
    return [f"and {counted(hidden, 'more mark', 'more marks')}"] if hidden > 0 else []

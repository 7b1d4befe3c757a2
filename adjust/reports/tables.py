"""`coordinates.csv` and `residuals.csv`: the records as tables, with units in the column names."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator
from pathlib import Path

from adjust.adjustment import Adjustment
from adjust.reports.records import Figures, mark_figures, observation_figures

COVARIANCE_COLUMNS = {
    "cov_ee_mm2": (0, 0),
    "cov_en_mm2": (0, 1),
    "cov_eh_mm2": (0, 2),
    "cov_nn_mm2": (1, 1),
    "cov_nh_mm2": (1, 2),
    "cov_hh_mm2": (2, 2),
}
"""The upper triangle, of easting, northing and height."""

VALUES = ("observed", "adjusted", "residual", "sd", "minimal_detectable_bias")
"""Figures in the unit of their observation: each has a column in metres and one in degrees."""


def write_coordinates(adjustment: Adjustment, cautions: Iterable[str], path: Path) -> None:
    """One row for each mark."""
    _write(path, cautions, map(flat_marks, mark_figures(adjustment)))


def write_residuals(adjustment: Adjustment, cautions: Iterable[str], path: Path) -> None:
    """One row for each component of each observation."""
    _write(path, cautions, map(flat_observations, observation_figures(adjustment)))


def flat_marks(figures: Figures) -> Figures:
    """Columns of marks with nothing nested: a column for each figure of an ellipse and each covariance."""
    flat: Figures = {}
    for key, column in figures.items():
        if key == "covariance_mm2":
            for name, (row, place) in COVARIANCE_COLUMNS.items():
                flat[name] = [matrix[row][place] for matrix in column]
        elif isinstance(column, dict):
            flat |= {f"{key}_{name}": figure for name, figure in column.items()}
        else:
            flat[key] = column
    return flat


def flat_observations(figures: Figures) -> Figures:
    """Both columns of each value; all rows of a kind share a unit."""
    nothing = [None] * len(figures["unit"])
    in_metres = figures["unit"][0] == "m"
    flat: Figures = {}
    for key, column in figures.items():
        if key in VALUES:
            flat[f"{key}_m"] = column if in_metres else nothing
            flat[f"{key}_deg"] = nothing if in_metres else column
        else:
            flat[key] = column
    flat["suspect"] = ["yes" if suspect else "no" for suspect in figures["suspect"]]
    return flat


def _write(path: Path, cautions: Iterable[str], chunks: Iterator[Figures]) -> None:
    """Cautions as comment lines ahead of the header row, the way the field book's own tables carry comments."""
    with path.open("w", encoding="utf-8", newline="") as file:
        file.writelines(f"# Caution: {caution}\n" for caution in cautions)
        table = csv.writer(file, lineterminator="\n")
        for count, columns in enumerate(chunks):
            if count == 0:
                table.writerow(columns)
            table.writerows(zip(*columns.values(), strict=True))

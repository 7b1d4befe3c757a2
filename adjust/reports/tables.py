"""`coordinates.csv` and `residuals.csv`: the records as tables, with units in the column names."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from adjust.adjustment import Adjustment
from adjust.reports.records import Record, mark_records, observation_records

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
    _write(path, cautions, (_flat_mark(record) for record in mark_records(adjustment)))


def write_residuals(adjustment: Adjustment, cautions: Iterable[str], path: Path) -> None:
    """One row for each component of each observation."""
    _write(path, cautions, (_flat_observation(record) for record in observation_records(adjustment)))


def _flat_mark(record: Record) -> Record:
    flat: Record = {}
    for key, value in record.items():
        if key == "covariance_mm2":
            flat.update({name: value[row][column] for name, (row, column) in COVARIANCE_COLUMNS.items()})
        elif isinstance(value, dict):
            flat.update({f"{key}_{name}": figure for name, figure in value.items()})
        else:
            flat[key] = value
    return flat


def _flat_observation(record: Record) -> Record:
    flat: Record = {}
    for key, value in record.items():
        if key in VALUES:
            flat[f"{key}_m"] = value if record["unit"] == "m" else None
            flat[f"{key}_deg"] = value if record["unit"] == "deg" else None
        else:
            flat[key] = value
    flat["suspect"] = "yes" if record["suspect"] else "no"
    return flat


def _write(path: Path, cautions: Iterable[str], rows: Iterator[dict[str, Any]]) -> None:
    """Cautions as comment lines ahead of the header row, the way the field book's own tables carry comments."""
    with path.open("w", encoding="utf-8", newline="") as file:
        file.writelines(f"# Caution: {caution}\n" for caution in cautions)
        table = csv.writer(file, lineterminator="\n")
        for count, row in enumerate(rows):
            if count == 0:
                table.writerow(row)
            table.writerow(row.values())

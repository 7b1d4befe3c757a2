"""The grid sheet of an adjusted job: two tables for programs, one text for people."""

from __future__ import annotations

import csv
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray, IntArray
from adjust.errors import FieldDataError, Mistake
from adjust.frames import EllipsoidFrame
from adjust.observations import SlopeDistances
from adjust.reductions.grid_sheet import (
    LineFactors,
    MarkFactors,
    line_factors,
    mark_factors,
    measured_on_ellipsoid,
)
from adjust.reports.layout import Column, paragraph, shown_of, table, title
from adjust.reports.publish import publish
from adjust.units import ARCSEC, format_dms

GRID_SHEET = ("grid_sheet.txt", "grid_marks.csv", "grid_lines.csv")
LISTED = 1000
"""Rows of one table of the text; the tables beside it have them all."""
CONFORMAL = 1e-6
"""Largest shear of a map that counts as conformal: a thousand times what differencing leaves, a thousandth of what maps
of other kinds have."""

MARK_COLUMNS = (
    Column("mark", text=True),
    Column("easting", "m"),
    Column("northing", "m"),
    Column("ell. height", "m"),
    Column("point scale"),
    Column("convergence", "d-m-s"),
    Column("height factor"),
    Column("combined"),
)
LINE_COLUMNS = (
    Column("from", text=True),
    Column("to", text=True),
    Column("ground", "m"),
    Column("ellipsoid", "m"),
    Column("grid", "m"),
    Column("line scale"),
    Column("combined"),
    Column("grid bearing", "d-m-s"),
    Column("plane bearing", "d-m-s"),
    Column("t − T", "″"),
    Column("back", "″"),
)
EXPLAINED = (
    "Point scale: grid over ellipsoid length. Convergence: azimuth of grid north; grid bearing = azimuth − "
    "convergence. Height factor: ellipsoid over ground length. Combined: grid over ground length. Ground: level "
    "distance at the marks' mean height. t − T: plane bearing (of the straight line on the grid) minus grid bearing "
    "(of the geodesic's image) at the first mark, and back at the second. Lines are all observed pairs of marks."
)


class GridSheet:
    """Factors of the marks that have plan coordinates, and of the observed lines between them."""

    def __init__(self, adjustment: Adjustment) -> None:
        """Raises FieldDataError where the job has no projected CRS."""
        frame = adjustment.job.frame
        if not isinstance(frame, EllipsoidFrame) or frame.is_geographic:
            message = 'a grid sheet needs a map projection; set kind = "ellipsoid" and a projected crs'
            raise FieldDataError([Mistake("job.toml", None, "frame", message)])
        coordinates = adjustment.geometry.spatial
        placed = np.asarray(np.isfinite(coordinates).all(axis=1))
        lines = adjustment.lines[placed[adjustment.lines].all(axis=1)]
        self.title = adjustment.job.title
        self.crs = frame.crs
        self.names = adjustment.job.marks.names
        self.marks = np.flatnonzero(placed)
        self.heights = coordinates[self.marks, 2]
        self.mark_factors: MarkFactors = mark_factors(frame, coordinates[self.marks])
        self.line_factors: LineFactors = line_factors(frame, coordinates, lines)
        self.measured = measured_lengths(adjustment, frame, lines)

    @property
    def conformal(self) -> bool:
        """Whether the map keeps angles, so that a point has one scale factor."""
        return bool(np.all(self.mark_factors.largest_shear < CONFORMAL))


def measured_lengths(adjustment: Adjustment, frame: EllipsoidFrame, lines: IntArray) -> FloatArray:
    """Mean slope distance measured along each line (lines,), reduced to the ellipsoid; NaN where there is none."""
    total, count = np.zeros(len(lines)), np.zeros(len(lines))
    place = {frozenset(line): row for row, line in enumerate(lines.tolist())}
    for rows in adjustment.job.observations:
        if isinstance(rows, SlopeDistances):
            along = np.array([place.get(frozenset(sight), -1) for sight in rows.marks.tolist()], dtype=np.int64)
            chosen = rows.take(along >= 0)
            reduced = measured_on_ellipsoid(
                frame, adjustment.geometry.spatial, chosen.marks, chosen.observed[:, 0], chosen.heights
            )
            np.add.at(total, along[along >= 0], reduced)
            np.add.at(count, along[along >= 0], 1.0)
    return np.where(count > 0, total / np.maximum(count, 1.0), np.nan)


def write_grid_sheet(adjustment: Adjustment, folder: Path) -> None:
    """Write all files of `GRID_SHEET`, or none. Raises FieldDataError without a projected CRS, OutputError."""
    sheet = GridSheet(adjustment)
    publish(
        folder,
        {
            "grid_sheet.txt": lambda path: _write_text(path, text(sheet)),
            "grid_marks.csv": lambda path: _write(path, mark_table(sheet)),
            "grid_lines.csv": lambda path: _write(path, line_table(sheet)),
        },
    )


def mark_table(sheet: GridSheet) -> dict[str, Sequence[object]]:
    """Columns by title: lengths to 0.1 mm, factors to 1e-10, angles to 1e-9°."""
    factors = sheet.mark_factors
    return {
        "mark": [sheet.names[mark] for mark in sheet.marks],
        "easting_m": _digits(factors.grid[:, 0], 4),
        "northing_m": _digits(factors.grid[:, 1], 4),
        "ellipsoidal_height_m": _digits(sheet.heights, 4),
        "point_scale": _digits(factors.point_scale, 10),
        "convergence_deg": _digits(np.degrees(factors.convergence), 9),
        "height_factor": _digits(factors.height_factor, 10),
        "combined_factor": _digits(factors.combined, 10),
    }


def line_table(sheet: GridSheet) -> dict[str, Sequence[object]]:
    """Columns by title, in the same digits."""
    factors = sheet.line_factors
    return {
        "from": [sheet.names[mark] for mark in factors.marks[:, 0]],
        "to": [sheet.names[mark] for mark in factors.marks[:, 1]],
        "ground_m": _digits(factors.ground, 4),
        "ellipsoid_m": _digits(factors.ellipsoid, 4),
        "grid_m": _digits(factors.grid, 4),
        "measured_ellipsoid_m": _digits(sheet.measured, 4),
        "measured_grid_m": _digits(sheet.measured * factors.line_scale, 4),
        "line_scale": _digits(factors.line_scale, 10),
        "height_factor": _digits(factors.height_factor, 10),
        "combined_factor": _digits(factors.combined, 10),
        "azimuth_deg": _digits(np.degrees(factors.azimuth), 9),
        "grid_bearing_deg": _digits(np.degrees(factors.grid_bearing), 9),
        "plane_bearing_deg": _digits(np.degrees(factors.plane_bearing), 9),
        "arc_to_chord_arcsec": _digits(factors.arc_to_chord / ARCSEC, 3),
        "arc_to_chord_back_arcsec": _digits(factors.arc_to_chord_back / ARCSEC, 3),
    }


def text(sheet: GridSheet, most: int = LISTED) -> list[str]:
    """The lines of `grid_sheet.txt`."""
    lines = [*paragraph(f"{sheet.title}: grid sheet, {sheet.crs}"), "", *paragraph(EXPLAINED)]
    if not sheet.conformal:
        caution = (
            "This map is not conformal: its scale depends on direction. Point scale is the root of the areal scale."
        )
        lines += ["", *paragraph(caution)]
    marks, observed = _mark_rows(sheet), _line_rows(sheet)
    return [
        *lines,
        *title("Marks"),
        *table(MARK_COLUMNS, marks[:most]),
        *shown_of(min(most, len(marks)), len(marks), "the first", "grid_marks.csv"),
        *title("Lines"),
        *table(LINE_COLUMNS, observed[:most]),
        *shown_of(min(most, len(observed)), len(observed), "the first", "grid_lines.csv"),
    ]


def _mark_rows(sheet: GridSheet) -> list[tuple[str, ...]]:
    factors = sheet.mark_factors
    columns = (
        [sheet.names[mark] for mark in sheet.marks],
        _digits(factors.grid[:, 0], 4),
        _digits(factors.grid[:, 1], 4),
        _digits(sheet.heights, 4),
        _digits(factors.point_scale, 8),
        _angles(factors.convergence, 2),
        _digits(factors.height_factor, 8),
        _digits(factors.combined, 8),
    )
    return list(zip(*columns, strict=True))


def _line_rows(sheet: GridSheet) -> list[tuple[str, ...]]:
    factors = sheet.line_factors
    columns = (
        *([sheet.names[mark] for mark in factors.marks[:, end]] for end in (0, 1)),
        *(_digits(lengths, 3) for lengths in (factors.ground, factors.ellipsoid, factors.grid)),
        _digits(factors.line_scale, 8),
        _digits(factors.combined, 8),
        _angles(factors.grid_bearing, 1),
        _angles(factors.plane_bearing, 1),
        _digits(factors.arc_to_chord / ARCSEC, 2),
        _digits(factors.arc_to_chord_back / ARCSEC, 2),
    )
    return list(zip(*columns, strict=True))


def _digits(values: FloatArray, decimals: int) -> list[str]:
    """Numbers with so many decimals, "" for NaN; what rounds to nothing has no sign."""
    rounded = (np.round(values, decimals) + 0.0).tolist()
    return ["" if value != value else f"{value:.{decimals}f}" for value in rounded]


def _angles(values: FloatArray, decimals: int) -> list[str]:
    return [format_dms(angle, decimals) for angle in values.tolist()]


def _write_text(path: Path, lines: list[str]) -> None:
    path.write_text("\n".join(lines) + "\n", encoding="utf-8", newline="\n")


def _write(path: Path, columns: dict[str, Sequence[object]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        rows = csv.writer(file, lineterminator="\n")
        rows.writerow(columns)
        rows.writerows(zip(*columns.values(), strict=True))

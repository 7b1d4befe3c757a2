"""The listing's tables of marks and lines: control, coordinates, ellipses, relative accuracy."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from adjust.adjustment import Adjustment
from adjust.frames import EllipsoidFrame
from adjust.reports.layout import Column, paragraph, shown_of, table, title
from adjust.reports.records import Record, line_records, mark_records
from adjust.reports.selection import listed_lines, listed_marks
from adjust.reports.wording import decimals, dms

MARK = Column("mark", text=True)
PLACES = (Column("easting", "m"), Column("northing", "m"), Column("height", "m"))


def _places(record: Record) -> list[str]:
    return [decimals(record[key], 4) for key in ("easting_m", "northing_m", "height_m")]


def _geographic(record: Record) -> list[str]:
    return [
        dms(record["latitude_deg"], 5),
        dms(record["longitude_deg"], 5),
        decimals(record["ellipsoidal_height_m"], 4),
    ]


def control(adjustment: Adjustment, most: int) -> list[str]:
    """Marks whose coordinates were held or weighted, as they came out."""
    held = np.array([{"fixed", "weighted"} & set(status) != set() for status in adjustment.statuses], dtype=bool)
    rows = np.flatnonzero(held)
    if len(rows) == 0:
        return []
    columns = (MARK, Column("plan", text=True), Column("height", text=True), *PLACES)
    records = mark_records(adjustment, rows[:most])
    cells = [[record["mark"], record["plan_status"], record["height_status"], *_places(record)] for record in records]
    lines = [*title("Control"), *table(columns, cells)]
    return lines + shown_of(len(records), len(rows), "the first in the book", "coordinates.csv")


def coordinates(adjustment: Adjustment, most: int) -> list[str]:
    """Coordinates with sds and 95 % figures, then geographic coordinates, then ellipses."""
    records = mark_records(adjustment, listed_marks(adjustment, most))
    columns = (
        MARK,
        *PLACES,
        *(Column(f"sd {axis}", "mm") for axis in "ENH"),
        Column("95 % circle", "mm"),
        Column("95 % height", "mm"),
    )
    keys = ("sd_easting_mm", "sd_northing_mm", "sd_height_mm", "horizontal_95_mm", "height_95_mm")
    cells = [[record["mark"], *_places(record), *(decimals(record[key], 2) for key in keys)] for record in records]
    lines = [*title("Coordinates"), *table(columns, cells)]
    lines += paragraph(_explained(records))
    lines += shown_of(
        len(records), len(adjustment.job.marks), "the least certain, in the book's order", "coordinates.csv"
    )
    return lines + _geographic_table(records) + _ellipse_table(adjustment, records)


def _explained(records: Sequence[Record]) -> str:
    """What the 95 % figures mean, those that are there."""
    sentences = {
        "horizontal_95_mm": "95 % circle: the true place lies within this radius with a probability of 95 %.",
        "height_95_mm": "95 % height: the true height lies within this much, up or down, with the same probability.",
    }
    return " ".join(text for key, text in sentences.items() if any(record[key] is not None for record in records))


def _geographic_table(records: Sequence[Record]) -> list[str]:
    cells = [[record["mark"], *_geographic(record)] for record in records]
    if not any(cell for row in cells for cell in row[1:]):
        return []
    columns = (MARK, Column("latitude", "d-m-s"), Column("longitude", "d-m-s"), Column("ellipsoidal height", "m"))
    return [*title("Geographic coordinates"), *table(columns, cells)]


def _ellipse_cells(record: Record) -> list[str]:
    standard, confidence = record["ellipse"], record["ellipse_confidence"]
    return [
        decimals(standard["semi_major_mm"], 2),
        decimals(standard["semi_minor_mm"], 2),
        decimals(standard["azimuth_deg"], 1),
        decimals(confidence["semi_major_mm"], 2),
        decimals(confidence["semi_minor_mm"], 2),
    ]


def _ellipse_columns(adjustment: Adjustment) -> tuple[Column, ...]:
    percent = f"{100 * adjustment.job.statistics.confidence:g} %"
    return (
        Column("major", "mm"),
        Column("minor", "mm"),
        Column("azimuth", "deg"),
        Column(f"{percent} major", "mm"),
        Column(f"{percent} minor", "mm"),
    )


def _ellipse_table(adjustment: Adjustment, records: Sequence[Record]) -> list[str]:
    cells = [[record["mark"], *_ellipse_cells(record)] for record in records if record["ellipse"]["semi_major_mm"]]
    if not cells:
        return []
    lines = [*title("Error ellipses"), *table((MARK, *_ellipse_columns(adjustment)), cells)]
    return lines + paragraph(f"Semi-axes; the azimuth is the major one's, clockwise from {_north(adjustment)} north.")


def _north(adjustment: Adjustment) -> str:
    frame = adjustment.job.frame
    return "true" if isinstance(frame, EllipsoidFrame) and frame.is_geographic else "grid"


def relative(adjustment: Adjustment, most: int) -> list[str]:
    """Accuracy of every observed pair of marks against each other."""
    records = line_records(adjustment, listed_lines(adjustment, most))
    if not records:
        return []
    columns = (
        Column("from", text=True),
        Column("to", text=True),
        Column("distance", "m"),
        *_ellipse_columns(adjustment),
        Column("major", "ppm"),
        Column("sd rise", "mm"),
    )
    lines = [
        *title("Relative accuracy of observed lines, worst first"),
        *table(columns, [_line_cells(record) for record in records]),
    ]
    return lines + shown_of(len(records), len(adjustment.lines), "the least certain for their length", "results.json")


def _line_cells(record: Record) -> list[str]:
    distance, major = record["distance_m"], record["ellipse"]["semi_major_mm"]
    ppm = 1000 * major / distance if distance and major is not None else None
    return [
        record["from"],
        record["to"],
        decimals(distance, 3),
        *_ellipse_cells(record),
        decimals(ppm, 1),
        decimals(record["sd_height_difference_mm"], 2),
    ]

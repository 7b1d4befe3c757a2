"""The long tables of marks and of lines: coordinates, relative accuracy."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np

from adjust.adjustment import Adjustment
from adjust.reports.page.table import Heading, PageTable
from adjust.reports.records import Figures, line_figures, mark_figures
from adjust.reports.selection import listed_lines, worst_first
from adjust.reports.wording import decimals, dms

MOST_ROWS = 100_000
"""Rows of one table in the page, the worst: a network of 10,000 marks has them all, and the page stays below 15 MB. A
longer table says how many are left out and which file has them."""

MARK = Heading("mark", "mark", nature="marks", formula="name of the mark, as in the field book")


def whole(chunks: Iterable[Figures]) -> Figures:
    """Chunks of columns put together; of nested ones too."""
    together: Figures = {}
    for chunk in chunks:
        for key, column in chunk.items():
            if isinstance(column, dict):
                together[key] = whole([together[key], column]) if key in together else column
            else:
                together[key] = [*together.get(key, []), *column]
    return together


def fixed(column: Sequence[float | None], places: int, *, signed: bool = False) -> list[str]:
    """Numbers with so many decimals, "" where there is none; what rounds to nothing has no sign."""
    rounded = np.round(np.array(column, dtype=np.float64), places) + 0.0
    plain, with_sign = f"%.{places}f", f"%+.{places}f"
    return ["" if value != value else (with_sign if signed and value else plain) % value for value in rounded.tolist()]


def marks_table(adjustment: Adjustment) -> PageTable:
    """Coordinates of all marks, the least certain first."""
    uncertainty = np.fmax(adjustment.horizontal_95, adjustment.height_95)
    order = worst_first(uncertainty, MOST_ROWS)
    figures = whole(mark_figures(adjustment, order))
    percent = f"{100 * adjustment.job.statistics.confidence:g} %"
    ellipse, confidence = figures["ellipse"], figures["ellipse_confidence"]
    rows: list[tuple[Heading, Sequence[str]]] = [
        (MARK, figures["mark"]),
        (Heading("plan_status", "plan", "", "choice", "how easting and northing came about"), figures["plan_status"]),
        (Heading("height_status", "height is", "", "choice", "how the height came about"), figures["height_status"]),
        *(
            (Heading(key, name, "m", "number", f"adjusted {name}"), fixed(figures[key], 4))
            for key, name in (("easting_m", "easting"), ("northing_m", "northing"), ("height_m", "height"))
        ),
        *(
            (
                Heading(f"sd_{name}_mm", f"sd {letter}", "mm", "number", SD.format(name)),
                fixed(figures[f"sd_{name}_mm"], 2),
            )
            for name, letter in (("easting", "E"), ("northing", "N"), ("height", "H"))
        ),
        (Heading("horizontal_95_mm", "95 % circle", "mm", "number", CIRCLE), fixed(figures["horizontal_95_mm"], 2)),
        (Heading("height_95_mm", "95 % height", "mm", "number", HEIGHT), fixed(figures["height_95_mm"], 2)),
        (
            Heading("ellipse.semi_major_mm", "major", "mm", "number", AXIS.format("major")),
            fixed(ellipse["semi_major_mm"], 2),
        ),
        (
            Heading("ellipse.semi_minor_mm", "minor", "mm", "number", AXIS.format("minor")),
            fixed(ellipse["semi_minor_mm"], 2),
        ),
        (Heading("ellipse.azimuth_deg", "azimuth", "°", "number", AZIMUTH), fixed(ellipse["azimuth_deg"], 1)),
        (
            Heading("ellipse_confidence.semi_major_mm", f"{percent} major", "mm", "number", SCALED.format(percent)),
            fixed(confidence["semi_major_mm"], 2),
        ),
        *(
            (Heading(key, name, "d-m-s", "dms", f"{name} on the ellipsoid"), [dms(value, 5) for value in figures[key]])
            for key, name in (("latitude_deg", "latitude"), ("longitude_deg", "longitude"))
        ),
        (
            Heading("ellipsoidal_height_m", "ellipsoidal height", "m", "number", "height above the ellipsoid"),
            fixed(figures["ellipsoidal_height_m"], 4),
        ),
    ]
    return page_table(
        "marks",
        "Coordinates",
        rows,
        [(int(mark),) for mark in order],
        order="the least certain first",
        left_out=len(adjustment.job.marks) - len(order),
        about="Semi-axes and azimuth are those of the standard ellipse.",
    )


SD = "standard deviation of the {}: square root of its variance"
CIRCLE = "radius about the mark that holds the true place with a probability of 95 %"
HEIGHT = "the true height lies within this much, up or down, with a probability of 95 %"
AXIS = "semi-{} axis of the standard ellipse: square root of an eigenvalue of the covariance of easting and northing"
AZIMUTH = "azimuth of the major axis, clockwise from north, 0 to 180"
SCALED = "semi-major axis of the ellipse that holds the true place with a probability of {}"


def page_table(
    name: str, title: str, rows: Sequence[tuple[Heading, Sequence[str]]], marks: Sequence[tuple[int, ...]], **more: Any
) -> PageTable:
    headings, columns = zip(*rows, strict=True)
    return PageTable(name, title, headings, columns, marks, **more)


def lines_table(adjustment: Adjustment) -> PageTable:
    """Relative accuracy of every observed pair, least certain for its length first."""
    order = listed_lines(adjustment, MOST_ROWS)
    figures = whole(line_figures(adjustment, order))
    names, pairs = adjustment.job.marks.names, [tuple(pair) for pair in adjustment.lines[order].tolist()]
    percent = f"{100 * adjustment.job.statistics.confidence:g} %"
    ellipse, confidence = figures.get("ellipse", {}), figures.get("ellipse_confidence", {})
    majors, lengths = ellipse.get("semi_major_mm", []), figures.get("distance_m", [])
    rows: list[tuple[Heading, Sequence[str]]] = [
        (Heading("marks", "marks", "", "marks", "the two marks"), [f"{names[a]} → {names[b]}" for a, b in pairs]),
        (Heading("distance_m", "distance", "m", "number", "horizontal, at the marks' mean height"), fixed(lengths, 3)),
        (Heading("ppm", "major", "ppm", "number", "semi-major axis over distance"), list(map(_ppm, majors, lengths))),
        *(
            (
                Heading(f"ellipse.semi_{axis}_mm", axis, "mm", "number", RELATIVE.format(axis)),
                fixed(ellipse.get(f"semi_{axis}_mm", []), 2),
            )
            for axis in ("major", "minor")
        ),
        (Heading("ellipse.azimuth_deg", "azimuth", "°", "number", AZIMUTH), fixed(ellipse.get("azimuth_deg", []), 1)),
        (
            Heading("ellipse_confidence.semi_major_mm", f"{percent} major", "mm", "number", SCALED.format(percent)),
            fixed(confidence.get("semi_major_mm", []), 2),
        ),
        (
            Heading("sd_height_difference_mm", "sd ΔH", "mm", "number", "standard deviation of the height difference"),
            fixed(figures.get("sd_height_difference_mm", []), 2),
        ),
    ]
    return page_table(
        "relative",
        "Relative accuracy",
        rows,
        pairs,
        order="the least certain for their length first",
        left_out=len(adjustment.lines) - len(order),
    )


RELATIVE = "semi-{} axis of the standard ellipse of the difference of the two places"


def _ppm(major: float | None, length: float | None) -> str:
    return decimals(1000 * major / length, 1) if major is not None and length else ""

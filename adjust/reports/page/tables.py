"""The long tables of the page: coordinates, observations, relative accuracy."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np

from adjust.adjustment import Adjustment
from adjust.reports.page.table import Heading, PageTable
from adjust.reports.records import Figures, Record, line_figures, mark_figures
from adjust.reports.selection import listed_lines, listed_observations, worst_first
from adjust.reports.wording import NAMES, between, decimals, dms, observed, small, small_unit, what

SECONDS = "″"

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


def _fixed(column: Sequence[float | None], places: int) -> list[str]:
    return [decimals(value, places) for value in column]


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
            (Heading(key, name, "m", "number", f"adjusted {name}"), _fixed(figures[key], 4))
            for key, name in (("easting_m", "easting"), ("northing_m", "northing"), ("height_m", "height"))
        ),
        *(
            (
                Heading(f"sd_{name}_mm", f"sd {letter}", "mm", "number", SD.format(name)),
                _fixed(figures[f"sd_{name}_mm"], 2),
            )
            for name, letter in (("easting", "E"), ("northing", "N"), ("height", "H"))
        ),
        (Heading("horizontal_95_mm", "95 % circle", "mm", "number", CIRCLE), _fixed(figures["horizontal_95_mm"], 2)),
        (Heading("height_95_mm", "95 % height", "mm", "number", HEIGHT), _fixed(figures["height_95_mm"], 2)),
        (
            Heading("ellipse.semi_major_mm", "major", "mm", "number", AXIS.format("major")),
            _fixed(ellipse["semi_major_mm"], 2),
        ),
        (
            Heading("ellipse.semi_minor_mm", "minor", "mm", "number", AXIS.format("minor")),
            _fixed(ellipse["semi_minor_mm"], 2),
        ),
        (Heading("ellipse.azimuth_deg", "azimuth", "°", "number", AZIMUTH), _fixed(ellipse["azimuth_deg"], 1)),
        (
            Heading("ellipse_confidence.semi_major_mm", f"{percent} major", "mm", "number", SCALED.format(percent)),
            _fixed(confidence["semi_major_mm"], 2),
        ),
        *(
            (Heading(key, name, "d-m-s", "dms", f"{name} on the ellipsoid"), [dms(value, 5) for value in figures[key]])
            for key, name in (("latitude_deg", "latitude"), ("longitude_deg", "longitude"))
        ),
        (
            Heading("ellipsoidal_height_m", "ellipsoidal height", "m", "number", "height above the ellipsoid"),
            _fixed(figures["ellipsoidal_height_m"], 4),
        ),
    ]
    return _table(
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


def _table(
    name: str, title: str, rows: Sequence[tuple[Heading, Sequence[str]]], marks: Sequence[tuple[int, ...]], **more: Any
) -> PageTable:
    headings, columns = zip(*rows, strict=True)
    return PageTable(name, title, headings, columns, marks, **more)


def observations_table(adjustment: Adjustment) -> PageTable:
    """All observations with their tests, the worst fit first."""
    key = "tau" if adjustment.solution.sd_basis == "posterior" else "w"
    listed = listed_observations(adjustment, "worst", MOST_ROWS)
    symbol = "τ" if key == "tau" else "w"
    rows: list[tuple[Heading, Sequence[str]]] = [
        (Heading("marks", "marks", "", "marks", "from → to; of an angle at: from → to"), list(map(between, listed))),
        (Heading("kind", "what", "", "choice", "kind of the observation"), list(map(_what, listed))),
        (Heading(key, symbol, "", "number", TESTED[key]), [decimals(record[key], 2, signed=True) for record in listed]),
        (
            Heading("residual", "residual", "", "number", "adjusted minus observed"),
            [small(record, "residual", signed=True) for record in listed],
        ),
        (
            Heading("sd", "sd", "", "number", "standard deviation as claimed beforehand"),
            [small(record, "sd") for record in listed],
        ),
        (
            Heading("unit", "of", "", "choice", "unit of residual, sd and least bias"),
            [SECONDS if small_unit(record) == '"' else small_unit(record) for record in listed],
        ),
        (
            Heading("redundancy", "r", "", "number", REDUNDANCY),
            [decimals(record["redundancy"], 2) for record in listed],
        ),
        (
            Heading("minimal_detectable_bias", "least bias", "", "number", _bias(adjustment)),
            [small(record, "minimal_detectable_bias") for record in listed],
        ),
        (Heading("observed", "observed", "m or d-m-s", "dms", "as the field book has it"), list(map(observed, listed))),
        (Heading("adjusted", "adjusted", "m or d-m-s", "dms", "observed plus residual"), list(map(_adjusted, listed))),
        (
            Heading("source", "source", "", "source", "file and line of the field book"),
            [record["source"] for record in listed],
        ),
    ]
    index = adjustment.job.marks.index
    marks = [
        tuple(index[record[role]] for role in ("at", "from", "to") if record[role] is not None) for record in listed
    ]
    return _table(
        "observations",
        "Observations",
        rows,
        marks,
        order="the worst fit first",
        left_out=adjustment.solution.observations - len(listed),
        flagged=frozenset(place for place, record in enumerate(listed) if record["suspect"]),
        flag="suspect",
    )


TESTED = {
    "w": "residual over its own standard deviation, on σ₀ = 1",
    "tau": "residual over its own standard deviation, on the estimated σ₀",
}
REDUNDANCY = "share of an error of this observation that shows in its residual: 0 nothing checks it, 1 all of it"


def _bias(adjustment: Adjustment) -> str:
    return f"smallest error that the test finds {100 * adjustment.job.statistics.power:g} times in 100"


def _what(record: Record) -> str:
    return what(record) if record["component"] is not None else NAMES[record["kind"]][0]


def _adjusted(record: Record) -> str:
    return observed(dict(record, observed=record["adjusted"]))


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
        (Heading("distance_m", "distance", "m", "number", "horizontal, at the marks' mean height"), _fixed(lengths, 3)),
        (Heading("ppm", "major", "ppm", "number", "semi-major axis over distance"), list(map(_ppm, majors, lengths))),
        *(
            (
                Heading(f"ellipse.semi_{axis}_mm", axis, "mm", "number", RELATIVE.format(axis)),
                _fixed(ellipse.get(f"semi_{axis}_mm", []), 2),
            )
            for axis in ("major", "minor")
        ),
        (Heading("ellipse.azimuth_deg", "azimuth", "°", "number", AZIMUTH), _fixed(ellipse.get("azimuth_deg", []), 1)),
        (
            Heading("ellipse_confidence.semi_major_mm", f"{percent} major", "mm", "number", SCALED.format(percent)),
            _fixed(confidence.get("semi_major_mm", []), 2),
        ),
        (
            Heading("sd_height_difference_mm", "sd ΔH", "mm", "number", "standard deviation of the height difference"),
            _fixed(figures.get("sd_height_difference_mm", []), 2),
        ),
    ]
    return _table(
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

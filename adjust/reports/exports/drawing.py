"""A CAD drawing (DXF): marks, labels, lines and confidence ellipses on layers of their own, in metres."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.errors import FieldDataError, Mistake
from adjust.frames import EllipsoidFrame
from adjust.reports.exports.layers import NOWHERE, with_ellipse
from adjust.reports.exports.options import Options
from adjust.reports.exports.places import METRES, THINNEST, Places, places_of
from adjust.reports.exports.rows import lines_observed
from adjust.reports.exports.text import one_line
from adjust.reports.libraries import library
from adjust.reports.saved import RESULTS, MarkRecord, SavedResults

VERSION = "R2010"
"""The oldest that holds every letter (UTF-8), so that older programs read it too."""

LAYERS = {
    "MARKS_FIXED": 1,
    "MARKS_WEIGHTED": 30,
    "MARKS_ADJUSTED": 7,
    "MARKS_NOT_ADJUSTED": 8,
    "NAMES": 7,
    "HEIGHTS": 8,
    "LINES": 8,
    "LINES_SUSPECT": 1,
    "ELLIPSES": 5,
    "NOTES": 7,
}
"""Layers and their colour numbers; every entity takes the colour of its layer."""

LARGEST_ELLIPSE = 1 / 25
"""Of the drawing's diagonal: what the largest ellipse is exaggerated to, where nobody asks for another figure."""

LETTER = 1 / 120
"""Height of the letters, of the drawing's diagonal: some 2.5 mm on a sheet of 300 mm."""

CROSS = 2
"""$PDMODE of points: an upright cross."""

METRE_UNIT = 6
"""$INSUNITS of a drawing in metres."""

GEOGRAPHIC = (
    "a drawing is in metres on a plane, and a geographic CRS has no grid. "
    "Give the job a projected CRS in job.toml, or export geojson or gpkg"
)


def write_drawing(results: SavedResults, path: Path, options: Options) -> tuple[str, ...]:
    """Marks as points at their height (0 where there is none); returns how ellipses are drawn.

    Raises FieldDataError for a geographic CRS and where no mark has plan coordinates, OutputError without ezdxf.
    """
    ezdxf = library("ezdxf", "cad")
    places = places_of(results)
    if isinstance(places.frame, EllipsoidFrame) and places.frame.is_geographic:
        raise FieldDataError([Mistake(RESULTS, None, "job.crs", GEOGRAPHIC)])
    if not places.in_plan.any():
        raise FieldDataError([Mistake(RESULTS, None, "marks", NOWHERE)])
    positions = np.column_stack([places.frame.grid_coordinates(places.coordinates), _heights(results)])
    diagonal = _diagonal(positions)
    exaggeration = options.exaggeration or suitable(places, diagonal)
    notes = _notes(results, exaggeration)
    with _without_time_of_day(ezdxf):
        document = _document(ezdxf)
        space = document.modelspace()
        _draw_lines(space, results, places, positions)
        _draw_marks(space, places, positions, LETTER * diagonal)
        _draw_ellipses(space, places, with_ellipse(places), positions, exaggeration)
        _draw_notes(space, notes, positions, LETTER * diagonal)
        document.saveas(path)
    return (notes[-1],)


def _heights(results: SavedResults) -> FloatArray:
    return np.array([[mark.height_m or 0.0] for mark in results.marks], dtype=float)


def _diagonal(positions: FloatArray) -> float:
    """Of the smallest upright rectangle about the marks, metres; 1 for a single mark."""
    extent = np.nanmax(positions[:, :2], axis=0) - np.nanmin(positions[:, :2], axis=0)
    return float(np.hypot(*extent)) or 1.0


def suitable(places: Places, diagonal: float) -> float:
    """A round number, 1, 2 or 5 times a power of ten, that makes the largest ellipse easy to see."""
    sizes = [places.marks[row].ellipse_confidence.semi_major_mm or 0.0 for row in with_ellipse(places).tolist()]
    if not sizes:
        return 1.0
    wanted = LARGEST_ELLIPSE * diagonal / (max(sizes) * METRES)
    power = 10.0 ** math.floor(math.log10(wanted))
    return max(step for step in (1.0, 2.0, 5.0) if step <= wanted / power * (1 + 1e-9)) * power


def _document(ezdxf: Any) -> Any:
    document = ezdxf.new(VERSION)
    document.header["$INSUNITS"] = METRE_UNIT
    document.header["$MEASUREMENT"] = 1
    document.header["$PDMODE"] = CROSS
    for name, colour in LAYERS.items():
        document.layers.add(name, color=colour)
    return document


def _draw_marks(space: Any, places: Places, positions: FloatArray, letter: float) -> None:
    for row in np.flatnonzero(places.in_plan).tolist():
        mark, (east, north, height) = places.marks[row], positions[row].tolist()
        space.add_point((east, north, height), dxfattribs={"layer": _layer(mark)})
        _write(space, mark.mark, (east + letter, north + letter / 2), letter, "NAMES")
        if mark.height_m is not None:
            _write(space, f"{mark.height_m:.4f}", (east + letter, north - letter), 0.7 * letter, "HEIGHTS")


def _layer(mark: MarkRecord) -> str:
    return "MARKS_NOT_ADJUSTED" if mark.plan_status == "none" else f"MARKS_{mark.plan_status.upper()}"


def _draw_lines(space: Any, results: SavedResults, places: Places, positions: FloatArray) -> None:
    """From mark to mark in space."""
    _, suspects = lines_observed(results)
    for line in results.relative:
        ends = [places.index[line.start], places.index[line.to]]
        if places.in_plan[ends].all():
            layer = "LINES_SUSPECT" if frozenset((line.start, line.to)) in suspects else "LINES"
            space.add_line(*map(tuple, positions[ends].tolist()), dxfattribs={"layer": layer})


def _draw_ellipses(space: Any, places: Places, rows: IntArray, positions: FloatArray, exaggeration: float) -> None:
    for row in rows.tolist():
        ellipse = places.marks[row].ellipse_confidence
        major, minor = (ellipse.semi_major_mm or 0.0), (ellipse.semi_minor_mm or 0.0)
        azimuth, length = math.radians(ellipse.azimuth_deg or 0.0), major * METRES * exaggeration
        axis = (length * math.sin(azimuth), length * math.cos(azimuth), 0.0)
        ratio = max(minor / major, THINNEST)
        space.add_ellipse((*positions[row, :2].tolist(), 0.0), axis, ratio, dxfattribs={"layer": "ELLIPSES"})


def _notes(results: SavedResults, exaggeration: float) -> tuple[str, ...]:
    confidence = results.solution.global_test.confidence
    system = results.job.crs or "plane frame"
    return (
        results.job.title,
        f"{system}, metres. Computed, not certified.",
        *results.cautions,
        f"Ellipses at {100 * confidence:g} % confidence, drawn {exaggeration:g} times their size.",
    )


def _draw_notes(space: Any, notes: Sequence[str], positions: FloatArray, letter: float) -> None:
    """Below the drawing, at its left edge."""
    east, north = np.nanmin(positions[:, :2], axis=0).tolist()
    for count, note in enumerate(notes):
        _write(space, note, (east, north - (6 + 2 * count) * letter), letter, "NOTES")


def _write(space: Any, text: str, place: tuple[float, float], height: float, layer: str) -> None:
    space.add_text(drawn_as_written(text), height=height, dxfattribs={"layer": layer, "insert": (*place, 0.0)})


def drawn_as_written(text: str) -> str:
    """The text on one line, without the codes that drawings make symbols of: `%%c` is a diameter, `^I` a tabulator."""
    return one_line(text).replace("%%", "%%%%%%").replace("^", "^ ")


@contextmanager
def _without_time_of_day(ezdxf: Any) -> Iterator[None]:
    """No time of day and no random identifiers in a drawing: the same results make the same bytes."""
    before = ezdxf.options.write_fixed_meta_data_for_testing
    ezdxf.options.write_fixed_meta_data_for_testing = True
    try:
        yield
    finally:
        ezdxf.options.write_fixed_meta_data_for_testing = before

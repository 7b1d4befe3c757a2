"""The three layers of a map: marks, lines and confidence ellipses, as geometries with their rows of figures."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from adjust.arrays import IntArray
from adjust.errors import FieldDataError, Mistake
from adjust.reports.exports.places import CORNERS, Places, Target
from adjust.reports.exports.rows import Row, line_row, lines_observed, mark_row
from adjust.reports.saved import RESULTS, EllipseRecord, SavedResults

NOWHERE = "no mark has plan coordinates, so there is nothing to draw; give marks.csv approximate plan coordinates"


@dataclass(frozen=True)
class Layer:
    """Geometries of shapely (n,) and one row of figures for each."""

    name: str
    geometry: str
    """What they are, as GIS files name it."""
    shapes: NDArray[Any]
    rows: Sequence[Row]


def layers(results: SavedResults, places: Places, target: Target, exaggeration: float) -> tuple[Layer, ...]:
    """Marks, lines and ellipses of the marks that have a plan position.

    Lines and ellipses may be none. Raises FieldDataError where no mark has a plan position.
    """
    if not places.in_plan.any():
        raise FieldDataError([Mistake(RESULTS, None, "marks", NOWHERE)])
    return (
        _marks(places, target),
        _lines(results, places, target),
        _ellipses(results, places, target, exaggeration),
    )


def _marks(places: Places, target: Target) -> Layer:
    import shapely

    chosen = np.flatnonzero(places.in_plan)
    rows = [mark_row(places.marks[row]) for row in chosen.tolist()]
    return Layer("marks", "Point", np.asarray(shapely.points(target(places.coordinates[chosen]))), rows)


def _lines(results: SavedResults, places: Places, target: Target) -> Layer:
    import shapely

    kinds, suspects = lines_observed(results)
    ends = np.array([(places.index[line.start], places.index[line.to]) for line in results.relative], dtype=np.int64)
    ends = ends.reshape(-1, 2)
    chosen = np.flatnonzero(places.in_plan[ends].all(axis=1))
    corners = target(places.coordinates[ends[chosen].ravel()]).reshape(-1, 2, 2)
    rows = []
    for line in (results.relative[row] for row in chosen.tolist()):
        pair = frozenset((line.start, line.to))
        rows.append(line_row(line, kinds.get(pair, ()), suspects.get(pair, ())))
    return Layer("lines", "LineString", np.asarray(shapely.linestrings(corners)), rows)


def _ellipses(results: SavedResults, places: Places, target: Target, exaggeration: float) -> Layer:
    import shapely

    chosen = with_ellipse(places)
    ellipses = [places.marks[row].ellipse_confidence for row in chosen.tolist()]
    corners = places.outlines(chosen, ellipses, exaggeration).reshape(-1, 3)
    shapes = np.asarray(shapely.polygons(target(corners).reshape(-1, CORNERS, 2)))
    confidence = results.solution.global_test.confidence
    rows = [
        _ellipse_row(places.marks[row].mark, ellipse, confidence, exaggeration)
        for row, ellipse in zip(chosen.tolist(), ellipses, strict=True)
    ]
    return Layer("ellipses", "Polygon", shapes, rows)


def _ellipse_row(mark: str, ellipse: EllipseRecord, confidence: float, exaggeration: float) -> Row:
    return {"mark": mark, "confidence": confidence, **dict(ellipse), "exaggeration": exaggeration}


def with_ellipse(places: Places) -> IntArray:
    """Rows of the marks that have an ellipse of some size."""
    sized = [bool(mark.ellipse_confidence.semi_major_mm) for mark in places.marks]
    return np.flatnonzero(places.in_plan & np.array(sized, dtype=bool))

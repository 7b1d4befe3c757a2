"""The figures of an adjustment in the units of the outputs: of marks, of observations and of lines.

All outputs are made of these columns, hence carry the same figures. A figure that does not exist is None, never NaN.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray, IntArray
from adjust.frames import EllipsoidFrame
from adjust.job import Job
from adjust.observations import ControlCoordinates, Observations
from adjust.quality import Ellipse
from adjust.residuals import Residuals

Figures = dict[str, Any]
"""Equally long columns by key; a nested one holds the columns of a nested record."""

Record = dict[str, Any]
"""One row of `Figures`: what a mark, an observation or a line has to show."""

MILLIMETRES = 1000.0
SQUARE_MILLIMETRES = 1e6

ROWS_AT_ONCE = 20_000
"""Rows made from arrays together: enough to spread NumPy's overhead, few enough to spare the memory."""

CONTROL_COMPONENTS = ("easting", "northing", "height")


def job_record(job: Job) -> Record:
    """The job by its name, its frame and its files; `crs` is None in a plane frame."""
    return {
        "title": job.title,
        "frame": job.frame.kind,
        "crs": job.frame.crs if isinstance(job.frame, EllipsoidFrame) else None,
        "input_sha256": job.input_sha256,
        "date": job.date,
    }


def plain(values: FloatArray) -> list[Any]:
    """Numbers of an array (n,) as Python floats, None where there is none; nothing is printed as −0."""
    numbers: list[Any] = (values + 0.0).tolist()
    if np.isfinite(values).all():
        return numbers
    return [value if math.isfinite(value) else None for value in numbers]


def number(value: float | None) -> float | None:
    """One number, None where there is none."""
    return float(value) if value is not None and math.isfinite(value) else None


def known_coordinates(adjustment: Adjustment) -> FloatArray:
    """Coordinates (n, 3) that may be shown: adjusted or held, else as given in the field book, else NaN.

    The iteration puts marks without a height on a working height; that is not a result and stays out.
    """
    statuses = np.array(adjustment.statuses, dtype=str).reshape(-1, 2)
    without = (statuses == "none")[:, [0, 0, 1]]
    shown: FloatArray = np.where(without, adjustment.job.marks.given, adjustment.coordinates)
    return shown


def mark_figures(adjustment: Adjustment, rows: IntArray | None = None) -> Iterator[Figures]:
    """Figures of all marks, or of the marks `rows` in that order, some rows at a time."""
    chosen = np.arange(len(adjustment.job.marks)) if rows is None else rows
    coordinates = known_coordinates(adjustment)
    for first in range(0, len(chosen), ROWS_AT_ONCE):
        yield _marks(adjustment, coordinates, chosen[first : first + ROWS_AT_ONCE])


def mark_records(adjustment: Adjustment, rows: IntArray) -> list[Record]:
    """One record for each of the marks `rows`."""
    return [record for figures in mark_figures(adjustment, rows) for record in records(figures)]


def _marks(adjustment: Adjustment, coordinates: FloatArray, rows: IntArray) -> Figures:
    statuses = [adjustment.statuses[row] for row in rows.tolist()]
    sds = adjustment.standard_deviations[rows] * MILLIMETRES
    return {
        "mark": [adjustment.job.marks.names[row] for row in rows.tolist()],
        "plan_status": [plan for plan, _ in statuses],
        "height_status": [height for _, height in statuses],
        **_places(adjustment, coordinates, rows),
        "sd_easting_mm": plain(sds[:, 0]),
        "sd_northing_mm": plain(sds[:, 1]),
        "sd_height_mm": plain(sds[:, 2]),
        "covariance_mm2": _matrices(adjustment.mark_covariances[rows] * SQUARE_MILLIMETRES),
        "ellipse": _ellipses(adjustment.ellipses, rows),
        "ellipse_confidence": _ellipses(adjustment.ellipses.scaled(adjustment.ellipse_factor), rows),
        "horizontal_95_mm": plain(adjustment.horizontal_95[rows] * MILLIMETRES),
        "height_95_mm": plain(adjustment.height_95[rows] * MILLIMETRES),
        "description": [adjustment.job.marks.descriptions[row] for row in rows.tolist()],
    }


def _places(adjustment: Adjustment, coordinates: FloatArray, rows: IntArray) -> Figures:
    """Grid, geographic and ellipsoidal coordinates, as far as the frame has them."""
    frame, geometry = adjustment.job.frame, adjustment.geometry
    grid = frame.grid_coordinates(coordinates[rows])
    geographic = np.degrees(frame.geographic(coordinates[rows]))
    heights = coordinates[rows, 2]
    on_ellipsoid = heights + geometry.geoid[rows] if geometry.orthometric else heights
    return {
        "easting_m": plain(grid[:, 0]),
        "northing_m": plain(grid[:, 1]),
        "height_m": plain(heights),
        "latitude_deg": plain(geographic[:, 1]),
        "longitude_deg": plain(geographic[:, 0]),
        "ellipsoidal_height_m": plain(on_ellipsoid) if frame.kind == "ellipsoid" else [None] * len(rows),
    }


def _matrices(matrices: FloatArray) -> list[list[list[Any]]]:
    """Nested lists of matrices (n, 3, 3)."""
    entries = plain(matrices.ravel())
    lines = [entries[first : first + 3] for first in range(0, len(entries), 3)]
    return [lines[first : first + 3] for first in range(0, len(lines), 3)]


def _ellipses(ellipses: Ellipse, rows: IntArray) -> Figures:
    azimuths = np.degrees(ellipses.azimuth[rows])
    return {
        "semi_major_mm": plain(ellipses.semi_major[rows] * MILLIMETRES),
        "semi_minor_mm": plain(ellipses.semi_minor[rows] * MILLIMETRES),
        "azimuth_deg": plain(np.where(azimuths >= 180.0, 0.0, azimuths)),
    }


def observation_figures(adjustment: Adjustment) -> Iterator[Figures]:
    """Figures of each component of each observation, kinds in the registry's order, rows in the book's."""
    for table in adjustment.residuals:
        scalars = table.residual.size
        for first in range(0, scalars, ROWS_AT_ONCE):
            yield scalar_figures(adjustment, table, np.arange(first, min(first + ROWS_AT_ONCE, scalars)))


def scalar_figures(adjustment: Adjustment, table: Residuals, scalars: IntArray) -> Figures:
    """Figures of one kind's `scalars`: row · components + component."""
    observations = table.observations
    rows, components = np.divmod(scalars, len(observations.components))
    angular = observations.unit == "rad"
    observed, adjusted = _values(adjustment, table, scalars, rows)

    def in_unit(values: FloatArray) -> list[Any]:
        chosen = values.ravel()[scalars]
        return plain(np.degrees(chosen) if angular else chosen)

    return {
        "source": _sources(observations, rows),
        "kind": [observations.kind] * len(scalars),
        "component": _components(observations, rows, components),
        **_roles(adjustment, observations, rows),
        "unit": ["deg" if angular else "m"] * len(scalars),
        "observed": plain(np.degrees(observed) if angular else observed),
        "adjusted": plain(np.degrees(adjusted) if angular else adjusted),
        "residual": in_unit(table.residual),
        "sd": in_unit(table.sd),
        "minimal_detectable_bias": in_unit(table.minimal_detectable_bias),
        "redundancy": plain(table.redundancy.ravel()[scalars]),
        "w": plain(table.w.ravel()[scalars]),
        "tau": plain(table.tau.ravel()[scalars]),
        "suspect": table.suspect.ravel()[scalars].tolist(),
    }


def _values(
    adjustment: Adjustment, table: Residuals, scalars: IntArray, rows: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Observed and adjusted values (scalars,). Of weighted control: the coordinate given, and it plus its residual.

    A geographic CRS has no easting and northing, so that of its plan control only the residual exists.
    """
    observations = table.observations
    if not isinstance(observations, ControlCoordinates):
        return observations.observed.ravel()[scalars], table.adjusted.ravel()[scalars]
    given = observations.given[rows]
    coordinates = np.column_stack([adjustment.job.frame.grid_coordinates(given), given[:, 2]])
    observed = coordinates[np.arange(len(rows)), observations.component[rows]]
    return observed, observed + table.residual.ravel()[scalars]


def _sources(observations: Observations, rows: IntArray) -> list[str]:
    files, provenance = observations.provenance.files, observations.provenance
    if provenance.further is not None:
        return [provenance.label(row) for row in rows.tolist()]
    places = zip(provenance.file[rows].tolist(), provenance.line[rows].tolist(), strict=True)
    return [f"{files[file]}:{line}" for file, line in places]


def _components(observations: Observations, rows: IntArray, components: IntArray) -> list[str | None]:
    if isinstance(observations, ControlCoordinates):
        return [CONTROL_COMPONENTS[component] for component in observations.component[rows].tolist()]
    return [observations.components[component] or None for component in components.tolist()]


def _roles(adjustment: Adjustment, observations: Observations, rows: IntArray) -> Figures:
    """Names of the marks and of the setup, None where the kind has no such role."""
    names, setup = adjustment.job.marks.names, observations.setup
    columns: Figures = dict.fromkeys(("at", "from", "to", "setup"), [None] * len(rows))
    for position, role in enumerate(observations.roles):
        columns[role] = [names[mark] for mark in observations.marks[rows, position].tolist()]
    if setup is not None:
        columns["setup"] = [adjustment.job.setups[index] for index in setup[rows].tolist()]
    return columns


def line_figures(adjustment: Adjustment, rows: IntArray | None = None) -> Iterator[Figures]:
    """Figures of each observed pair of marks, or of the lines `rows` in that order, some rows at a time."""
    chosen = np.arange(len(adjustment.lines)) if rows is None else rows
    for first in range(0, len(chosen), ROWS_AT_ONCE):
        yield _lines(adjustment, chosen[first : first + ROWS_AT_ONCE])


def line_records(adjustment: Adjustment, rows: IntArray) -> list[Record]:
    """One record for each of the lines `rows`."""
    return [record for figures in line_figures(adjustment, rows) for record in records(figures)]


def _lines(adjustment: Adjustment, rows: IntArray) -> Figures:
    names = adjustment.job.marks.names
    ellipses = adjustment.line_ellipses
    return {
        "from": [names[mark] for mark in adjustment.lines[rows, 0].tolist()],
        "to": [names[mark] for mark in adjustment.lines[rows, 1].tolist()],
        "distance_m": plain(adjustment.line_lengths[rows]),
        "ellipse": _ellipses(ellipses, rows),
        "ellipse_confidence": _ellipses(ellipses.scaled(adjustment.ellipse_factor), rows),
        "sd_height_difference_mm": plain(np.sqrt(adjustment.line_covariances[rows, 2, 2]) * MILLIMETRES),
    }


def records(figures: Mapping[str, Any]) -> Iterator[Record]:
    """The rows of columns."""
    keys = tuple(figures)
    columns = [records(column) if isinstance(column, dict) else column for column in figures.values()]
    for values in zip(*columns, strict=True):
        yield dict(zip(keys, values, strict=True))

"""Observations of every kind between invented marks, for tests that go through the whole registry."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import EllipsoidFrame, Frame, Geometry
from adjust.observations import (
    KINDS,
    ControlCoordinates,
    Directions,
    Observations,
    Precision,
    Provenance,
    SlopeDistances,
    Vectors,
    ZenithAngles,
)

DEFLECTION_SD = 1e-4  # rad: 20″, mountains
STEEPEST = 0.7  # rad: 40°


def kinds_of(frame: Frame) -> list[type[Observations]]:
    """The kinds that a frame can hold."""
    return [kind for kind in KINDS if kind is not Vectors or isinstance(frame, EllipsoidFrame)]


def scattered(frame: Frame, origin: FloatArray, length: float, rows: int, generator: np.random.Generator) -> FloatArray:
    """Three marks for each row (rows, 3, 3): a station near the origin, two targets some `length` away, up and down."""
    stations = frame.moved(np.tile(origin, (rows, 1)), generator.uniform(-length, length, (rows, 3)) * [1, 1, 0.01])
    marks = [stations]
    for _ in range(2):
        azimuth, slope = generator.uniform(-np.pi, np.pi, rows), generator.uniform(-STEEPEST, STEEPEST, rows)
        distance = length * generator.uniform(0.5, 1.5, rows)
        level, rise = distance * np.cos(slope), np.minimum(distance, 5000.0) * np.sin(slope)
        marks.append(frame.moved(stations, np.column_stack([level * np.sin(azimuth), level * np.cos(azimuth), rise])))
    return np.stack(marks, axis=1)


def scattered_geometry(
    frame: Frame,
    origin: FloatArray,
    length: float,
    rows: int,
    generator: np.random.Generator,
    *,
    orthometric: bool = False,
) -> tuple[Geometry, IntArray]:
    """Marks in no order at all, and the three (rows, 3) that each row may use, never shared between rows."""
    order = generator.permutation(3 * rows)
    coordinates = np.empty((3 * rows, 3))
    coordinates[order] = scattered(frame, origin, length, rows, generator).reshape(-1, 3)
    geoid = generator.normal(45.0, 0.5, 3 * rows)
    if orthometric:
        coordinates[:, 2] -= geoid
    deflection = generator.normal(0.0, DEFLECTION_SD, (3 * rows, 2))
    return Geometry(frame, coordinates, geoid, deflection, orthometric, 0.13), order.reshape(rows, 3)


def precise(rows: int, **columns: float) -> Precision:
    """An instrument of the given sds, the others zero; nothing stated by the rows."""
    names = ("stated", "constant", "proportional", "centring", "target_centring", "heights")
    return Precision(*(np.full(rows, columns.get(name, np.nan if name == "stated" else 0.0)) for name in names))


def observe(
    kind: type[Observations],
    geometry: Geometry,
    marks: IntArray,
    generator: np.random.Generator,
    precision: Precision | None = None,
) -> Observations:
    """Rows of a kind along `marks` (rows, roles or more), observed as predicted; instruments stand 1 to 2 m high."""
    rows = len(marks)
    columns: dict[str, Any] = {
        "marks": marks[:, : len(kind.roles)],
        "observed": np.zeros((rows, len(kind.components))),
        "provenance": Provenance(("test.csv",), np.zeros(rows, dtype=np.int64), np.arange(2, rows + 2)),
    }
    if kind is Vectors:
        columns["covariances"] = np.broadcast_to(np.eye(3), (rows, 3, 3))
    elif kind is ControlCoordinates:
        given = geometry.frame.moved(geometry.coordinates[marks[:, 0]], generator.normal(0.0, 0.02, (rows, 3)))
        columns |= {"component": np.arange(rows) % 3, "given": given, "sd": np.full(rows, 0.01)}
    else:
        columns["precision"] = precise(rows, constant=1.0) if precision is None else precision
    if kind is Directions:
        columns["setup_index"] = np.zeros(rows, dtype=np.int64)
    if kind in (SlopeDistances, ZenithAngles):
        columns["heights"] = generator.uniform(1.0, 2.0, (rows, 2))
    observations = kind(**columns)
    return (
        observations if kind is ControlCoordinates else replace(observations, observed=observations.predict(geometry))
    )

"""Jobs for tests from plain Python lists (names, radians, metres), and exact observations of a known truth."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import EllipsoidFrame, Frame, Geometry, PlaneFrame
from adjust.job import Control, Datum, Job, Marks
from adjust.observations import (
    Angles,
    Azimuths,
    ControlCoordinates,
    Directions,
    HeightDifferences,
    HorizontalDistances,
    Observations,
    Precision,
    Provenance,
    SlopeDistances,
    Vectors,
    ZenithAngles,
)

ARC_SECOND = np.pi / 180 / 3600
ANGLE_SD = ARC_SECOND
LENGTH_SD = 0.001
WEIGHTED_SD = 0.01

Row = Sequence[Any]
"""Names of marks, then the value (None: to be filled by `exact`), then what else the kind needs."""


def build_job(
    marks: Mapping[str, Sequence[float | None] | None] | Iterable[str],
    *,
    fixed: Iterable[str] = (),
    fixed_plan: Iterable[str] = (),
    fixed_height: Iterable[str] = (),
    weighted: Iterable[str] = (),
    directions: Iterable[Row] = (),
    angles: Iterable[Row] = (),
    azimuths: Iterable[Row] = (),
    slopes: Iterable[Row] = (),
    horizontals: Iterable[Row] = (),
    zeniths: Iterable[Row] = (),
    levels: Iterable[Row] = (),
    vectors: Iterable[Row] = (),
    frame: Frame | None = None,
    inner: bool = False,
    **settings: Any,
) -> Job:
    """A job whose rows are given as tuples.

    `marks` maps each name to its given coordinates in the frame (easting, northing, height; None where not given), or
    is a list of names without any. `fixed` marks are fixed in plan and, where they have one, in height; `weighted` ones
    likewise, with sd 10 mm. Rows: directions (setup, at, to, value); angles (at, from, to, value); azimuths,
    horizontals (at, to, value); slopes, zeniths (at, to, value[, instrument height, target height]); levels
    (from, to, rise); vectors (from, to, (dx, dy, dz)[, covariance]). Values are radians and metres, None or left out
    for `exact` to fill in. `settings` go to `Job`.
    """
    table = _marks(marks, set(fixed), set(fixed_plan), set(fixed_height), set(weighted))
    rounds = list(directions)
    setups = tuple(dict.fromkeys(str(row[0]) for row in rounds))
    number = {name: index for index, name in enumerate(setups)}
    kinds: list[Observations] = [
        Directions(
            **_rows("directions", table, [row[1:] for row in rounds], 2),
            precision=_precision(len(rounds), ANGLE_SD),
            setup_index=np.array([number[str(row[0])] for row in rounds], dtype=np.int64),
        ),
        _plain(Angles, "angles", table, list(angles), 3, ANGLE_SD),
        _plain(Azimuths, "azimuths", table, list(azimuths), 2, ANGLE_SD),
        _heighted(SlopeDistances, "distances", table, list(slopes), LENGTH_SD),
        _plain(HorizontalDistances, "distances", table, list(horizontals), 2, LENGTH_SD),
        _heighted(ZenithAngles, "zeniths", table, list(zeniths), ANGLE_SD),
        _plain(HeightDifferences, "levels", table, list(levels), 2, LENGTH_SD),
        _vectors(table, list(vectors)),
    ]
    if not inner:
        kinds.append(_weighted_control(table))
    return Job(
        title="test",
        frame=PlaneFrame() if frame is None else frame,
        marks=table,
        observations=tuple(rows for rows in kinds if len(rows)),
        setups=setups,
        datum=Datum("inner" if inner else "control"),
        **settings,
    )


PLANE = PlaneFrame()
PLANE_ORIGIN = np.array([5000.0, 2000.0, 300.0])
ELLIPSOID = EllipsoidFrame("EPSG:25833")
ELLIPSOID_ORIGIN = np.array([np.radians(16.3), np.radians(47.2), 300.0])
"""An invented place a degree off the central meridian, so that grid north and true north differ."""


def laid_out(local: Mapping[str, Sequence[float]], frame: Frame) -> dict[str, FloatArray]:
    """True coordinates in a frame of marks at `local` metres east, north and up of an origin; up may be left out."""
    offsets = np.array([[*place, 0.0][:3] for place in local.values()], dtype=float)
    origin = ELLIPSOID_ORIGIN if isinstance(frame, EllipsoidFrame) else PLANE_ORIGIN
    coordinates = frame.moved(np.tile(origin, (len(offsets), 1)), offsets * (1.0, 1.0, 0.0))
    coordinates[:, 2] = origin[2] + offsets[:, 2]
    return dict(zip(local, coordinates, strict=True))


def truth_of(job: Job, coordinates: Mapping[str, Sequence[float]]) -> FloatArray:
    """True coordinates (n, 3) in the order of the job's marks."""
    return np.array([coordinates[name] for name in job.marks.names], dtype=float).reshape(-1, 3)


def geometry_at(job: Job, coordinates: FloatArray) -> Geometry:
    """The job's geometry at some coordinates (n, 3)."""
    marks = job.marks
    return Geometry(job.frame, coordinates, marks.geoid, marks.deflection, job.orthometric, job.refraction_coefficient)


def exact(job: Job, truth: FloatArray, orientations: FloatArray | None = None) -> Job:
    """The job with every value replaced by its exact one at the true coordinates (n, 3).

    `orientations` (setups,) of the rounds; by default different odd ones. Directions, angles and azimuths come out
    in 0 … 2π, as instruments read them.
    """
    geometry = geometry_at(job, truth)
    zero = 0.3 + 1.1 * np.arange(len(job.setups)) if orientations is None else orientations
    return replace(job, observations=tuple(_observed(rows, geometry, zero) for rows in job.observations))


def shuffled(job: Job, generator: np.random.Generator) -> Job:
    """The same job with the rows of each kind, and the kinds, in another order."""
    kinds = [rows.take(generator.permutation(len(rows))) for rows in job.observations]
    return replace(job, observations=tuple(kinds[index] for index in generator.permutation(len(kinds))))


def _observed(rows: Observations, geometry: Geometry, orientations: FloatArray) -> Observations:
    if rows.kind == "control":
        return rows
    value = rows.predict(geometry)
    if rows.setup is not None:
        value = value - orientations[rows.setup][:, None]
    if rows.kind in ("direction", "angle", "azimuth"):
        value = value % (2 * np.pi)
    return replace(rows, observed=value)


def _marks(
    marks: Mapping[str, Sequence[float | None] | None] | Iterable[str],
    fixed: set[str],
    fixed_plan: set[str],
    fixed_height: set[str],
    weighted: set[str],
) -> Marks:
    given = dict(marks) if isinstance(marks, Mapping) else dict.fromkeys(marks)
    names = tuple(given)
    coordinates = np.array([_numbers(value) for value in given.values()], dtype=float).reshape(-1, 3)
    plan = [Control.WEIGHTED if n in weighted else Control.FIXED if n in fixed | fixed_plan else 0 for n in names]
    height = [Control.WEIGHTED if n in weighted else Control.FIXED if n in fixed | fixed_height else 0 for n in names]
    control = np.array([plan, height], dtype=np.int64).T.reshape(-1, 2)
    control[np.isnan(coordinates[:, [0, 2]])] = Control.FREE
    states = control[:, [0, 0, 1]]
    return Marks(
        names=names,
        given=coordinates,
        control=control,
        sd=np.where(states == Control.WEIGHTED, WEIGHTED_SD, np.nan),
        geoid=np.zeros(len(names)),
        deflection=np.zeros((len(names), 2)),
        descriptions=("",) * len(names),
        provenance=_provenance("marks", len(names)),
    )


def _numbers(value: Sequence[float | None] | None) -> list[float]:
    values = [np.nan if number is None else float(number) for number in (() if value is None else value)]
    return values + [np.nan] * (3 - len(values))


def _provenance(table: str, rows: int) -> Provenance:
    return Provenance((f"{table}.csv",), np.zeros(rows, dtype=np.int64), np.arange(2, rows + 2))


def _precision(rows: int, sd: float) -> Precision:
    return Precision.of_sd(np.full(rows, sd))


def _rows(table: str, marks: Marks, rows: list[Row], roles: int) -> dict[str, Any]:
    index: IntArray = np.array([[marks.index[str(name)] for name in row[:roles]] for row in rows], dtype=np.int64)
    values = [row[roles] if len(row) > roles and row[roles] is not None else np.nan for row in rows]
    return {
        "marks": index.reshape(-1, roles),
        "observed": np.array(values, dtype=float).reshape(-1, 1),
        "provenance": _provenance(table, len(rows)),
    }


def _plain(kind: Any, table: str, marks: Marks, rows: list[Row], roles: int, sd: float) -> Observations:
    result: Observations = kind(**_rows(table, marks, rows, roles), precision=_precision(len(rows), sd))
    return result


def _heighted(kind: Any, table: str, marks: Marks, rows: list[Row], sd: float) -> Observations:
    above = np.array([row[3:5] if len(row) > 3 else (0.0, 0.0) for row in rows], dtype=float).reshape(-1, 2)
    result: Observations = kind(**_rows(table, marks, rows, 2), precision=_precision(len(rows), sd), heights=above)
    return result


def _vectors(marks: Marks, rows: list[Row]) -> Vectors:
    values = [row[2] if len(row) > 2 and row[2] is not None else (np.nan,) * 3 for row in rows]
    covariances = [row[3] if len(row) > 3 else np.eye(3) * LENGTH_SD**2 for row in rows]
    columns = _rows("vectors", marks, [row[:2] for row in rows], 2)
    columns["observed"] = np.array(values, dtype=float).reshape(-1, 3)
    return Vectors(**columns, covariances=np.array(covariances, dtype=float).reshape(-1, 3, 3))


def _weighted_control(marks: Marks) -> ControlCoordinates:
    mark, component = np.nonzero(marks.control[:, [0, 0, 1]] == Control.WEIGHTED)
    return ControlCoordinates(
        marks=mark[:, None].astype(np.int64),
        observed=np.zeros((len(mark), 1)),
        provenance=marks.provenance.take(mark),
        component=component.astype(np.int64),
        given=marks.given[mark],
        sd=marks.sd[mark, component],
    )

"""Measuring an invented network: predictions at the true coordinates, noise of the stated covariance, blunders."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from adjust.angles import FULL_TURN
from adjust.arrays import FloatArray
from adjust.frames import Geometry
from adjust.job import Control, Job, Marks
from adjust.observations import ControlCoordinates, Observations
from adjust.unknowns import find_unknowns


@dataclass(frozen=True)
class Blunder:
    """A mistake of `size`, metres or radians, to be planted in the row `source`, for example `distances.csv:7`."""

    source: str
    size: float
    component: int = 0


@dataclass(frozen=True)
class Truth:
    """What only the simulator knows: coordinates (n, 3) of the frame, orientations (setups,) in radians, blunders."""

    coordinates: FloatArray
    orientations: FloatArray
    blunders: tuple[Blunder, ...] = ()


def observe(
    plan: Job, generator: np.random.Generator, blunders: Sequence[Blunder] = (), *, start_sd: float | None = None
) -> tuple[Job, Truth]:
    """Measure everything that a plan lists.

    `plan` is a job whose marks stand at their true coordinates and whose rows name what to measure; their observed
    values are ignored. In the job that comes back fixed control keeps its coordinates, weighted control is off by its
    sd, and free marks have none, or coordinates off by `start_sd` metres (1σ) as a start. A free network keeps the true
    coordinates: they are its datum. Raises ValueError when a blunder names a row that is not in the plan.
    """
    geometry = true_geometry(plan)
    orientations = generator.uniform(0.0, FULL_TURN, len(plan.setups))
    marks = _as_the_field_party_knows_them(plan, generator, start_sd)
    observations = tuple(_measured(rows, geometry, orientations, marks, generator) for rows in plan.observations)
    job = replace(plan, marks=marks, observations=_with_blunders(observations, blunders))
    return job, Truth(plan.marks.given, orientations, tuple(blunders))


def true_geometry(plan: Job) -> Geometry:
    """The geometry of a plan, whose given coordinates are the true ones."""
    marks = plan.marks
    return Geometry(
        plan.frame, marks.given, marks.geoid, marks.deflection, plan.orthometric, plan.refraction_coefficient
    )


def _measured(
    rows: Observations, geometry: Geometry, orientations: FloatArray, marks: Marks, generator: np.random.Generator
) -> Observations:
    if isinstance(rows, ControlCoordinates):
        return replace(rows, given=marks.given[rows.marks[:, 0]])
    exact = rows.predict(geometry)
    if rows.setup is not None:
        exact = exact - orientations[rows.setup][:, None]
    factor = np.linalg.cholesky(replace(rows, observed=exact).covariance(geometry))
    noise = np.einsum("rij,rj->ri", factor, generator.standard_normal(exact.shape))
    measured = replace(rows, observed=exact + noise)
    return replace(measured, observed=measured.observed % FULL_TURN) if rows.full_circle else measured


def _as_the_field_party_knows_them(plan: Job, generator: np.random.Generator, start_sd: float | None) -> Marks:
    """Control as it is published; free coordinates unknown, or known roughly."""
    marks = plan.marks
    errors = generator.standard_normal(marks.given.shape)
    if plan.datum.mode == "inner":
        return marks
    state = np.column_stack([marks.control[:, 0], marks.control[:, 0], marks.control[:, 1]])
    weighted = state == Control.WEIGHTED
    free = (state == Control.FREE) & find_unknowns(plan).sought
    grid = np.where(weighted, errors * marks.sd, 0.0)
    shift = _from_grid_axes(grid, plan.frame.grid_rotation(marks.given))
    if start_sd is not None:
        shift = shift + np.where(free, errors * start_sd, 0.0)
    given = plan.frame.moved(marks.given, shift)
    return replace(marks, given=given if start_sd is not None else np.where(free, np.nan, given))


def _from_grid_axes(grid: FloatArray, rotation: FloatArray) -> FloatArray:
    """Displacements (n, 3) along the grid's axes turned to the frame's; `rotation` (n,) is grid north's azimuth."""
    sine, cosine = np.sin(np.nan_to_num(rotation)), np.cos(np.nan_to_num(rotation))
    east = grid[:, 0] * cosine + grid[:, 1] * sine
    north = grid[:, 1] * cosine - grid[:, 0] * sine
    return np.column_stack([east, north, grid[:, 2]])


def _with_blunders(observations: tuple[Observations, ...], blunders: Sequence[Blunder]) -> tuple[Observations, ...]:
    planted = {blunder.source: blunder for blunder in blunders}
    struck = []
    for rows in observations:
        observed = rows.observed.copy()
        for row in range(len(rows)) if planted else ():
            blunder = planted.pop(rows.provenance.label(row), None)
            if blunder is not None:
                observed[row, blunder.component] += blunder.size
        struck.append(replace(rows, observed=observed))
    if planted:
        raise ValueError(f"no row {', '.join(planted)} to plant a blunder in")
    return tuple(struck)

"""From a job to its adjustment: unknowns, start, iteration, covariance, tests."""

from __future__ import annotations

import math
from collections.abc import Iterator
from contextlib import suppress
from dataclasses import dataclass, replace

import numpy as np

from adjust.adjustment import Adjustment, Solution
from adjust.arrays import BoolArray, FloatArray
from adjust.covariance import Request, Transformation, observed_lines, selected_blocks
from adjust.errors import NetworkError
from adjust.frames import Geometry
from adjust.iteration import MOST_ITERATIONS, Converged, Progress, iterate
from adjust.job import Control, Job
from adjust.model import whitened
from adjust.network import Start, check_solvable, find_start
from adjust.quality import critical_tau, critical_w, global_test, non_centrality
from adjust.residuals import Residuals, TestLevels, residuals_of
from adjust.robust import robust_start
from adjust.unknowns import Unknowns, find_unknowns


def _unwatched(stage: str, done: float) -> None:
    """Nobody watches."""


def adjust(job: Job, progress: Progress = _unwatched, start: Start | None = None) -> Adjustment:
    """Adjust a job by least squares.

    `progress` is told the stage at work and how much of the whole is done; `start` is what `find_start` found of the
    job, if somebody asked before. Raises NetworkError where the network
    cannot be solved as given, ConvergenceError where the iteration does not settle.
    """
    unknowns = find_unknowns(job)
    if unknowns.count == 0:
        raise NetworkError("nothing to adjust: every mark is fixed, or no observation is in use")
    progress("checking the network", 0.0)
    check_solvable(job, unknowns)
    progress("finding start coordinates", 0.05)
    start = find_start(job, unknowns) if start is None else start
    converged, notes = _converge(job, unknowns, start, lambda stage, done: progress(stage, 0.1 + 0.5 * done))
    progress("finding the covariance", 0.6)
    return _Assessment(job, unknowns, converged).result((*job.notes, *notes))


def _converge(job: Job, unknowns: Unknowns, start: Start, progress: Progress) -> tuple[Converged, tuple[str, ...]]:
    """Iterate from the start; where that leads nowhere, from others."""
    try:
        return iterate(job, unknowns, start, progress), start.notes
    except NetworkError as failure:
        for other, note, patience in _other_starts(job, unknowns, start):
            try:
                return iterate(job, unknowns, other, progress, patience), (*other.notes, note)
            except NetworkError:
                continue
        raise failure from None


def _other_starts(job: Job, unknowns: Unknowns, start: Start) -> Iterator[tuple[Start, str, int]]:
    """A start built on the control alone, then one that gross errors have no part in, each with what to say of it."""
    free = (job.marks.control[:, [0, 0, 1]] == Control.FREE) & ~np.isnan(job.marks.given) & unknowns.sought
    if job.datum.mode == "control" and free.any():
        bare = replace(job, marks=replace(job.marks, given=np.where(free, np.nan, job.marks.given)))
        with suppress(NetworkError):
            start = find_start(bare, unknowns)
            yield start, REBUILT, MOST_ITERATIONS
    yield robust_start(job, unknowns, start), GROSS, PATIENT


REBUILT = (
    "The coordinates that marks.csv gives for free marks led to no solution; start coordinates were built from the "
    "control and the observations instead. Check the coordinates given: they contradict the rest."
)

GROSS = (
    "Gross errors kept the adjustment from settling; it was begun again where most observations agree. They are still "
    "in it: find them (hubtack blunders) and leave them out before any coordinate is used."
)

PATIENT = 200
"""Iterations where gross errors keep plain steps from settling: towards large residuals Gauss–Newton closes in by a
constant share a step only (Björck 1996, *Numerical Methods for Least Squares Problems*, section 9.2.2; from memory)."""


@dataclass(frozen=True)
class _Assessment:
    """Covariances, tests and summary of a converged iteration."""

    job: Job
    unknowns: Unknowns
    converged: Converged

    def result(self, notes: tuple[str, ...]) -> Adjustment:
        """The adjustment, with the covariance of marks, lines and correlated rows found in one pass."""
        blocks = self.converged.model.blocks
        lines = observed_lines([rows for rows in self.job.observations if rows.kind != "control"], len(self.job.marks))
        columns = self.unknowns.columns
        requests: list[Request] = [(columns, columns), (columns[lines[:, 0]], columns[lines[:, 1]])]
        requests += [(block.columns, block.columns) for block in blocks if block.components > 1]
        selected = selected_blocks(self.converged.factor, requests)
        transformation = self._transformation()
        located = [
            block if transformation is None else transformation.apply(block, request)
            for block, request in zip(selected.blocks[:2], requests, strict=False)
        ]
        solution = self._solution()
        grid = grid_axes(self.converged.state.geometry)
        scale = solution.variance_scale
        marks = _scaled(grid @ located[0] @ grid.transpose(0, 2, 1), scale)
        across = _scaled(grid[lines[:, 0]] @ located[1] @ grid[lines[:, 1]].transpose(0, 2, 1), scale)
        differences = marks[lines[:, 0]] + marks[lines[:, 1]] - across - across.transpose(0, 2, 1)
        known = self._known()
        return Adjustment(
            job=self.job,
            unknowns=self.unknowns,
            geometry=self.converged.state.geometry,
            orientations=self.converged.state.orientations,
            residuals=self._residuals(solution, selected.row_variances, selected.blocks[2:]),
            solution=solution,
            mark_covariances=_masked((marks + marks.transpose(0, 2, 1)) / 2, known),
            lines=lines,
            line_covariances=_masked(differences, known[lines[:, 0]] & known[lines[:, 1]]),
            notes=notes,
            _factor=self.converged.factor,
            _transformation=transformation,
            _grid=grid,
        )

    def _transformation(self) -> Transformation | None:
        inner = self.converged.inner
        return None if inner is None else Transformation(self.converged.factor, inner)

    def _known(self) -> BoolArray:
        """Coordinates (n, 3) that are adjusted or held: they have a variance, be it 0."""
        if self.job.datum.mode == "inner":
            return self.unknowns.sought
        known: BoolArray = self.unknowns.sought | (self.job.marks.control[:, [0, 0, 1]] == Control.FIXED)
        return known

    def _solution(self) -> Solution:
        converged, model = self.converged, self.converged.model
        defect = 0 if model.datum_rows is None else model.datum_rows.shape[0]
        freedom = model.observation_rows - self.unknowns.count + defect
        statistic = model.weighted_square_sum(converged.state, converged.linearisation.factors)
        return Solution(
            observations=model.observation_rows,
            unknowns=self.unknowns.count,
            datum_defect=defect,
            degrees_of_freedom=freedom,
            iterations=converged.iterations,
            converged=True,
            variance_factor=statistic / freedom if freedom else None,
            global_test=global_test(statistic, freedom, self.job.statistics.confidence),
            condition_number=converged.factor.condition_number(),
            sd_basis=self.job.statistics.sd_basis,
            second_opinion_gap=converged.opinion.largest_gap,
        )

    def _levels(self, solution: Solution) -> TestLevels:
        statistics = self.job.statistics
        on_tau = statistics.sd_basis == "posterior"
        return TestLevels(
            critical=critical_tau(statistics.significance, solution.degrees_of_freedom)
            if on_tau
            else critical_w(statistics.significance),
            on_tau=on_tau,
            non_centrality=non_centrality(statistics.significance, statistics.power),
            variance_factor=math.nan if solution.variance_factor is None else solution.variance_factor,
        )

    def _residuals(
        self, solution: Solution, row_variances: FloatArray, correlated: tuple[FloatArray, ...]
    ) -> tuple[Residuals, ...]:
        """The residuals of every kind; `correlated` holds the covariance of the unknowns of correlated rows."""
        state, levels = self.converged.state, self._levels(solution)
        covariances = iter(correlated)
        tables = []
        for block, factor in zip(self.converged.model.blocks, self.converged.linearisation.factors, strict=True):
            if block.components == 1:
                leverage = row_variances[block.system_rows][:, None, None]
            else:
                entries = whitened(factor, block.linearise(state)[1])
                leverage = entries @ next(covariances) @ entries.transpose(0, 2, 1)
            tables.append(residuals_of(block, state, factor, leverage, levels))
        return tuple(tables)


def grid_axes(geometry: Geometry) -> FloatArray:
    """Rotations (n, 3, 3) from local east, north, up to the grid's; 0 where a mark has no plan coordinates."""
    rotation = np.nan_to_num(geometry.frame.grid_rotation(geometry.coordinates))
    axes = np.zeros((len(rotation), 3, 3))
    axes[:, 0, 0] = axes[:, 1, 1] = np.cos(rotation)
    axes[:, 0, 1], axes[:, 1, 0] = -np.sin(rotation), np.sin(rotation)
    axes[:, 2, 2] = 1.0
    return axes


def _scaled(covariances: FloatArray, scale: float) -> FloatArray:
    """Covariances times `scale`; what is exactly 0 stays so, even where the scale is unknown (NaN)."""
    return np.where(covariances == 0.0, 0.0, covariances * scale)


def _masked(covariances: FloatArray, known: BoolArray) -> FloatArray:
    """NaN in the rows and columns of coordinates without a variance."""
    return np.where(known[:, :, None] & known[:, None, :], covariances, np.nan)

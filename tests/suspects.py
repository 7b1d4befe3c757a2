"""One suspect as the catalogue of mistakes is told of it: the network adjusted without it, by leaving it out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np
from scipy.special import gammainccinv

from adjust import Adjustment, Job, NetworkError, adjust
from adjust.arrays import FloatArray
from adjust.blunders import Cell, Context, Hypothesis
from adjust.blunders.hypotheses import Hypotheses
from adjust.blunders.system import System, model_of
from adjust.job import Control
from adjust.model import Block, State
from adjust.observations import Observations


@dataclass(frozen=True)
class Expectation:
    """What an adjusted network expects of rows that are not in it."""

    result: Adjustment

    def away(self, rows: Observations) -> tuple[FloatArray, FloatArray]:
        """Observed minus expected (rows, c), and the covariance (rows, c, c) of that."""
        unknowns = self.result.unknowns
        columns = unknowns.columns[rows.marks].reshape(len(rows), -1)
        if rows.setup is not None:
            columns = np.column_stack([columns, unknowns.coordinates + rows.setup])
        block = Block(rows, columns, 0)
        with np.errstate(invalid="ignore", divide="ignore"):
            misclosure, derivatives = block.linearise(State(self.result.geometry, self.result.orientations))
            covariance = rows.covariance(self.result.geometry)
        width = block.components
        spread = np.zeros((unknowns.count, len(rows) * width))
        for row in range(len(rows)):
            here = np.flatnonzero(columns[row] >= 0)
            spread[columns[row, here], row * width : (row + 1) * width] = derivatives[row][:, here].T
        inner = spread.T @ self.result._factor.normal_solve(np.nan_to_num(spread))
        places = np.arange(len(rows) * width).reshape(len(rows), width)
        return misclosure, covariance + inner[places[:, :, None], places[:, None, :]]

    def fit(self, rows: Observations) -> FloatArray:
        """Normalised misfits (rows,)."""
        away, covariance = self.away(rows)
        sound = np.isfinite(away).all(axis=1) & np.isfinite(covariance).all(axis=(1, 2))
        misfit = np.full(len(rows), np.nan)
        misfit[sound] = np.sqrt(
            np.einsum("ri,ri->r", away[sound], np.linalg.solve(covariance[sound], away[sound, :, None])[:, :, 0])
        )
        return misfit


def suspect_row(
    job: Job, place: int, row: int, cells: Mapping[str, Cell], further: tuple[Mapping[str, Cell], ...] = ()
) -> Context | None:
    """One observation of a job, all its components; None where the network does not hold together without it."""
    rows = job.observations[place]
    kept = replace(job, observations=_without(job, place, row))
    try:
        expectation = Expectation(adjust(kept))
    except NetworkError:
        return None
    away, covariance = expectation.away(rows.take(np.array([row])))
    nature = "vector" if len(rows.components) > 1 else "observation"
    hypothesis = Hypothesis(nature, rows.provenance.label(row), ((place, np.array([row])),), rows.components, rows.unit)
    return _context(job, hypothesis, expectation, away[0], covariance[0], cells, further)


def _without(job: Job, place: int, row: int) -> tuple[Observations, ...]:
    kept = [
        rows.take(np.delete(np.arange(len(rows)), row)) if number == place else rows
        for number, rows in enumerate(job.observations)
    ]
    return tuple(rows for rows in kept if len(rows))


def suspect_control(job: Job, mark: int, start: FloatArray, cells: Mapping[str, Cell]) -> Context | None:
    """The position of a fixed mark, held against what the rest of the network says; `start` (3,) is near the truth."""
    marks = job.marks
    control, given = marks.control.copy(), marks.given.copy()
    control[mark, 0] = Control.FREE
    given[mark, :2] = start[:2]
    try:
        result = adjust(replace(job, marks=replace(marks, control=control, given=given)))
    except NetworkError:
        return None
    displacement = np.nan_to_num(job.frame.displacement(marks.given[[mark]], result.coordinates[[mark]]))
    away = -displacement @ result._grid[mark].T
    rows = tuple(
        (place, here)
        for place, of_kind in enumerate(job.observations)
        if len(here := np.flatnonzero((of_kind.marks == mark).any(axis=1)))
    )
    name = f"position of control mark {marks.names[mark]}"
    hypothesis = Hypothesis("control", name, rows, ("east", "north"), "m", mark)
    covariance = result.mark_covariances[mark, :2, :2]
    return _context(job, hypothesis, Expectation(result), away[0, :2], covariance, cells)


def suspect_group(job: Job, nature: str, place: int, row: int, cells: Mapping[str, Cell]) -> Context | None:
    """The group of a nature that a row belongs to, its error estimated together with the unknowns."""
    try:
        result = adjust(job)
    except NetworkError:
        return None
    state = State(result.geometry, result.orientations)
    hypotheses = Hypotheses.of(System.at(job, model_of(job, result.unknowns, state), state))
    number = _number_of(hypotheses, nature, place, row)
    if number is None:
        return None
    allowed = hypotheses.evidence().allowing((number,))
    without = hypotheses.system.without(hypotheses.columns[:, allowed.columns], allowed.errors)
    freed = replace(result, geometry=without.geometry, orientations=without.orientations)
    hypothesis = hypotheses.hypothesis(number)
    return _context(job, hypothesis, Expectation(freed), allowed.errors, allowed.covariance, cells)


def _number_of(hypotheses: Hypotheses, nature: str, place: int, row: int) -> int | None:
    for number, group in enumerate(hypotheses.groups, hypotheses.first_group):
        rows = dict(group.hypothesis.rows)
        if group.hypothesis.nature == nature and row in rows.get(place, ()):
            return number
    return None


def _context(
    job: Job,
    hypothesis: Hypothesis,
    expectation: Expectation,
    error: FloatArray,
    covariance: FloatArray,
    cells: Mapping[str, Cell],
    further: tuple[Mapping[str, Cell], ...] = (),
) -> Context:
    result = expectation.result
    fit: Callable[[Observations], FloatArray] = expectation.fit
    return Context(
        job,
        hypothesis,
        result.geometry,
        result.orientations,
        error,
        covariance,
        cells,
        float(np.sqrt(2 * gammainccinv(len(error) / 2, job.statistics.significance))),
        fit,
        further,
    )

"""The weighted system of a job linearised at one state, and what it expects of the observations there."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import FloatArray
from adjust.covariance import selected_blocks
from adjust.datum import minimal_datum
from adjust.iteration import after_step, station_of_setups
from adjust.job import Job
from adjust.model import Block, Linearisation, Model, State, build_model, whitened
from adjust.network import datum_parts
from adjust.solver import Analysis, Factor, analyse
from adjust.unknowns import Unknowns


def model_of(job: Job, unknowns: Unknowns, state: State) -> Model:
    """The job's model; a free network rests on the minimal datum of its geometry at `state`."""
    parts = datum_parts(job, unknowns) if job.datum.mode == "inner" else ()
    return build_model(job, unknowns, minimal_datum(parts[0], state.geometry, unknowns) if parts else None)


@dataclass(frozen=True)
class System:
    """A job's model at a state, factorised. Raises RankDefect where the unknowns are not determined."""

    job: Job
    model: Model
    state: State
    linearisation: Linearisation
    factor: Factor
    analysis: Analysis

    @classmethod
    def at(cls, job: Job, model: Model, state: State, analysis: Analysis | None = None) -> System:
        """Linearise and factorise; `analysis` is that of another state of the same model."""
        linearisation = model.linearise(state)
        if analysis is None:
            groups = model.groups(station_of_setups(job))
            analysis = analyse(linearisation.matrix, groups, state.geometry.coordinates[:, :2])
        factor = analysis.factorise(linearisation.matrix, linearisation.right_side)
        return cls(job, model, state, linearisation, factor, analysis)

    @property
    def matrix(self) -> csr_array:
        """Ã (rows, unknowns) without the datum rows."""
        return self.linearisation.matrix[: self.model.observation_rows]

    @property
    def freedom(self) -> int:
        """Degrees of freedom."""
        return int(self.linearisation.matrix.shape[0] - self.linearisation.matrix.shape[1])

    def residual_without(self, effect: FloatArray) -> FloatArray:
        """e = M(b̃ − effect) (rows,): whitened observed minus adjusted, once the observations are freed of an effect."""
        rows = self.model.observation_rows
        right = self.linearisation.right_side[:rows] - effect
        first: FloatArray = right - self.matrix @ self._solved(right)
        # Once more on the residuals, because the normal equations leave half of the digits.
        return np.asarray(first - self.matrix @ self._solved(first), dtype=np.float64)

    def _solved(self, right: FloatArray) -> FloatArray:
        solved: FloatArray = self.factor.normal_solve((self.matrix.T @ right)[:, None])[:, 0]
        return solved

    def blocks(self) -> Iterator[tuple[Block, FloatArray]]:
        """The kinds with the whitening factors L⁻¹ (rows, c, c) of their rows."""
        return zip(self.model.blocks, self.linearisation.factors, strict=True)

    @cached_property
    def leverage(self) -> tuple[FloatArray, ...]:
        """Ã C Ãᵀ (rows, c, c) within each row of each kind, whitened."""
        correlated = [block.columns for block in self.model.blocks if block.components > 1]
        nothing = np.empty((0, 1), dtype=np.int64)
        selected = selected_blocks(self.factor, [(nothing, nothing), *((columns, columns) for columns in correlated)])
        covariances = iter(selected.blocks[1:])
        leverages = []
        for block, factor in self.blocks():
            if block.components == 1:
                leverages.append(selected.row_variances[block.system_rows][:, None, None])
            else:
                entries = whitened(factor, block.linearise(self.state)[1])
                leverages.append(entries @ next(covariances) @ entries.transpose(0, 2, 1))
        return tuple(leverages)

    def without(self, columns: csr_array, errors: FloatArray) -> State:
        """The state that the observations lead to once they are freed of `errors` (k,) in whitened `columns`."""
        right = self.linearisation.right_side[: self.model.observation_rows] - columns @ errors
        return after_step(self.job, self.model.unknowns, self.state, self._solved(right))

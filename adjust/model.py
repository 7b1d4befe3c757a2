"""All kinds of observation as one weighted sparse system.

Linearised, the observations read ℓ + v = f(x₀) + A dx. Each row group is divided by the Cholesky factor of its a-priori
covariance, so that the system handed to the solver has unit weights (σ₀ = 1): min |Ã dx − b̃|, b̃ = L⁻¹(ℓ − f(x₀)).
Directions are predicted as azimuth minus the orientation of their setup, whose column carries −1.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import csr_array

from adjust.angles import wrapped
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.frames import Geometry
from adjust.job import Job
from adjust.observations import Observations
from adjust.unknowns import Unknowns


@dataclass(frozen=True)
class State:
    """Where an iteration stands: the geometry of the marks and the orientation (setups,) of each setup, radians."""

    geometry: Geometry
    orientations: FloatArray


@dataclass(frozen=True)
class Block:
    """The rows of one kind inside the system.

    `columns` (rows, width) are the unknowns of each row in the order mark by mark east, north, up, then the setup's
    orientation for kinds that have one; −1 where a coordinate is not an unknown. `offset` is its first system row.
    """

    observations: Observations
    columns: IntArray
    offset: int

    @cached_property
    def present(self) -> BoolArray:
        """Which entries (rows, width) belong to unknowns."""
        return self.columns >= 0

    @property
    def components(self) -> int:
        """System rows for each observation."""
        return len(self.observations.components)

    @property
    def system_rows(self) -> slice:
        """Where the block stands in the system."""
        return slice(self.offset, self.offset + len(self.observations) * self.components)

    def misclosure(self, state: State) -> FloatArray:
        """Observed minus predicted (rows, components); angles within half a turn."""
        return self._short_of(self.observations.predict(state.geometry), state.orientations)

    def linearise(self, state: State) -> tuple[FloatArray, FloatArray]:
        """The misclosure, and the derivatives (rows, components, width) by all entries of `columns`."""
        predicted, by_marks = self.observations.linearise(state.geometry)
        flat = by_marks.reshape(len(self.observations), self.components, -1)
        if self.observations.setup is not None:
            flat = np.concatenate([flat, np.full((*flat.shape[:2], 1), -1.0)], axis=2)
        return self._short_of(predicted, state.orientations), flat

    def _short_of(self, predicted: FloatArray, orientations: FloatArray) -> FloatArray:
        difference = self.observations.observed - predicted
        setup = self.observations.setup
        if setup is not None:
            difference = difference + orientations[setup][:, None]
        return wrapped(difference) if self.observations.unit == "rad" else difference

    def whitening(self, geometry: Geometry) -> FloatArray:
        """Inverse Cholesky factors (rows, components, components) of the a-priori covariances."""
        covariance = self.observations.covariance(geometry)
        inverse: FloatArray = (
            1.0 / np.sqrt(covariance) if self.components == 1 else np.linalg.inv(np.linalg.cholesky(covariance))
        )
        return inverse


def whitened(factor: FloatArray, values: FloatArray) -> FloatArray:
    """L⁻¹ values for each row; `values` (rows, components) or (rows, components, width)."""
    if values.ndim == 2:
        return whitened(factor, values[:, :, None])[:, :, 0]
    result: FloatArray = factor * values if factor.shape[1] == 1 else factor @ values
    return result


@dataclass(frozen=True)
class Linearisation:
    """min |matrix · dx − right_side|, and the whitening factors of each block that its rows were divided with."""

    matrix: csr_array
    right_side: FloatArray
    factors: tuple[FloatArray, ...]


@dataclass(frozen=True)
class Model:
    """The structure of a job's system, found once; `linearise` fills it at any state.

    `datum_rows` (sparse, unit weight scale) are appended below the observations: the minimal datum of a free network.
    """

    blocks: tuple[Block, ...]
    unknowns: Unknowns
    datum_rows: csr_array | None = None

    @cached_property
    def observation_rows(self) -> int:
        """System rows that are observations; datum rows follow them."""
        return sum(len(block.observations) * block.components for block in self.blocks)

    @cached_property
    def _layout(self) -> tuple[IntArray, IntArray, IntArray]:
        """Order of the flat entries, column of each and row pointers of the observation part."""
        counts, columns = [], []
        for block in self.blocks:
            counts.append(np.repeat(block.present.sum(axis=1), block.components))
            spread = np.repeat(block.columns[:, None], block.components, axis=1)
            columns.append(spread[np.repeat(block.present[:, None], block.components, axis=1)])
        flat = np.concatenate(columns)
        per_row = np.concatenate(counts)
        rows = np.repeat(np.arange(len(per_row)), per_row)
        order = np.lexsort((flat, rows))
        return order, flat[order], np.concatenate([[0], np.cumsum(per_row)])

    def linearise(self, state: State) -> Linearisation:
        """The whitened system at a state, datum rows at the end."""
        factors, data, right = [], [], []
        for block in self.blocks:
            factor = block.whitening(state.geometry)
            misclosure, derivatives = block.linearise(state)
            entries = whitened(factor, derivatives)
            factors.append(factor)
            data.append(entries[np.broadcast_to(block.present[:, None], entries.shape)])
            right.append(whitened(factor, misclosure).ravel())
        order, columns, pointers = self._layout
        shape = (self.observation_rows, self.unknowns.count)
        matrix = csr_array((np.concatenate(data)[order], columns, pointers), shape=shape)
        return Linearisation(*self._with_datum(matrix, np.concatenate(right)), tuple(factors))

    def _with_datum(self, matrix: csr_array, right: FloatArray) -> tuple[csr_array, FloatArray]:
        if self.datum_rows is None:
            return matrix, right
        from scipy.sparse import vstack

        held = self.datum_rows.shape[0]
        return csr_array(vstack([matrix, self.datum_rows], format="csr")), np.concatenate([right, np.zeros(held)])

    def source(self, row: int) -> str:
        """File and line of a system row that is an observation."""
        block = next(block for block in reversed(self.blocks) if block.offset <= row)
        return block.observations.provenance.label((row - block.offset) // block.components)

    def weighted_square_sum(self, state: State, factors: Sequence[FloatArray]) -> float:
        """vᵀPv of the observations as they stand at a state, with the weights of a linearisation."""
        parts = zip(self.blocks, factors, strict=True)
        return float(sum(np.sum(whitened(factor, block.misclosure(state)) ** 2) for block, factor in parts))

    def groups(self, station_of_setup: IntArray) -> IntArray:
        """The mark (unknowns,) each column rides with: its own, or the station of its setup."""
        return np.concatenate([self.unknowns.mark_of_column(), station_of_setup])


def build_model(job: Job, unknowns: Unknowns, datum_rows: csr_array | None = None) -> Model:
    """Number the rows of all kinds of a job."""
    return Model(tuple(_blocks(job, unknowns)), unknowns, datum_rows)


def _blocks(job: Job, unknowns: Unknowns) -> Iterator[Block]:
    offset = 0
    for observations in job.observations:
        columns = unknowns.columns[observations.marks].reshape(len(observations), -1)
        if observations.setup is not None:
            columns = np.column_stack([columns, unknowns.coordinates + observations.setup])
        yield Block(observations, columns, offset)
        offset += len(observations) * len(observations.components)

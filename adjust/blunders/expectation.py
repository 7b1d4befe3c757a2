"""What the network expects of any observation once the errors that were found are allowed for."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.evidence import Allowed
from adjust.blunders.system import System
from adjust.frames import Geometry
from adjust.job import Job
from adjust.model import State, build_model
from adjust.observations import Observations

AT_ONCE = 256
"""Rows solved for together: enough for speed, few enough to spare the memory of a large network."""


@dataclass(frozen=True)
class Expectation:
    """The network without some errors: it stands at `state`, adjusted with the whitened `columns` H (rows, s) of the
    errors as further unknowns, `allowed`. `variance` is σ₀² where it is estimated, else 1.

    C|S = C + C ÃᵀH Q_∇ HᵀÃ C is the covariance of the unknowns without these errors.
    """

    system: System
    state: State
    allowed: Allowed
    columns: csr_array
    variance: float = 1.0

    @property
    def geometry(self) -> Geometry:
        """Where the marks stand."""
        return self.state.geometry

    @cached_property
    def _spread(self) -> FloatArray:
        """C ÃᵀH (unknowns, s)."""
        return self.system.factor.normal_solve((self.system.matrix.T @ self.columns).toarray())

    def misfits(self, replacements: Observations) -> FloatArray:
        """√(dᵀ(Σ + A C|S Aᵀ)⁻¹d) (rows,) of each row: see `Context.fit`."""
        parts = [
            self._misfits(replacements.take(np.arange(first, min(first + AT_ONCE, len(replacements)))))
            for first in range(0, len(replacements), AT_ONCE)
        ]
        return np.concatenate([np.empty(0), *parts])

    def _misfits(self, rows: Observations) -> FloatArray:
        unknowns = self.system.model.unknowns
        (block,) = build_model(_only(self.system, rows), unknowns).blocks
        with np.errstate(invalid="ignore", divide="ignore"):
            difference, derivatives = block.linearise(self.state)
            own = rows.covariance(self.geometry)
        entries = np.where(block.present[:, None, :], derivatives, 0.0)
        known = (
            np.isfinite(entries).all(axis=(1, 2)) & np.isfinite(difference).all(axis=1) & np.isfinite(own).all((1, 2))
        )
        total = (own[known] + self._variances(entries[known], block.columns[known])) * self.variance
        misfits = np.full(len(rows), np.nan)
        solved = np.linalg.solve(total, difference[known][:, :, None])[:, :, 0]
        misfits[known] = np.sqrt(np.einsum("ri,ri->r", difference[known], solved))
        return misfits

    def covariance_of(self, combinations: FloatArray, columns: IntArray) -> FloatArray:
        """F C|S Fᵀ (k, k) of combinations F (k, c) of the unknowns in `columns` (c,)."""
        return np.asarray(self._variances(combinations[None], columns[None])[0])

    def _variances(self, entries: FloatArray, columns: IntArray) -> FloatArray:
        """A C|S Aᵀ (rows, c, c) within each row."""
        rows, components = entries.shape[:2]
        count = self.system.model.unknowns.count
        place = np.arange(rows * components).reshape(rows, components, 1)
        row = np.broadcast_to(place, entries.shape).ravel()
        column = np.broadcast_to(columns[:, None, :], entries.shape).ravel()
        kept = column >= 0
        matrix = csr_array((entries.ravel()[kept], (row[kept], column[kept])), shape=(rows * components, count))
        solved = matrix @ self.system.factor.normal_solve(matrix.T.toarray())
        shared = np.asarray(matrix @ self._spread)
        joint: FloatArray = solved + shared @ self.allowed.covariance @ shared.T
        return joint[place, place.transpose(0, 2, 1)]


def _only(system: System, rows: Observations) -> Job:
    return replace(system.job, observations=(rows,))

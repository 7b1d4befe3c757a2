"""What the catalogue of mistakes is told of one suspect, and what it answers."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.hypothesis import Hypothesis
from adjust.field_book.written import Cell
from adjust.frames import Geometry
from adjust.job import Job
from adjust.observations import Observations


@dataclass(frozen=True)
class Correction:
    """What a cell of the field book would have to hold: `source` names file and line, `title` the column."""

    source: str
    title: str
    text: str


@dataclass(frozen=True)
class Explanation:
    """A mistake that would have turned the right entry into the one that stands in the book."""

    mistake: str
    """In words, with what is particular to the case: `digits 6 and 5 exchanged: 187.564 in place of 187.654`."""
    names: tuple[str, ...]
    """Its name in the table of priors, `digits exchanged`; several where they come to the same value."""
    corrected_value: FloatArray | None
    """(components,) what the observation would be, m or rad; None where its value stays and another entry changes."""
    corrections: tuple[Correction, ...]
    """The entries to change, in the notation of the book."""
    w_after: float
    """The normalised misfit that is left after the correction."""
    odds: float
    """Against all other explanations together, the unknown ones included."""


@dataclass(frozen=True)
class Context:
    """One suspect, and the network as it stands without it.

    `geometry` and `orientations` are adjusted without this suspect and without the others that were found with it.
    `estimated_error` (q,) is observed minus true by the network, with its `error_covariance` (q, q): the variance of
    the observation itself and that of what the network expects. `cells` are those of the suspect's line in the book
    by the plain name of their column (`slope`, `to`, `target_height`), of the first line of a group, or of the mark's
    line for its control; where the job was read from no file, they are written as a book would. `further_cells` are
    those of the lines after the first that a mean was made of. `adjust.blunders.cells.cells_of` finds both.
    """

    job: Job
    hypothesis: Hypothesis
    geometry: Geometry
    orientations: FloatArray
    estimated_error: FloatArray
    error_covariance: FloatArray
    cells: Mapping[str, Cell]
    critical: float
    """Bound on a misfit: what passes it is not explained."""
    fit_of: Callable[[Observations], FloatArray]
    """See `fit`."""
    further_cells: tuple[Mapping[str, Cell], ...] = ()

    @property
    def observations(self) -> Observations:
        """All rows of the suspect's kind (of a group: of its first kind)."""
        return self.job.observations[self.hypothesis.rows[0][0]]

    @property
    def row(self) -> int:
        """The suspect among `observations`; the first of a group."""
        return int(self.hypothesis.rows[0][1][0])

    @property
    def source(self) -> str:
        """File and line of `row`."""
        return self.observations.provenance.label(self.row)

    def fit(self, replacements: Observations) -> FloatArray:
        """Normalised misfit (rows,) of each row of `replacements`, put in the place of the suspect by itself.

        Replacements are rows of any kind with any marks, heights and values; √(dᵀ(Σ + A C Aᵀ)⁻¹d), d = observed minus
        what the network expects without the suspect, Σ the row's covariance, C that of the unknowns without it.
        NaN where the network cannot predict the row.
        """
        return self.fit_of(replacements)

    def misfit(self, errors: FloatArray) -> FloatArray:
        """√((∇ − e)ᵀ Q⁻¹ (∇ − e)) (k,) for supposed errors e (k, q): ∇ the estimated error, Q its covariance."""
        away = np.atleast_2d(errors) - self.estimated_error
        squares = np.einsum("ki,ki->k", away, np.linalg.solve(self.error_covariance, away.T).T)
        return np.asarray(np.sqrt(squares), dtype=np.float64)

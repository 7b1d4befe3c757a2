"""What was found, in the words, values and units of the job."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from adjust.angles import FULL_TURN, wrapped
from adjust.arrays import FloatArray
from adjust.blunders.cells import cells_of
from adjust.blunders.context import Context, Explanation
from adjust.blunders.criterion import chi_square_price
from adjust.blunders.deciding import deciding_row
from adjust.blunders.expectation import Expectation
from adjust.blunders.findings import Blunder, Findings
from adjust.blunders.hypothesis import Hypothesis
from adjust.blunders.round import Round
from adjust.blunders.system import System
from adjust.field_book.written import Line
from adjust.job import Job
from adjust.observations import ControlCoordinates
from adjust.observations.sighted import HeightedSight

MOST_EXPLAINED = 6
"""Alternatives that the catalogue is asked about: of more no single one stands out."""


def tell(found: Round, folder: str | Path | None = None) -> Findings:
    """The findings of the round that settled it; entries are quoted from `folder`, where there is one."""
    diagnosis = found.diagnosis
    suspects = [found.hypotheses.hypothesis(number) for number in diagnosis.chosen]
    lines = cells_of(found.system.job, suspects, folder)
    teller = _Teller(found, folder)
    blunders = list(map(teller.blunder, diagnosis.chosen, suspects, lines))
    return Findings(
        blunders=tuple(sorted(blunders, key=lambda blunder: -blunder.test / blunder.critical)),
        unchecked=unchecked(found),
        significance=diagnosis.criterion.significance,
        estimated=diagnosis.criterion.estimated,
        state=found.state,
        settled=found.settled,
    )


def expectation_of(found: Round) -> Expectation:
    """What the network without the errors found expects of observations."""
    allowed = found.diagnosis.allowed
    return Expectation(found.system, found.state, allowed, found.columns_of(allowed), found.diagnosis.variance)


def context_of(
    job: Job,
    suspect: Hypothesis,
    found: Round,
    expectation: Expectation,
    error: tuple[FloatArray, FloatArray],
    lines: Sequence[Line],
) -> Context:
    """What the catalogue is told of a suspect with its estimated `error` (q,) and the covariance (q, q) of that."""
    size, covariance = error
    return Context(
        job=job,
        hypothesis=suspect,
        geometry=found.state.geometry,
        orientations=found.state.orientations,
        estimated_error=size,
        error_covariance=covariance,
        cells=lines[0],
        critical=float(np.sqrt(chi_square_price(found.diagnosis.criterion.significance, len(size)))),
        fit_of=expectation.misfits,
        further_cells=tuple(lines[1:]),
    )


def unchecked(found: Round) -> tuple[str, ...]:
    """Sources of the rows in which a blunder shows in no residual, in the order of the book."""
    rows = found.hypotheses.untestable_rows
    return tuple(dict.fromkeys(found.system.model.source(int(row)) for row in rows))


class _Teller:
    """Tells of one suspect after the other."""

    def __init__(self, found: Round, folder: str | Path | None) -> None:
        self.found, self.diagnosis, self.folder = found, found.diagnosis, folder
        self.system: System = found.system
        self.job: Job = self.system.job
        self.expectation = expectation_of(found)

    def blunder(self, number: int, suspect: Hypothesis, lines: Sequence[Line]) -> Blunder:
        """All about one of the chosen hypotheses. What only a suspect needs is imported when there is one."""
        from adjust.blunders.advice import advice
        from adjust.blunders.booked import booked
        from adjust.blunders.mistakes import explain

        context = self.context(number, suspect, lines)
        error, covariance = context.estimated_error, context.error_covariance
        test, critical = self._test(number)
        alternatives = tuple(map(self.found.hypotheses.hypothesis, self.diagnosis.alternatives(number)))
        all_held = all(is_held(self.job, each) for each in (suspect, *alternatives))
        explanations = explain(context)
        deciding = None if all_held or not self.found.settled else self._deciding(number)
        return Blunder(
            hypothesis=suspect,
            sources=sources_of(self.job, suspect),
            estimated_error=wrapped(error) if suspect.unit == "rad" else error,
            sd=np.sqrt(np.diagonal(covariance)),
            expected_value=expected_value(self.job, suspect, error),
            test=test,
            critical=critical,
            alternatives=alternatives,
            deciding=deciding,
            explanations=explanations,
            instead_explained=self._explained_instead(number),
            booked=booked(context),
            advice=advice(
                suspect,
                explanations,
                alternatives,
                None if deciding is None else deciding[0],
                all_held,
                self.found.settled,
            ),
        )

    def context(self, number: int, suspect: Hypothesis, lines: Sequence[Line]) -> Context:
        """What the catalogue is told of one of the chosen hypotheses."""
        allowed = self.diagnosis.allowed
        own = allowed.own(number)
        covariance = allowed.covariance[own, own] * self.diagnosis.variance
        return context_of(self.job, suspect, self.found, self.expectation, (allowed.errors[own], covariance), lines)

    def _explained_instead(self, number: int) -> tuple[Explanation | None, ...]:
        """The likeliest mistake for each alternative, in their order; none where they are many, or nothing settled."""
        alternatives = self.diagnosis.alternatives(number)
        if len(alternatives) > MOST_EXPLAINED or not self.found.settled:
            return (None,) * len(alternatives)
        alone = {
            each.joined[0]: each.chosen
            for each in self.diagnosis.replacements
            if each.removed == (number,) and len(each.joined) == 1
        }
        return tuple(self._mistake_of(other, alone[other]) if other in alone else None for other in alternatives)

    def _mistake_of(self, other: int, chosen: tuple[int, ...]) -> Explanation | None:
        """The likeliest mistake of one of another set of errors."""
        from adjust.blunders.mistakes import explain

        found = replace(self.found, diagnosis=replace(self.diagnosis, chosen=chosen))
        suspect = found.hypotheses.hypothesis(other)
        (lines,) = cells_of(self.job, [suspect], self.folder)
        told = explain(_Teller(found, self.folder).context(other, suspect, lines))
        return told[0] if told else None

    def _test(self, number: int) -> tuple[float, float]:
        """√T given the others, over σ̂₀ of the network with this error left in, and its bound."""
        allowed, criterion = self.diagnosis.allowed, self.diagnosis.criterion
        evidence = self.diagnosis.evidence
        loss = float(allowed.losses[allowed.chosen.index(number)])
        others = len(allowed.columns) - int(evidence.size[number])
        variance = criterion.variance(allowed.statistic - loss, others)
        return (loss / variance) ** 0.5, criterion.critical(evidence.sort(number), criterion.freedom - others)

    def _deciding(self, number: int) -> tuple[str, float] | None:
        evidence = self.diagnosis.evidence
        others = [evidence.allowing(other.chosen) for other in self.diagnosis.replacements if number in other.removed]
        hypotheses = self.found.hypotheses
        found = deciding_row(self.system, hypotheses.columns, hypotheses.lasting, self.diagnosis.allowed, others)
        if found is None:
            return None
        source = self.system.model.source(found[0])
        return None if source in given_sources(self.job) else (source, found[1])


def given_sources(job: Job) -> frozenset[str]:
    """Lines of weighted control: coordinates are looked up, no repetition decides about them."""
    weighted = (each for each in job.observations if isinstance(each, ControlCoordinates))
    return frozenset(each.provenance.label(row) for each in weighted for row in range(len(each)))


def is_held(job: Job, hypothesis: Hypothesis) -> bool:
    """Whether it is about given coordinates, fixed or weighted, and not about anything observed."""
    return bool(hypothesis.given_axes(job))


def sources_of(job: Job, hypothesis: Hypothesis) -> tuple[str, ...]:
    """File and line of every row that a hypothesis enters, each once."""
    labels = [job.observations[kind].provenance.label(int(row)) for kind, rows in hypothesis.rows for row in rows]
    return tuple(dict.fromkeys(labels))


def expected_value(job: Job, hypothesis: Hypothesis, error: FloatArray) -> FloatArray | None:
    """What should have been written (q,), metres or radians; None where the error is no error of a number written.

    Of control it is the coordinate along the grid's axes, None in a geographic CRS.
    """
    kind, rows = hypothesis.rows[0]
    observations, row = job.observations[kind], int(rows[0])
    axes = hypothesis.given_axes(job)
    if axes:
        mark = int(observations.marks[row, 0]) if hypothesis.mark is None else hypothesis.mark
        return _coordinates(job, mark, axes, error)
    if hypothesis.single:
        components = [observations.components.index(name) for name in hypothesis.components]
        written: FloatArray = observations.observed[row, components]
        return (written - error) % FULL_TURN if observations.full_circle else written - error
    if isinstance(observations, HeightedSight) and hypothesis.nature in ("instrument height", "target height"):
        return np.asarray(observations.heights[row, int(hypothesis.nature == "target height")] - error)
    return None


def _coordinates(job: Job, mark: int, components: Sequence[int], error: FloatArray) -> FloatArray | None:
    given = job.marks.given[[mark]]
    written: FloatArray = np.append(job.frame.grid_coordinates(given)[0], given[0, 2])[list(components)]
    return None if np.isnan(written).any() else written - error

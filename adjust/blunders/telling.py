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

COMPONENTS = {"east": 0, "north": 1, "up": 2}


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
        allowed = self.diagnosis.allowed
        self.variance = self.diagnosis.criterion.variance(allowed.statistic, len(allowed.columns))
        columns = found.columns_of(allowed)
        self.expectation = Expectation(self.system, found.state, allowed, columns, self.variance)

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
        error, covariance = allowed.errors[own], allowed.covariance[own, own] * self.variance
        return Context(
            job=self.job,
            hypothesis=suspect,
            geometry=self.found.state.geometry,
            orientations=self.found.state.orientations,
            estimated_error=error,
            error_covariance=covariance,
            cells=lines[0],
            critical=float(np.sqrt(chi_square_price(self.diagnosis.criterion.significance, len(error)))),
            fit_of=self.expectation.misfits,
            further_cells=tuple(lines[1:]),
        )

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
    weighted = hypothesis.single and isinstance(job.observations[hypothesis.rows[0][0]], ControlCoordinates)
    return weighted or hypothesis.nature == "control"


def sources_of(job: Job, hypothesis: Hypothesis) -> tuple[str, ...]:
    """File and line of every row that a hypothesis enters, each once."""
    labels = [job.observations[kind].provenance.label(int(row)) for kind, rows in hypothesis.rows for row in rows]
    return tuple(dict.fromkeys(labels))


def expected_value(job: Job, hypothesis: Hypothesis, error: FloatArray) -> FloatArray | None:
    """What should have been written (q,), metres or radians; None where the error is no error of a number written.

    Of control it is the coordinate along the grid's axes, None in a geographic CRS.
    """
    if hypothesis.nature == "control" and hypothesis.mark is not None:
        return _coordinates(job, hypothesis.mark, [COMPONENTS[name] for name in hypothesis.components], error)
    kind, rows = hypothesis.rows[0]
    observations, row = job.observations[kind], int(rows[0])
    if isinstance(observations, ControlCoordinates) and hypothesis.single:
        return _coordinates(job, int(observations.marks[row, 0]), [int(observations.component[row])], error)
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

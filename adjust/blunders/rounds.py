"""Linearisations one after the other, until the network without its blunders stands where it was linearised."""

from __future__ import annotations

from adjust.blunders.criterion import Criterion
from adjust.blunders.diagnosis import Diagnosis, diagnose
from adjust.blunders.evidence import Evidence
from adjust.blunders.hypotheses import MOST_DENSE, Hypotheses
from adjust.blunders.round import Round
from adjust.blunders.snooping import considered, snooped
from adjust.blunders.system import System, model_of
from adjust.job import Job
from adjust.model import State
from adjust.solver import Analysis
from adjust.unknowns import Unknowns

MOST_ROUNDS = 6
"""Linearisations at most: each follows the network to where it stands without the blunders of the round before."""


class Rounds:
    """Linearise, diagnose, go where the network stands without the errors, until that is where it was."""

    def __init__(self, job: Job, unknowns: Unknowns, state: State) -> None:
        self.job, self.state = job, state
        self.model = model_of(job, unknowns, state)
        self.analysis: Analysis | None = None

    def last(self) -> Round:
        """The round that settles it, or the first, if the network runs away from one to the next."""
        first = found = self._round(None)
        for _ in range(MOST_ROUNDS - 1):
            if found.settled:
                found = found.of_smallest_errors()
                if found.settled:
                    return found
            if not found.moved <= found.extent:
                return first.of_smallest_errors()
            self.state = found.state
            found = self._round(found)
        return found.of_smallest_errors()

    def _round(self, before: Round | None) -> Round:
        """Large networks are snooped in strides, then looked at closely around what that finds."""
        system = System.at(self.job, self.model, self.state, self.analysis)
        self.analysis = system.analysis
        if self.model.observation_rows <= MOST_DENSE // 2:
            return self._diagnosed(Hypotheses.of(system), before)
        snooped = self._snooped(Hypotheses(system, ()), before)
        rows = considered(snooped.hypotheses, snooped.diagnosis.allowed, snooped.diagnosis.criterion)
        return self._diagnosed(Hypotheses.of(system, snooped.rows, rows), snooped if before is None else before)

    def _snooped(self, every: Hypotheses, before: Round | None) -> Round:
        evidence, criterion, known = self._tests(every, before)
        return Round(every, Diagnosis(evidence, criterion, snooped(evidence, criterion, known)))

    def _diagnosed(self, hypotheses: Hypotheses, before: Round | None) -> Round:
        evidence, criterion, known = self._tests(hypotheses, before)
        return Round(hypotheses, diagnose(evidence, criterion, hypotheses.rows, known))

    def _tests(self, hypotheses: Hypotheses, before: Round | None) -> tuple[Evidence, Criterion, tuple[int, ...]]:
        """The tests of all hypotheses. `before` says what is known already, from the same linearisation or another."""
        statistics = self.job.statistics
        known = ((), None) if before is None else before.known_to(hypotheses)
        evidence = hypotheses.evidence(*known)
        criterion = Criterion(
            statistics.significance, statistics.sd_basis == "posterior", evidence.square_sum, evidence.freedom
        )
        return evidence, criterion, known[0]

"""From scores and information to a verdict: the errors that are named, and what could stand in their place."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

from adjust.blunders.criterion import Criterion
from adjust.blunders.evidence import Allowed, Evidence
from adjust.blunders.proposals import proposal
from adjust.blunders.search import find_errors, sound
from adjust.blunders.separability import EQUAL, Replacement, smallest, standing


@dataclass(frozen=True)
class Diagnosis:
    """The errors that are named, `chosen` (ascending), and the tests once they are allowed for."""

    evidence: Evidence
    criterion: Criterion
    chosen: tuple[int, ...]

    @cached_property
    def allowed(self) -> Allowed:
        """The tests of everything once the chosen errors are allowed for."""
        return self.evidence.allowing(self.chosen)

    @property
    def variance(self) -> float:
        """σ₀² of the network without the chosen errors; 1 where it is known."""
        return self.criterion.variance(self.allowed.statistic, len(self.allowed.columns))

    @cached_property
    def replacements(self) -> tuple[Replacement, ...]:
        """Other sets that the data leave standing."""
        return tuple(standing(self.evidence, self.criterion, self.chosen))

    def settled(self) -> Diagnosis:
        """The set of the smallest errors among those that fit as well as the one of least cost."""
        least, seen = self.allowed.statistic - EQUAL, {self.chosen}
        diagnosis = self
        while True:
            chosen = smallest(self.evidence, diagnosis.chosen, diagnosis.replacements, least)
            if chosen in seen:
                return diagnosis
            seen.add(chosen)
            diagnosis = replace(diagnosis, chosen=chosen)

    def alternatives(self, hypothesis: int) -> tuple[int, ...]:
        """What may stand in the place of one of the chosen, ascending: "one of these"."""
        found = {
            other
            for replacement in self.replacements
            if hypothesis in replacement.removed
            for other in replacement.joined
        }
        return tuple(sorted(found))


def diagnose(evidence: Evidence, criterion: Criterion, rows: int, start: tuple[int, ...] = ()) -> Diagnosis:
    """The set of least cost; `rows` single components come first among the columns.

    The search begins with `start`. Without one it begins with nothing and with what a robust estimate proposes.
    """
    best = find_errors(evidence, criterion, sound(evidence, start))
    if not start:
        other = proposal(evidence, criterion, rows, evidence.allowing(best.chosen))
        if other != best.chosen:
            best = min(best, find_errors(evidence, criterion, other), key=lambda choice: (choice.cost, choice.chosen))
    return Diagnosis(evidence, criterion, best.chosen)

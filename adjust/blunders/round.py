"""One linearisation of a job with its diagnosis, and the network without the errors found there."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import IntArray
from adjust.blunders.diagnosis import Diagnosis
from adjust.blunders.evidence import Allowed
from adjust.blunders.hypotheses import Hypotheses
from adjust.blunders.system import System
from adjust.model import State


@dataclass(frozen=True)
class Round:
    """Supposed errors of a system, and which of them are believed."""

    hypotheses: Hypotheses
    diagnosis: Diagnosis

    @property
    def system(self) -> System:
        """The system the diagnosis is made of."""
        return self.hypotheses.system

    def columns_of(self, allowed: Allowed) -> csr_array:
        """H (rows, s), whitened, of the errors that are allowed for."""
        return csr_array(self.hypotheses.columns[:, allowed.columns])

    @property
    def rows(self) -> IntArray:
        """System rows that the errors found enter, ascending."""
        entered = abs(self.columns_of(self.diagnosis.allowed)).sum(axis=1)
        return np.flatnonzero(np.asarray(entered) > 0.0)

    def known_to(self, other: Hypotheses) -> tuple[int, ...]:
        """The errors found, as another numbering has them; groups it does not know are left out."""
        first = self.hypotheses.first_group
        names = {group.hypothesis.name: other.first_group + place for place, group in enumerate(other.groups)}
        groups = [self.hypotheses.hypothesis(number).name for number in self.diagnosis.chosen if number >= first]
        singles = [number for number in self.diagnosis.chosen if number < first]
        return tuple(sorted([*singles, *(names[name] for name in groups if name in names)]))

    def settled(self) -> Round:
        """The same, where several sets fit equally well the one of the smallest errors."""
        return replace(self, diagnosis=self.diagnosis.settled())

    @cached_property
    def state(self) -> State:
        """Where the network stands without the errors found."""
        allowed = self.diagnosis.allowed
        return self.system.without(self.columns_of(allowed), allowed.errors)

    @cached_property
    def moved(self) -> float:
        """How far, metres, that is from where it was linearised."""
        geometry = self.system.state.geometry
        moved = geometry.frame.displacement(geometry.coordinates, self.state.geometry.coordinates)
        return float(np.abs(moved[self.system.model.unknowns.sought]).max(initial=0.0))

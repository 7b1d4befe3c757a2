"""One linearisation of a job with its diagnosis, and the network without the errors found there."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import FloatArray, IntArray
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

    def known_to(self, other: Hypotheses) -> tuple[tuple[int, ...], FloatArray]:
        """The errors found, as another numbering has them, and their sizes; groups it does not know are left out."""
        first, allowed = self.hypotheses.first_group, self.diagnosis.allowed
        names = {group.hypothesis.name: other.first_group + place for place, group in enumerate(other.groups)}
        number = {
            chosen: chosen if chosen < first else names.get(self.hypotheses.hypothesis(chosen).name)
            for chosen in allowed.chosen
        }
        known = sorted((there, here) for here, there in number.items() if there is not None)
        sizes = [allowed.errors[allowed.own(here)] for _, here in known]
        return tuple(there for there, _ in known), np.concatenate([np.empty(0), *sizes])

    def settled(self) -> Round:
        """The same, where several sets fit equally well the one of the smallest errors."""
        return replace(self, diagnosis=self.diagnosis.settled())

    @cached_property
    def state(self) -> State:
        """Where the network stands without the errors found."""
        allowed = self.diagnosis.allowed
        return self.system.without(self.columns_of(allowed), allowed.errors)

    @cached_property
    def left(self) -> float:
        """What the errors found leave of vᵀPv, and their price: comparable between linearisations."""
        allowed, criterion = self.diagnosis.allowed, self.diagnosis.criterion
        residual = self.system.residual_without(self.columns_of(allowed) @ allowed.errors)
        whole = float(residual @ residual)
        price = criterion.price(map(allowed.evidence.sort, allowed.chosen))
        return (float(np.log(max(whole, np.finfo(float).tiny))) if criterion.estimated else whole) + price

    @property
    def extent(self) -> float:
        """How far apart, metres, the marks lie at most along one axis."""
        geometry = self.system.state.geometry
        away = geometry.frame.displacement(
            np.broadcast_to(geometry.coordinates[0], geometry.coordinates.shape), geometry.coordinates
        )
        return float(np.nanmax(np.nanmax(away, axis=0) - np.nanmin(away, axis=0)))

    @cached_property
    def moved(self) -> float:
        """How far, metres, that is from where it was linearised."""
        geometry = self.system.state.geometry
        moved = geometry.frame.displacement(geometry.coordinates, self.state.geometry.coordinates)
        return float(np.abs(moved[self.system.model.unknowns.sought]).max(initial=0.0))

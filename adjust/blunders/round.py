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

NEAR = 0.01
"""Metres: a network that moves by less than this when its blunders are allowed for is linear enough. Across a sight of
50 m the neglected second order is s²/2D, a thousandth of a millimetre."""

GROSS = 100.0
"""vᵀPv over its degrees of freedom from which on a network may stand too far from the truth to go on from there: its
residuals are ten times as large as they should be."""


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
        allowed = self.diagnosis.allowed
        number = {chosen: self.hypotheses.number_in(other, chosen) for chosen in allowed.chosen}
        known = sorted((there, here) for here, there in number.items() if there is not None)
        sizes = [allowed.errors[allowed.own(here)] for _, here in known]
        return tuple(there for there, _ in known), np.concatenate([np.empty(0), *sizes])

    def of_smallest_errors(self) -> Round:
        """The same, where several sets fit equally well the one of the smallest errors."""
        return replace(self, diagnosis=self.diagnosis.settled())

    @cached_property
    def state(self) -> State:
        """Where the network stands without the errors found."""
        allowed = self.diagnosis.allowed
        return self.system.without(self.columns_of(allowed), allowed.errors)

    @cached_property
    def square_sum(self) -> float:
        """What the errors found leave of vᵀPv."""
        allowed = self.diagnosis.allowed
        residual = self.system.residual_without(self.columns_of(allowed) @ allowed.errors)
        return float(residual @ residual)

    @property
    def variance(self) -> float:
        """That over its degrees of freedom; 0 without any."""
        freedom = self.system.freedom - len(self.diagnosis.allowed.columns)
        return self.square_sum / freedom if freedom > 0 else 0.0

    @property
    def left(self) -> float:
        """What is left with the price of the errors: comparable between linearisations."""
        allowed, criterion = self.diagnosis.allowed, self.diagnosis.criterion
        price = criterion.price(allowed.sorts)
        if criterion.estimated:
            return float(np.log(max(self.square_sum, np.finfo(float).tiny))) + price
        return self.square_sum + price

    @property
    def settled(self) -> bool:
        """Whether the network without the errors stands where it was linearised."""
        return self.moved <= NEAR

    @property
    def plausible(self) -> bool:
        """Whether it is settled and leaves no gross residuals."""
        return self.settled and self.variance < GROSS

    @property
    def extent(self) -> float:
        """How far apart, metres, the marks lie at most in plan; infinite without plan coordinates."""
        geometry = self.system.state.geometry
        plan = geometry.coordinates[~np.isnan(geometry.coordinates[:, 0])]
        if not len(plan):
            return float("inf")
        away = geometry.frame.displacement(np.broadcast_to(plan[0], plan.shape), plan)[:, :2]
        return float(np.max(np.ptp(away, axis=0)))

    @cached_property
    def moved(self) -> float:
        """How far, metres, that is from where it was linearised."""
        geometry = self.system.state.geometry
        moved = geometry.frame.displacement(geometry.coordinates, self.state.geometry.coordinates)
        return float(np.abs(moved[self.system.model.unknowns.sought]).max(initial=0.0))

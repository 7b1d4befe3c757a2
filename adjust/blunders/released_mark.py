"""A fixed mark whose coordinates were found anew from the observations alone, told as an error of its control."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import combinations
from pathlib import Path

import numpy as np

from adjust.adjusting import grid_axes
from adjust.arrays import FloatArray, IntArray
from adjust.blunders.cells import cells_of
from adjust.blunders.context import Context
from adjust.blunders.criterion import Criterion, chi_square_price
from adjust.blunders.evidence import Sort
from adjust.blunders.expectation import Expectation
from adjust.blunders.findings import Blunder
from adjust.blunders.groups import control_name
from adjust.blunders.hypothesis import Hypothesis
from adjust.blunders.round import Round
from adjust.blunders.telling import context_of, expectation_of, expected_value, sources_of
from adjust.job import Job
from adjust.unknowns import AXES


@dataclass(frozen=True)
class ReleasedMark:
    """A mark of `job` whose plan (part 0) or height (1) was found anew, in the round `found`."""

    job: Job
    mark: int
    part: int
    found: Round

    @property
    def axes(self) -> IntArray:
        """Axes (q,) that were released: east 0, north 1, up 2."""
        return np.array([0, 1]) if self.part == 0 else np.array([2])

    @cached_property
    def away(self) -> FloatArray:
        """Given minus adjusted (q,), metres along the grid's axes."""
        here = self.found.state.geometry
        displacement = self.job.frame.displacement(self.job.marks.given[[self.mark]], here.coordinates[[self.mark]])
        return np.asarray(-(np.nan_to_num(displacement) @ grid_axes(here)[self.mark].T)[0, self.axes])

    @cached_property
    def expectation(self) -> Expectation:
        """What the network without the mark's coordinates expects of observations."""
        return expectation_of(self.found)

    @cached_property
    def covariance(self) -> FloatArray:
        """Q (q, q) of the adjusted coordinates along the grid's axes, with σ₀² as 1."""
        turned = grid_axes(self.found.state.geometry)[self.mark][np.ix_(self.axes, self.axes)]
        columns = self.found.system.model.unknowns.columns[self.mark, self.axes]
        return self.expectation.covariance_of(turned, columns)

    @cached_property
    def fitted(self) -> tuple[IntArray, FloatArray, FloatArray, float]:
        """Axes (k,) of the error, its size (k,), covariance (k, k) and T: of one coordinate where that costs least."""
        weight = np.linalg.inv(self.covariance)
        pulled = weight @ self.away
        count = len(self.axes)
        fits = []
        for among in (list(one) for size in range(1, count + 1) for one in combinations(range(count), size)):
            inner = np.linalg.inv(weight[np.ix_(among, among)])
            error = inner @ pulled[among]
            fits.append((self.axes[among], error, inner, float(pulled[among] @ error)))
        return min(fits, key=lambda fit: self._price_of(len(fit[0])) - fit[3] / self.variance)

    @property
    def components(self) -> tuple[str, ...]:
        """The coordinates that are wrong; none where the mark's are not."""
        axes, *_, statistic = self.fitted
        wrong = statistic / self.variance > self._price_of(len(axes))
        return tuple(AXES[axis] for axis in axes) if wrong else ()

    def _price_of(self, columns: int) -> float:
        return chi_square_price(self.criterion.level(True), columns)

    @property
    def criterion(self) -> Criterion:
        """That of the released job."""
        return self.found.diagnosis.criterion

    @property
    def variance(self) -> float:
        """σ₀² where it is estimated, else 1."""
        return self.found.diagnosis.variance

    @property
    def sort(self) -> Sort:
        """Of a shared error."""
        return len(self.fitted[0]), True

    @property
    def price(self) -> float:
        """Of the coordinates released."""
        whole = replace(self.criterion, freedom=self.criterion.freedom + len(self.axes))
        sorts = self.found.diagnosis.allowed.sorts
        return whole.price(sorts + Counter([self.sort])) - self.criterion.price(sorts)

    @cached_property
    def cost(self) -> float:
        """Comparable with `Round.left` of the job as it is."""
        return self.found.left + self.price

    @property
    def hypothesis(self) -> Hypothesis:
        """The error, named as where the job is searched as it is."""
        components, name = self.components, control_name(self.job.marks.names[self.mark], self.components)
        rows = tuple(
            (place, here)
            for place, each in enumerate(self.job.observations)
            if (each.determines_plan if self.part == 0 else each.determines_height)
            and len(here := np.flatnonzero((each.marks == self.mark).any(axis=1)))
        )
        return Hypothesis("control", name, rows, components, "m", self.mark)

    def blunder(self, others: Sequence[ReleasedMark], folder: str | Path | None) -> Blunder:
        """All about the error; `others` may stand in its place."""
        from adjust.blunders.advice import advice
        from adjust.blunders.booked import booked
        from adjust.blunders.mistakes import explain

        suspect, context = self.hypothesis, self._context(folder)
        explanations, alternatives = explain(context), tuple(other.hypothesis for other in others)
        instead = (explain(other._context(folder)) for other in others)
        test, critical = self._test()
        return Blunder(
            hypothesis=suspect,
            sources=sources_of(self.job, suspect),
            estimated_error=context.estimated_error,
            sd=np.sqrt(np.diagonal(context.error_covariance)),
            expected_value=expected_value(self.job, suspect, context.estimated_error),
            test=test,
            critical=critical,
            alternatives=alternatives,
            deciding=None,
            explanations=explanations,
            instead_explained=tuple(told[0] if told else None for told in instead),
            booked=booked(context),
            advice=advice(suspect, explanations, alternatives, None, all_held=True),
        )

    def _context(self, folder: str | Path | None) -> Context:
        _, error, covariance, _ = self.fitted
        (lines,) = cells_of(self.job, [self.hypothesis], folder)
        estimate = (error, covariance * self.variance)
        return context_of(self.job, self.hypothesis, self.found, self.expectation, estimate, lines)

    def _test(self) -> tuple[float, float]:
        """√T over σ̂₀ of the network with this error left in, and its bound."""
        columns, statistic = len(self.fitted[0]), self.fitted[3]
        freedom = self.found.system.freedom - len(self.found.diagnosis.allowed.columns) + columns
        variance = 1.0
        if self.criterion.estimated:
            variance = (self.found.square_sum + statistic) / freedom
        return float(np.sqrt(statistic / variance)), self.criterion.critical(self.sort, freedom)

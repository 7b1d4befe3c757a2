"""A start that gross errors do not spoil: reweighted least squares, and other starts where that is not enough.

An M-estimate minimises Σ ρ(r), r the whitened residuals over their scale s; its solution is that of least squares with
the weights ψ(r)/r, found anew in every step (Holland & Welsch 1977, *Communications in Statistics* A6, 813–827).
First Huber's ψ, which has one minimum and is reached from afar; then Tukey's biweight, which sets gross errors aside:

    Huber     weight min(1, k/|r|),                    k = 1.345 (Huber 1981, *Robust Statistics*; from memory)
    biweight  weight (1 − (r/c)²)² within c, else 0,   c = 4.685 (Beaton & Tukey 1974, *Technometrics* 16, 147–185)

both of 95 % efficiency on normal errors (Holland & Welsch 1977, table 1; from memory). s is 1.4826 times the median of
|r|, which half of the data leave alone (Hampel 1974, *J. American Statistical Association* 69), but at least the 1 that
was claimed.

Where too few observations agree with the outcome, the start itself was built from gross errors. It is built again from
a random part of the observations, those that disagree being the likelier to stay out, and the outcome that most
observations agree with is kept: random sample consensus (Fischler & Bolles 1981, *Communications of the ACM* 24).
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import BoolArray, FloatArray
from adjust.datum import minimal_datum
from adjust.errors import HubtackError
from adjust.iteration import after_step, moved_by, station_of_setups
from adjust.job import Job
from adjust.model import State, build_model
from adjust.network import Start, datum_parts, find_start
from adjust.solver import Analysis, analyse, rows_weighted
from adjust.unknowns import Unknowns

HUBER = 1.345
BIWEIGHT = 4.685
MEDIAN_TO_SD = 1.4826
"""sd of a normal distribution over its median absolute deviation: 1/Φ⁻¹(3/4)."""

LEAST_WEIGHT = 1e-8
"""In the place of 0, so that a mark whose observations are all set aside stays where it is instead of nowhere."""

STEPS = {"Huber": 12, "biweight": 8}
"""Steps at most: a start needs metres and seconds, not their last digits."""

STILL = 1e-3
"""Metres: a start that moves by less is good enough for Gauss–Newton."""

AGREES = 5.0
"""An observation agrees when its residual is below that many of its sds: one in two million does not by chance."""

ENOUGH = 0.85
"""Share of the observations that agree with a good start; gross errors are rarer than one in seven."""

TRIALS = 20
MOST_MARKS = 200
"""Other starts are tried that often, in networks up to that size: a second's work. In a larger one no random part is
free of gross errors."""

STAYS = 0.9
STAYS_THOUGH_DISAGREEING = 0.3
"""Chances of an observation to take part in another start."""

SEED = 20_261_105
"""The same job has the same starts every time."""


@dataclass(frozen=True)
class Outcome:
    """A start after reweighting, with the residual (rows,) of each observation of each kind in its sds."""

    start: Start
    residuals: tuple[FloatArray, ...]

    @property
    def agreement(self) -> float:
        """Share of the observations that agree with it."""
        return float(np.mean(np.concatenate(self.residuals) < AGREES))


def robust_start(job: Job, unknowns: Unknowns, start: Start) -> Start:
    """A start that most observations agree with, from one that gross errors may have spoilt."""
    best = _reweighted(job, unknowns, start)
    generator = np.random.default_rng(SEED)
    for _ in range(TRIALS if len(job.marks) <= MOST_MARKS else 0):
        if best is not None and best.agreement >= ENOUGH:
            break
        other = _another(job, unknowns, best, generator)
        if other is not None and (best is None or other.agreement > best.agreement):
            best = other
    return start if best is None else best.start


def _reweighted(job: Job, unknowns: Unknowns, start: Start) -> Outcome | None:
    try:
        return _Reweighting(job, unknowns, start).outcome()
    except HubtackError:
        return None


def _another(job: Job, unknowns: Unknowns, best: Outcome | None, generator: np.random.Generator) -> Outcome | None:
    """An outcome from a start that is built from a part of the observations; None where that part builds none.

    Marks are not searched for: among gross errors a search finds nothing to agree with and takes a second for it.
    """
    parts = []
    for place, rows in enumerate(job.observations):
        stays = np.full(len(rows), STAYS)
        if best is not None:
            stays[best.residuals[place] >= AGREES] = STAYS_THOUGH_DISAGREEING
        chosen: BoolArray = (generator.random(len(rows)) < stays) | (rows.kind == "control")
        parts.append(rows.take(chosen))
    try:
        start = find_start(replace(job, observations=tuple(parts)), unknowns, searching=False)
    except HubtackError:
        return None
    known = np.isfinite(start.geometry.coordinates[unknowns.sought]).all()
    return _reweighted(job, unknowns, start) if known else None


class _Reweighting:
    """Iteratively reweighted Gauss–Newton steps from one start."""

    def __init__(self, job: Job, unknowns: Unknowns, start: Start) -> None:
        self.job, self.unknowns, self.start = job, unknowns, start
        self.state = State(start.geometry, start.orientations)
        parts = datum_parts(job, unknowns) if job.datum.mode == "inner" else ()
        self.model = build_model(job, unknowns, minimal_datum(parts[0], start.geometry, unknowns) if parts else None)
        self.analysis: Analysis | None = None

    def outcome(self) -> Outcome:
        """Both weight functions, one after the other. Raises RankDefect where a mark is free to move."""
        for name, steps in STEPS.items():
            for _ in range(steps):
                before = self.state
                self.state = self._step(name)
                if moved_by(self.unknowns, before, self.state) < STILL:
                    break
        sizes = self._sizes(self.model.linearise(self.state).right_side)
        start = replace(self.start, geometry=self.state.geometry, orientations=self.state.orientations)
        return Outcome(start, tuple(sizes))

    def _step(self, name: str) -> State:
        linearisation = self.model.linearise(self.state)
        weights = np.sqrt(self._weights(linearisation.right_side, name))
        matrix = rows_weighted(linearisation.matrix, weights)
        if self.analysis is None:
            groups = self.model.groups(station_of_setups(self.job))
            self.analysis = analyse(matrix, groups, self.state.geometry.coordinates[:, :2])
        factor = self.analysis.factorise(matrix, linearisation.right_side * weights)
        return after_step(self.job, self.unknowns, self.state, factor.solution)

    def _weights(self, misclosures: FloatArray, name: str) -> FloatArray:
        """Weight (rows,) of each system row: one for all components of an observation, 1 for datum rows."""
        sizes = self._sizes(misclosures)
        repeated = [np.repeat(size, block.components) for size, block in zip(sizes, self.model.blocks, strict=True)]
        scaled = np.concatenate(repeated) / max(MEDIAN_TO_SD * float(np.median(np.concatenate(sizes))), 1.0)
        weights = np.ones(len(misclosures))
        weights[: len(scaled)] = np.maximum(huber(scaled) if name == "Huber" else biweight(scaled), LEAST_WEIGHT)
        return weights

    def _sizes(self, misclosures: FloatArray) -> list[FloatArray]:
        """|r| (rows,) of each observation of each kind: of correlated ones the root mean square of the components."""
        whole = [misclosures[block.system_rows].reshape(-1, block.components) for block in self.model.blocks]
        return [np.sqrt(np.mean(part**2, axis=1)) for part in whole]


def huber(r: FloatArray) -> FloatArray:
    """Weights min(1, k/r) of residuals r ≥ 0."""
    return np.asarray(HUBER / np.maximum(r, HUBER), dtype=np.float64)


def biweight(r: FloatArray) -> FloatArray:
    """Weights (1 − (r/c)²)² of residuals r ≥ 0, 0 beyond c."""
    return np.asarray(np.maximum(1.0 - (r / BIWEIGHT) ** 2, 0.0) ** 2, dtype=np.float64)

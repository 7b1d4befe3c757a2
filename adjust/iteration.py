"""Gauss–Newton: linearise, solve, move, until the coordinates stand still."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.datum import InnerDatum, displacement_of_unknowns, inner_datum, minimal_datum
from adjust.errors import ConvergenceError, NetworkError
from adjust.frames import Geometry
from adjust.job import Job
from adjust.model import Linearisation, Model, State, build_model, whitened
from adjust.network import Start, datum_parts
from adjust.solver import Analysis, Factor, RankDefect, SecondOpinion, analyse
from adjust.unknowns import Unknowns

STANDSTILL = 1e-5
"""Coordinates that move by no more than this have converged, metres: a tenth of what surveyors print."""

MOST_ITERATIONS = 20
"""Gauss–Newton from usable start coordinates needs 3 to 6; beyond 20 something is wrong with the data."""

MOST_HALVINGS = 12
"""A step cut to 1/4096 that still makes vᵀPv grow is not a descent worth following."""

Progress = Callable[[str, float], None]
"""Told the stage at work and how much of the whole is done, 0 … 1."""


@dataclass(frozen=True)
class Converged:
    """Where the iteration came to rest."""

    state: State
    model: Model
    linearisation: Linearisation
    factor: Factor
    inner: InnerDatum | None
    iterations: int
    opinion: SecondOpinion
    """On the first step, which carries the whole way from the start coordinates; later ones are almost nothing."""


def station_of_setups(job: Job) -> IntArray:
    """The mark (setups,) on which each setup of directions stands."""
    station = np.zeros(len(job.setups), dtype=np.int64)
    for observations in job.observations:
        if observations.setup is not None:
            station[observations.setup] = observations.marks[:, 0]
    return station


def iterate(job: Job, unknowns: Unknowns, start: Start, progress: Progress, most: int = MOST_ITERATIONS) -> Converged:
    """Adjust from start coordinates.

    Raises NetworkError where the observations leave some mark undetermined, ConvergenceError where `most` iterations do
    not settle.
    """
    return _GaussNewton(job, unknowns, start, progress, most).run()


def after_step(job: Job, unknowns: Unknowns, state: State, step: FloatArray) -> State:
    """The state after a step (unknowns,): metres along local axes, then radians of the orientations."""
    corrections = np.zeros(unknowns.sought.shape)
    corrections[unknowns.sought] = step[: unknowns.coordinates]
    before = state.geometry
    reached = np.where(unknowns.sought, before.moved(corrections).coordinates, before.coordinates)
    geometry = with_geoid(job, replace(before, coordinates=reached))
    return State(geometry, state.orientations + step[unknowns.coordinates :])


def moved_by(unknowns: Unknowns, before: State, after: State) -> float:
    """The longest way, metres along one axis, that an unknown coordinate went."""
    moved = before.geometry.frame.displacement(before.geometry.coordinates, after.geometry.coordinates)
    return float(np.abs(moved[unknowns.sought]).max(initial=0.0))


class _GaussNewton:
    """The iteration of one job; the symbolic analysis is done once and reused."""

    def __init__(self, job: Job, unknowns: Unknowns, start: Start, progress: Progress, most: int) -> None:
        self.job, self.unknowns, self.progress, self.most = job, unknowns, progress, most
        self.state = State(start.geometry, start.orientations)
        self.stations = station_of_setups(job)
        self.given = np.where(np.isnan(job.marks.given), start.geometry.coordinates, job.marks.given)
        self.parts = datum_parts(job, unknowns) if job.datum.mode == "inner" else ()
        datum_rows = minimal_datum(self.parts[0], start.geometry, unknowns) if self.parts else None
        self.model = build_model(job, unknowns, datum_rows)
        self.analysis: Analysis | None = None
        self.opinion: SecondOpinion | None = None

    def run(self) -> Converged:
        for iteration in range(1, self.most + 1):
            self.progress("adjusting", iteration / (iteration + 2))
            linearisation = self.model.linearise(self.state)
            self._refuse_without_geometry(linearisation)
            factor = self._solve(linearisation)
            if self.opinion is None:
                self.opinion = factor.second_opinion()
            before = self.state
            self.state = self._step(linearisation, factor.solution)
            inner = self._fit_to_given()
            if self._moved(before) <= STANDSTILL:
                return Converged(self.state, self.model, linearisation, factor, inner, iteration, self.opinion)
        raise ConvergenceError(self._failure(linearisation))

    def _solve(self, linearisation: Linearisation) -> Factor:
        if self.analysis is None:
            coordinates = self.state.geometry.coordinates
            self.analysis = analyse(linearisation.matrix, self.model.groups(self.stations), coordinates[:, :2])
        try:
            return self.analysis.factorise(linearisation.matrix, linearisation.right_side)
        except RankDefect as defect:
            raise self._undetermined(defect) from None

    def _step(self, linearisation: Linearisation, step: FloatArray) -> State:
        """The state after the step, halved while vᵀPv grows."""
        now = float(np.sum(linearisation.right_side**2))
        reached = self._after(step)
        for _ in range(MOST_HALVINGS):
            largest = np.abs(step[: self.unknowns.coordinates]).max(initial=0.0)
            if largest <= STANDSTILL or self.model.weighted_square_sum(reached, linearisation.factors) <= now:
                break
            step = step / 2
            reached = self._after(step)
        return reached

    def _after(self, step: FloatArray) -> State:
        return after_step(self.job, self.unknowns, self.state, step)

    def _fit_to_given(self) -> InnerDatum | None:
        """Under inner constraints, move the whole network to its fit on the given coordinates."""
        if not self.parts:
            return None
        geometry, unknowns = self.state.geometry, self.unknowns
        inner = inner_datum(self.job, self.parts[0], geometry, unknowns)
        away = displacement_of_unknowns(geometry.frame, self.given, geometry.coordinates, unknowns)
        self.state = self._after(inner.correction(away))
        return inner

    def _moved(self, before: State) -> float:
        largest = moved_by(self.unknowns, before, self.state)
        if not np.isfinite(largest):
            raise ConvergenceError(
                "the adjustment ran away from its start coordinates: check the control's coordinates"
            )
        return largest

    def _refuse_without_geometry(self, linearisation: Linearisation) -> None:
        """A sight of no length, or straight up, has no azimuth: nothing can be computed from it."""
        matrix = linearisation.matrix
        broken = np.flatnonzero(~np.isfinite(matrix.data))
        if len(broken):
            rows = np.unique(np.searchsorted(matrix.indptr, broken, side="right") - 1)
            places = ", ".join(dict.fromkeys(self.model.source(int(row)) for row in rows[:SHOWN]))
            raise NetworkError(
                f"the marks of {places} coincide or stand above each other, so that the observation has no direction: "
                "look for one mark under two names, or leave the row out (use = no)"
            )

    def _undetermined(self, defect: RankDefect) -> NetworkError:
        """Name the marks that can move without any observation changing."""
        motion = np.abs(defect.motion[: self.unknowns.coordinates])
        if motion.max(initial=0.0) == 0.0:
            setups = [self.job.setups[column - self.unknowns.coordinates] for column in defect.columns]
            return NetworkError(f"the orientation of setup {', '.join(setups)} is not determined: observe a known mark")
        moving = self.unknowns.mark_of_column()[motion > MOVES * motion.max()]
        names = [self.job.marks.names[mark] for mark in dict.fromkeys(moving.tolist())]
        shown = ", ".join(names[:SHOWN]) + (f" and {len(names) - SHOWN} more" if len(names) > SHOWN else "")
        return NetworkError(
            f"the network is not determined: {shown} can move without any observation changing; "
            "add an observation or control that holds what moves, or leave the marks out",
            names,
        )

    def _failure(self, linearisation: Linearisation) -> str:
        """What to say when the iteration does not settle: the observations that fit worst."""
        worst: list[tuple[float, str]] = []
        for block, factor in zip(self.model.blocks, linearisation.factors, strict=True):
            misfit = np.abs(whitened(factor, block.misclosure(self.state))).max(axis=1)
            label = block.observations.provenance.label
            worst.extend((-misfit[row], label(int(row))) for row in np.argsort(-misfit)[:SHOWN])
        places = ", ".join(label for _, label in sorted(worst)[:SHOWN])
        return (
            f"no convergence in {self.most} iterations: look first at {places}, which fit worst; a wrong mark or "
            "unit, a wrong control coordinate, or an almost undetermined mark does this"
        )


MOVES = 0.1
"""A mark is named as moving when it moves by this share of the most mobile one."""

SHOWN = 5
"""Names in one message: enough to find the place, few enough to read."""


def with_geoid(job: Job, geometry: Geometry) -> Geometry:
    """The geometry with geoid heights from the job's grid at the marks' present positions, if it has one.

    A mark without a position keeps the geoid height it has.
    """
    if job.geoid_grid is None:
        return geometry
    found = job.geoid_grid.heights(geometry.frame.geographic(geometry.coordinates))
    return replace(geometry, geoid=np.where(np.isnan(found), geometry.geoid, found))

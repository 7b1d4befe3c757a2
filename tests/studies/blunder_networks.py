"""Invented networks for the study of blunders, each linearised once, and the blunders planted in them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from adjust import Job
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.blunders.criterion import Criterion
from adjust.blunders.evidence import Evidence
from adjust.blunders.hypotheses import Hypotheses
from adjust.blunders.system import System, model_of
from adjust.blunders.telling import sources_of
from adjust.frames import EllipsoidFrame, PlaneFrame
from adjust.model import State
from adjust.observations import Observations
from adjust.quality import non_centrality
from adjust.simulate import (
    Equipment,
    assemble,
    gnss_net,
    levelling_net,
    observe,
    place_marks,
    tied_traverses,
    total_station_net,
    triangulation_grid,
    true_geometry,
)
from adjust.simulate.networks import PLANE_ORIGIN
from adjust.unknowns import find_unknowns

SEPARABLE = 0.9
"""|Correlation| of two test statistics from which on one error can pass for the other."""


def levels(rows: int, columns: int, runs: int = 1, diagonals: bool = True) -> Callable[[np.random.Generator], Job]:
    """A level net, every line run so often, with or without the lines along diagonals."""

    def plan(generator: np.random.Generator) -> Job:
        job = levelling_net(generator, rows, columns)
        (lines,) = job.observations
        kept = np.ones(len(lines), dtype=bool) if diagonals else ~_diagonal(lines, columns)
        return with_rows(job, [repeated(lines.take(kept), runs)])

    return plan


def _diagonal(lines: Observations, columns: int) -> BoolArray:
    diagonal: BoolArray = lines.marks[:, 1] - lines.marks[:, 0] == columns + 1
    return diagonal


def traverses(legs: int, tie_every: int = 1) -> Callable[[np.random.Generator], Job]:
    """Two traverses tied across, all ends held; rounds at all marks, distances from both ends."""

    def plan(generator: np.random.Generator) -> Job:
        layout = tied_traverses(legs, generator, tie_every=tie_every)
        ends = (0, 1, len(layout) - 2, len(layout) - 1)
        coordinates = layout.coordinates(PlaneFrame(), PLANE_ORIGIN) * (1.0, 1.0, np.nan)
        equipment, sights = Equipment(), layout.both_ways()
        kinds = [equipment.directions(sights), equipment.horizontal_distances(sights)]
        return assemble("Tied traverses", PlaneFrame(), place_marks(coordinates, fixed_plan=ends), kinds)

    return plan


def triangulation(rows: int, columns: int) -> Callable[[np.random.Generator], Job]:
    """A plan grid with rounds at all marks and a distance along every line."""
    return lambda generator: triangulation_grid(generator, rows, columns)


def total_station(rows: int, columns: int) -> Callable[[np.random.Generator], Job]:
    """Directions, zenith angles and slope distances in three dimensions."""
    return lambda generator: total_station_net(generator, rows, columns)


def vectors(rows: int, columns: int, runs: int = 1) -> Callable[[np.random.Generator], Job]:
    """GNSS vectors along every line, so often."""

    def plan(generator: np.random.Generator) -> Job:
        job = gnss_net(generator, rows, columns)
        assert isinstance(job.frame, EllipsoidFrame)
        return with_rows(job, [repeated(job.observations[0], runs), *job.observations[1:]])

    return plan


def repeated(rows: Observations, runs: int) -> Observations:
    """Every row so often."""
    return rows.take(np.tile(np.arange(len(rows)), runs))


def with_rows(job: Job, kinds: list[Observations]) -> Job:
    """The plan with other rows, in lines of their own."""
    own = [rows for rows in kinds if rows.kind != "control"]
    return assemble(job.title, job.frame, job.marks, own)


@dataclass(frozen=True)
class Network:
    """A network linearised at the truth: errors of any size enter exactly, and a thousand jobs cost one factorisation.

    `whole` is whether blunders are planted in vectors as a whole, in a random direction, or in single components.
    """

    hypotheses: Hypotheses
    whole: bool
    estimated: bool

    @classmethod
    def of(cls, plan: Job, generator: np.random.Generator, whole: bool, estimated: bool) -> Network:
        """Linearise a plan."""
        job, truth = observe(plan, generator)
        unknowns, state = find_unknowns(job), State(true_geometry(plan), truth.orientations)
        model = model_of(job, unknowns, state)
        return cls(Hypotheses.of(System.at(job, model, state)), whole, estimated)

    @property
    def job(self) -> Job:
        """The job behind it."""
        return self.hypotheses.system.job

    @property
    def rows(self) -> int:
        """Observations: components count one each."""
        return self.hypotheses.rows

    @property
    def unknowns(self) -> int:
        """Coordinates and orientations."""
        return self.hypotheses.system.model.unknowns.count

    @cached_property
    def orthonormal(self) -> FloatArray:
        """Q (rows, unknowns) of Ã = QR."""
        return np.linalg.qr(self.hypotheses.system.matrix.toarray())[0]

    @cached_property
    def _silent(self) -> Evidence:
        return self.hypotheses.evidence()

    @cached_property
    def information(self) -> FloatArray:
        """G (rows, rows) of the single components."""
        return self._silent.information.block(np.arange(self.rows), np.arange(self.rows))

    @cached_property
    def sources(self) -> tuple[str, ...]:
        """The line of the book (hypotheses,) of each single component and vector; of groups "", for they are none."""
        hypotheses = map(self.hypotheses.hypothesis, range(self.hypotheses.first_group + len(self.hypotheses.groups)))
        lines = [sources_of(self.job, hypothesis) for hypothesis in hypotheses]
        return tuple(found[0] if len(found) == 1 else "" for found in lines)

    @property
    def members(self) -> dict[int, IntArray]:
        """Columns (m, q) of single components and of whole vectors, by their number q, not those of groups."""
        return {q: members[members[:, 0] < self.rows] for q, members in self._silent.members.items() if q in (1, 3)}

    def evidence(self, observed: FloatArray) -> Evidence:
        """What whitened misclosures (rows,) say."""
        residual = observed - self.orthonormal @ (self.orthonormal.T @ observed)
        score = np.asarray(self.hypotheses.columns.T @ residual)
        return replace(self._silent, score=score, square_sum=float(residual @ residual))

    def criterion(self, evidence: Evidence) -> Criterion:
        """Prices at the job's significance."""
        significance = self.job.statistics.significance
        return Criterion(significance, self.estimated, evidence.square_sum, evidence.freedom)

    @cached_property
    def places(self) -> tuple[IntArray, ...]:
        """Where a blunder can be planted: columns of each testable component, or of each vector."""
        testable = self._silent.by_itself.testable
        if not self.whole:
            return tuple(np.array([column]) for column in np.flatnonzero(testable[: self.rows]))
        members = self._silent.members[3]
        vectors = members[members[:, 0] < self.rows]
        return tuple(vectors[testable[vectors].all(axis=1)])

    @cached_property
    def closest(self) -> FloatArray:
        """The largest |correlation| (places,) of the test of each place with that of any other."""
        inverse = [np.linalg.inv(np.linalg.cholesky(self.information[np.ix_(own, own)])) for own in self.places]
        columns = np.concatenate(self.places)
        whitening = np.zeros((len(columns), len(columns)))
        width = len(self.places[0])
        for number, factor in enumerate(inverse):
            own = slice(number * width, (number + 1) * width)
            whitening[own, own] = factor
        turned = whitening @ self.information[np.ix_(columns, columns)] @ whitening.T
        blocks = turned.reshape(len(self.places), width, len(self.places), width).transpose(0, 2, 1, 3)
        largest = np.linalg.norm(blocks, ord=2, axis=(2, 3))
        np.fill_diagonal(largest, 0.0)
        closest: FloatArray = largest.max(axis=1)
        return closest

    def planted(self, place: int, size: float, generator: np.random.Generator) -> FloatArray:
        """Whitened misclosures (rows,) of a blunder of `size` times its minimal detectable bias."""
        columns = self.places[place]
        statistics = self.job.statistics
        detectable = np.sqrt(non_centrality(statistics.significance, statistics.power, len(columns)))
        direction = generator.standard_normal(len(columns))
        own = self.information[np.ix_(columns, columns)]
        error = direction * (size * detectable / np.sqrt(direction @ own @ direction))
        return np.asarray(self.hypotheses.columns[:, columns] @ error)


@dataclass(frozen=True)
class Planted:
    """One job: its whitened misclosures (rows,), and the lines of the book that are wrong."""

    network: Network
    observed: FloatArray
    wrong: frozenset[str]


def draw(
    network: Network, count: int, sizes: tuple[float, float], generator: np.random.Generator, separable: bool
) -> Planted | None:
    """So many blunders of `sizes` times their minimal detectable bias in different lines; None where there are too few.

    All of them separable from all other observations, or one at least not.
    """
    apart = network.closest < SEPARABLE
    lines = np.array([network.sources[int(place[0])] for place in network.places])
    observed = generator.standard_normal(network.rows)
    among = np.flatnonzero(apart) if separable else np.arange(len(lines))
    if len(np.unique(lines[among])) < count or (not separable and apart.all()):
        return None
    while True:
        chosen = generator.choice(among, count, replace=False)
        if len(set(lines[chosen])) == count and (separable or not apart[chosen].all()):
            break
    for place in chosen:
        observed = observed + network.planted(int(place), float(generator.uniform(*sizes)), generator)
    return Planted(network, observed, frozenset(lines[chosen].tolist()))

"""Are the wrong observations found, and only they? Blunders planted in invented networks, side by side with other ways.

    python -m tests.studies.blunders            # rewrites the tables of docs/validation-blunders.md
    python -m tests.studies.blunders none one   # or some of them

Errors are planted in the linearised system at the truth, so that a network is factorised once for ten jobs; `whole`
and `gross` go the whole way from readings to the answer.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property, partial

import numpy as np

from adjust import Job
from adjust.arrays import BoolArray
from adjust.blunders.diagnosis import Diagnosis, diagnose
from tests.studies.blunder_networks import (
    Network,
    Planted,
    draw,
    levels,
    total_station,
    traverses,
    triangulation,
    vectors,
)
from tests.studies.blunder_rivals import maximum_likelihood, plain_snooping, robust_regression
from tests.studies.monte_carlo import Share, share
from tests.studies.pages import rewrite

SEED = 20261201
PAGE = "validation-blunders.md"
JOBS_OF_A_NETWORK = 10
"""Jobs that share their ground and their factorisation, not their errors."""

SMALL, LARGE = 200, 80
"""Jobs for each line of the tables: of networks small enough for the limit, and of the others."""
SMALL_TOGETHER, LARGE_TOGETHER = 200, 80
"""The same where the other ways have to be gone besides."""
SMALL_CLOSE, LARGE_CLOSE = 60, 20
"""The same of what can not be told apart, for each number of blunders."""
ROBUST = 30
"""The first so many of them also go through robust regression, which takes longest."""
MOST_SETS = 200_000_000
"""Sets of four, without leaving out any order, that the limit of three blunders may look at on a line: minutes."""
QUIET = 400
"""Jobs without a blunder."""
ONE = (1.5, 5.0)
SEVERAL = (2.0, 10.0)
"""Sizes of planted blunders, in their minimal detectable biases."""
LEAST_LIMITED = 40
FALSE_ALARMS = 0.001
"""For each observation: the significance of the jobs."""


@dataclass(frozen=True)
class Shape:
    """One line of the tables: how to make the network, and what is planted in it."""

    name: str
    plan: Callable[[np.random.Generator], Job]
    vector: bool = False
    """Whether whole vectors are wrong, not single components."""
    limit: bool = False
    """Whether maximum likelihood over all sets can be had."""

    def network(self, number: int, estimated: bool) -> Network:
        """One of its networks, in the order of their numbers."""
        generator = np.random.default_rng([SEED, number])
        return Network.of(self.plan(generator), generator, self.vector, estimated)

    def limited(self, jobs: int, blunders: int) -> int:
        """The first so many jobs for which the limit is found: of three blunders not all where that takes minutes."""
        supposed = sum(map(len, self.network(0, False).members.values()))
        return jobs if blunders < 3 else min(jobs, max(LEAST_LIMITED, MOST_SETS // supposed**4))

    def jobs(
        self, count: int, blunders: int, sizes: tuple[float, float] = SEVERAL, *, apart: bool = True, est: bool = False
    ) -> Iterator[Planted]:
        """So many jobs with so many blunders each, separable ones, or with one at least that is not."""
        for number in range(count):
            if number % JOBS_OF_A_NETWORK == 0:
                network = self.network(number // JOBS_OF_A_NETWORK, est)
            generator = np.random.default_rng([SEED, blunders, number])
            job = draw(network, blunders, sizes, generator, apart)
            if job is not None:
                yield job


SHAPES = (
    Shape("levels, 12 marks", levels(3, 4), limit=True),
    Shape("levels, 12 marks, run twice", levels(3, 4, 2), limit=True),
    Shape("levels, 12 marks, few lines", levels(3, 4, diagonals=False), limit=True),
    Shape("tied traverses, 10 marks", traverses(4), limit=True),
    Shape("triangulation, 9 marks", triangulation(3, 3), limit=True),
    Shape("total station, 8 marks", total_station(2, 4), limit=True),
    Shape("GNSS, 8 marks, components", vectors(2, 4), limit=True),
    Shape("GNSS, 8 marks, vectors", vectors(2, 4), vector=True, limit=True),
    Shape("levels, 60 marks", levels(6, 10)),
    Shape("tied traverses, 26 marks", traverses(12)),
    Shape("triangulation, 24 marks", triangulation(4, 6)),
    Shape("triangulation, 60 marks", triangulation(6, 10)),
    Shape("total station, 20 marks", total_station(4, 5)),
    Shape("GNSS, 20 marks, components, twice", vectors(4, 5, 2)),
    Shape("GNSS, 20 marks, vectors", vectors(4, 5), vector=True),
)


@dataclass(frozen=True)
class Verdict:
    """What the search says of one job, by lines of the book; of what is no single line, by its name."""

    job: Planted
    diagnosis: Diagnosis

    @classmethod
    def of(cls, job: Planted) -> Verdict:
        """The search from nothing, as `find_blunders` ends it."""
        evidence = job.network.evidence(job.observed)
        return cls(job, diagnose(evidence, job.network.criterion(evidence), job.network.rows).settled())

    def line(self, hypothesis: int) -> str:
        """Line of the book of one hypothesis, or its name."""
        network = self.job.network
        return network.sources[hypothesis] or network.hypotheses.hypothesis(hypothesis).name

    @cached_property
    def named(self) -> list[str]:
        """Named, plainest first."""
        allowed, criterion = self.diagnosis.allowed, self.diagnosis.criterion
        bounds = [criterion.critical(allowed.evidence.sort(one), criterion.freedom) for one in allowed.chosen]
        order = np.argsort(-allowed.losses / np.square(bounds), kind="stable")
        return [self.line(self.diagnosis.chosen[place]) for place in order]

    @cached_property
    def sets(self) -> list[set[str]]:
        """Each of the named with all that may stand in its place, plainest first."""
        found = {
            self.line(one): {self.line(other) for other in (one, *self.diagnosis.alternatives(one))}
            for one in self.diagnosis.chosen
        }
        return [found[name] for name in self.named]

    @property
    def right(self) -> bool:
        """All named and nothing else."""
        return sorted(self.named) == sorted(self.job.wrong)

    @property
    def first_right(self) -> bool:
        """Whether the first one named is wrong indeed."""
        return bool(self.named) and self.named[0] in self.job.wrong

    @property
    def first_set_right(self) -> bool:
        """Whether the first one named or one that may stand in its place is."""
        return bool(self.sets) and not self.sets[0].isdisjoint(self.job.wrong)

    @property
    def covered(self) -> bool:
        """Whether all that is wrong is named or may stand in the place of what is named."""
        return self.job.wrong <= set().union(*self.sets)

    @property
    def size(self) -> float:
        """How many lines are named or may stand in the place of those, for each one that is wrong."""
        return len(set().union(*self.sets)) / max(len(self.job.wrong), 1)


def none(shapes: Sequence[Shape], jobs: int) -> str:
    """False alarms where nothing is wrong."""
    lines = table("network", "σ₀", "jobs", "observations", "false alarms", "off by standard errors")
    every = []
    for shape in shapes:
        for est in (False, True):
            counts = [(len(Verdict.of(job).named), job.network.rows) for job in shape.jobs(jobs, 0, est=est)]
            every += [] if est else counts
            lines += row(shape.name, "estimated" if est else "known", *_alarms(counts))
    return "".join([*lines, *row("all", "known", *_alarms(every))])


def _alarms(counts: list[tuple[int, int]]) -> tuple[str, ...]:
    found = false_alarms(counts)
    return f"{len(counts):,}", f"{found.trials:,}", f"{found.found:.3%}", f"{found.off:+.1f}"


def false_alarms(counts: list[tuple[int, int]]) -> Share:
    """How often an observation is named that is not wrong, from (named, observations) of each job."""
    return share(counts, FALSE_ALARMS)


def one(shapes: Sequence[Shape], jobs: Callable[[Shape], int]) -> str:
    """One blunder, separable from all others."""
    lines = table("network", "jobs", "named first", "in the set", "lines in the set", "named, nothing else")
    for shape in shapes:
        verdicts = [Verdict.of(job) for job in shape.jobs(jobs(shape), 1, ONE)]
        first = [len(v.sets[0]) if v.sets else 0 for v in verdicts]
        shares = [percent([getattr(v, name) for v in verdicts]) for name in ("first_right", "first_set_right")]
        lines += row(shape.name, len(verdicts), *shares, f"{np.mean(first):.2f}", percent([v.right for v in verdicts]))
    return "".join(lines)


@dataclass(frozen=True)
class Comparison:
    """Which of the ways name all that is wrong and nothing else, on the same jobs: ways by jobs."""

    ways: dict[str, BoolArray]
    covered: BoolArray

    def gap(self, way: str) -> tuple[float, float]:
        """Ours minus another way, and the standard error of that, as shares of the jobs they share."""
        other = self.ways[way]
        difference = self.ways["ours"][: len(other)].astype(float) - other
        return float(np.mean(difference)), float(np.std(difference) / np.sqrt(len(difference)))


def compare(shape: Shape, jobs: int, blunders: int) -> Comparison:
    """All ways on the same jobs, those that take long on the first of them."""
    planted = list(shape.jobs(jobs, blunders))
    verdicts = [Verdict.of(job) for job in planted]
    ways: dict[str, list[bool]] = {
        "ours": [verdict.right for verdict in verdicts],
        "snooping": [plain_snooping(job) == job.wrong for job in planted],
        "Huber": [robust_regression(job, "Huber") == job.wrong for job in planted[:ROBUST]],
        "bisquare": [robust_regression(job, "bisquare") == job.wrong for job in planted[:ROBUST]],
    }
    if shape.limit:
        ways["limit"] = [
            maximum_likelihood(job, blunders + 1) == job.wrong for job in planted[: shape.limited(jobs, blunders)]
        ]
    return Comparison({way: np.array(found) for way, found in ways.items()}, np.array([v.covered for v in verdicts]))


def several(shapes: Sequence[Shape], jobs: Callable[[Shape], int]) -> str:
    """Two and three blunders at once, each separable."""
    lines = table(
        "network", "blunders", "jobs", "ours", "the limit", "on jobs", "ours − limit", "snooping", "ours − snooping",
        "Huber", "bisquare", "in the sets",
    )  # fmt: skip
    for shape in shapes:
        for blunders in (2, 3):
            found = compare(shape, jobs(shape), blunders)
            limit = [""] * 3
            if shape.limit:
                limits = found.ways["limit"]
                limit = [percent(limits), str(len(limits)), points(found.gap("limit"))]
            others = [percent(found.ways[way]) for way in ("Huber", "bisquare")]
            lines += row(
                shape.name, blunders, len(found.covered), percent(found.ways["ours"]), *limit,
                percent(found.ways["snooping"]), points(found.gap("snooping")), *others, percent(found.covered),
            )  # fmt: skip
    return "".join(lines)


def close(shapes: Sequence[Shape], jobs: Callable[[Shape], int]) -> str:
    """Blunders of which one at least can not be told from another observation: "one of these"."""
    lines = table("network", "blunders", "jobs", "in the sets", "lines in the sets for each blunder", "named outright")
    for shape in shapes:
        for blunders in (1, 2, 3):
            verdicts = [Verdict.of(job) for job in shape.jobs(jobs(shape), blunders, apart=False)]
            if verdicts:
                size = float(np.mean([verdict.size for verdict in verdicts]))
                shares = [percent([getattr(v, name) for v in verdicts]) for name in ("covered", "right")]
                lines += row(shape.name, blunders, len(verdicts), shares[0], f"{size:.2f}", shares[1])
    return "".join(lines)


def percent(found: Sequence[bool] | BoolArray) -> str:
    """A share in percent."""
    return f"{np.mean(found):.1%}" if len(found) else ""


def points(gap: tuple[float, float]) -> str:
    """A difference of shares in points of a hundred with its standard error."""
    return f"{100 * gap[0]:+.1f} ± {100 * gap[1]:.1f}"


def table(*titles: str) -> list[str]:
    """Head of a table, first column of words."""
    return [*row(*titles), *row("---", *["---:"] * (len(titles) - 1))]


def row(*cells: object) -> list[str]:
    """One line of a table."""
    return [f"| {' | '.join(map(str, cells))} |\n"]


def usual(shape: Shape) -> int:
    """Jobs of a line."""
    return SMALL if shape.limit else LARGE


def together(shape: Shape) -> int:
    """Jobs of a line that all ways share."""
    return SMALL_TOGETHER if shape.limit else LARGE_TOGETHER


def apart_no_more(shape: Shape) -> int:
    """Jobs of a line with blunders that can not be told from other observations."""
    return SMALL_CLOSE if shape.limit else LARGE_CLOSE


def networks(shapes: Sequence[Shape]) -> str:
    """What the networks are like."""
    lines = table("network", "marks", "observations", "unknowns", "for each unknown", "separable")
    for shape in shapes:
        network = shape.network(0, False)
        share_apart = float(np.mean(network.closest < 0.9))
        lines += row(
            shape.name, len(network.job.marks), network.rows, network.unknowns,
            f"{network.rows / network.unknowns:.1f}", f"{share_apart:.0%}",
        )  # fmt: skip
    return "".join(lines)


def sections() -> dict[str, Callable[[], str]]:
    """The tables of the page by their names."""
    from tests.studies.blunders_whole_way import GROSS_JOBS, WHOLE_JOBS, gross, whole

    return {
        "networks": partial(networks, SHAPES),
        "one": partial(one, SHAPES, usual),
        "several": partial(several, SHAPES, together),
        "close": partial(close, SHAPES, apart_no_more),
        "none": partial(none, SHAPES, QUIET),
        "whole": partial(whole, WHOLE_JOBS),
        "gross": partial(gross, GROSS_JOBS),
    }


def main(names: Sequence[str]) -> None:
    """Make some tables, or all, show them and put them into the page."""
    every = sections()
    for name in names or every:
        made = every[name]()
        print(made, flush=True)
        rewrite(PAGE, name, made)


if __name__ == "__main__":
    main(sys.argv[1:])

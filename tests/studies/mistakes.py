"""Is a suspect explained rightly? Every mistake of the catalogue, planted; and errors that are none of them.

    python -m tests.studies.mistakes    # rewrites the tables of docs/validation-mistakes.md

The suspect is taken as found (that is the study of blunders): the catalogue is told which entry is wrong, what the rest
of the network expects in its place, and what stands in the book.
"""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from adjust.blunders import Context
from adjust.blunders.mistakes import PRIORS, explain
from adjust.simulate import NETWORKS, observe
from tests.planting import VALUE, book, read, revalued, with_row
from tests.studies.pages import rewrite
from tests.studies.planted import BOOKED, DETECTABLE, SHAPES, START_SD, Case, Plant
from tests.studies.planted_raw import RAW
from tests.suspects import suspect_row

JOBS = 200
"""Of each mistake."""
RANDOM_JOBS = 2000
"""Of each range of sizes."""
PRIOR_JOBS = 20
"""Of each mistake, for the question what the priors matter."""
SEED = 20261201
PAGE = "validation-mistakes.md"
PLANTS: tuple[Plant, ...] = (*BOOKED, *RAW)
RANGES = {"1.5 … 10": 10.0, "1.5 … 100": 100.0, "1.5 … 1000": 1000.0}
"""Sizes of errors that are no mistake of the catalogue, as multiples of the minimal detectable bias."""
RIGHT, OTHER, NONE = "right first", "another first", "none offered"


@dataclass(frozen=True)
class Score:
    """What became of the jobs of one plant."""

    plant: Plant
    counts: Counter[str]
    later: int
    """Of those with another explanation first: how many have the right one further down."""

    @property
    def jobs(self) -> int:
        """How many there were."""
        return self.counts.total()


def verdict(case: Case) -> tuple[str, bool]:
    """What stands first, and whether the right explanation is offered at all."""
    told = explain(case.context)
    if not told:
        return NONE, False
    return (RIGHT if case.right(told[0]) else OTHER), any(map(case.right, told))


def scored(plant: Plant, jobs: int, seed: int = SEED) -> Score:
    """One line of the table."""
    verdicts = [verdict(case) for case in plant.cases(jobs, seed)]
    later = sum(offered for first, offered in verdicts if first == OTHER)
    return Score(plant, Counter(first for first, _ in verdicts), later)


def random_errors(jobs: int, most: float, seed: int = SEED) -> Iterator[Context]:
    """Suspects with an error of uniform size and no cause, all kinds in turn."""
    kinds = list(SHAPES)
    for number in range(jobs):
        generator = np.random.default_rng([seed, number, int(most)])
        yield next(filter(None, (random_error(kinds[number % len(kinds)], most, generator) for _ in range(1000))))


def random_error(kind: str, most: float, generator: np.random.Generator) -> Context | None:
    """One of them, between 1.5 and `most` minimal detectable biases, in a random direction; None where the row can not
    be checked, or would be refused."""
    plan = NETWORKS[str(generator.choice(SHAPES[kind]))](generator)
    job, _ = observe(plan, generator, start_sd=START_SD)
    place = [rows.kind for rows in job.observations].index(kind)
    booked = book(plan, job, place, int(generator.integers(len(job.observations[place]))), generator)
    context = suspect_row(booked.job, place, booked.row, booked.cells)
    if context is None:
        return None
    direction = generator.standard_normal(len(context.estimated_error))
    size = DETECTABLE * generator.uniform(1.5, most) / np.linalg.norm(direction)
    error = np.linalg.cholesky(context.error_covariance) @ direction * size
    cells = booked.cells
    for name, part in zip(["dx", "dy", "dz"] if kind == "vector" else [VALUE[kind]], error.tolist(), strict=True):
        cells = revalued(cells, name, lambda value, part=part: wrapped(kind, value + part))  # type: ignore[misc]
    row = read(booked, cells)
    if kind in ("zenith", "slope_distance", "horizontal_distance") and not 0 < row.observed[0, 0] < limit(kind):
        return None
    return suspect_row(with_row(booked, row), place, booked.row, cells)


def wrapped(kind: str, value: float) -> float:
    """Angles round the circle, but for zenith angles."""
    return value % (2 * np.pi) if kind in ("direction", "angle", "azimuth") else value


def limit(kind: str) -> float:
    """What the field book would still take."""
    return np.pi if kind == "zenith" else np.inf


def share_explained(contexts: Iterator[Context]) -> float:
    """Share of suspects for which some mistake is offered."""
    return float(np.mean([bool(explain(context)) for context in contexts]))


def table(scores: Sequence[Score]) -> str:
    """The table by mistake."""
    lines = [
        "| mistake | made in | right first | another first | of these right further down | none offered |",
        "| --- | --- | ---: | ---: | ---: | ---: |",
    ]
    lines += [row(score.plant.mistake, score.plant.where, [score]) for score in scores]
    return "\n".join([*lines, row("**all**", f"{sum(score.jobs for score in scores):,} jobs", scores)]) + "\n"


def row(mistake: str, where: str, scores: Sequence[Score]) -> str:
    """One line of it."""
    jobs = sum(score.jobs for score in scores)
    first, another, none = (sum(score.counts[word] for score in scores) / jobs for word in (RIGHT, OTHER, NONE))
    later = sum(score.later for score in scores) / jobs
    return f"| {mistake} | {where} | {first:.1%} | {another:.1%} | {later:.1%} | {none:.1%} |"


def random_table(jobs: int) -> str:
    """The table of errors without a cause."""
    lines = ["| size in minimal detectable biases | errors | explained |", "| --- | ---: | ---: |"]
    for words, most in RANGES.items():
        lines.append(f"| {words} | {jobs:,} | {share_explained(random_errors(jobs, most)):.1%} |")
    return "\n".join(lines) + "\n"


def with_other_priors(plants: Sequence[Plant], jobs: int, seed: int = SEED) -> tuple[float, float]:
    """Share of jobs with the right explanation first: with the table of priors, and with every figure of it up to
    three times as large or as small, drawn anew for each job."""
    usual, generator = dict(PRIORS), np.random.default_rng(seed)
    found = []
    for case in (case for plant in plants for case in plant.cases(jobs, seed)):
        first = verdict(case)[0] == RIGHT
        PRIORS.update({name: prior * 3.0 ** generator.uniform(-1, 1) for name, prior in usual.items()})
        found.append((first, verdict(case)[0] == RIGHT))
        PRIORS.update(usual)
    with_table, without = np.mean(found, axis=0)
    return float(with_table), float(without)


def priors_table(jobs: int) -> str:
    """The table of what the priors matter."""
    with_table, without = with_other_priors(PLANTS, jobs)
    lines = [
        "| priors | jobs | right first |",
        "| --- | ---: | ---: |",
        f"| the table | {jobs * len(PLANTS):,} | {with_table:.1%} |",
        f"| each up to 3 × off | {jobs * len(PLANTS):,} | {without:.1%} |",
    ]
    return "\n".join(lines) + "\n"


def main() -> int:
    """Run the study, show the tables, put them into the page."""
    scores = []
    for plant in PLANTS:
        scores.append(scored(plant, JOBS))
        print(row(plant.mistake, plant.where, scores[-1:]), flush=True)
    chance = random_table(RANDOM_JOBS)
    print(chance)
    rewrite(PAGE, "mistakes", table(scores))
    rewrite(PAGE, "chance", chance)
    rewrite(PAGE, "priors", priors_table(PRIOR_JOBS))
    return 0


if __name__ == "__main__":
    sys.exit(main())

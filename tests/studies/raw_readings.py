"""Do raw readings come back as what was there to be read? Invented books, reduced and held against the truth.

    python -m tests.studies.raw_readings    # rewrites the table of docs/reductions.md

Every book is written as a job folder, read and reduced. The reduced observations, less the true values, are divided by
their stated sds; the squares add up to χ² with one degree of freedom each, less one for the orientation of each setup.
"""

from __future__ import annotations

import sys
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from adjust import Job, read_job
from adjust.angles import wrapped
from adjust.arrays import FloatArray, IntArray
from adjust.observations import Directions, Observations, SlopeDistances
from adjust.quality import chi_square_quantile
from adjust.simulate import Equipment, assemble, total_station_net, true_geometry
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_pointings import Habits

BOOKS = 500
SEED = 20261104
PAGE = Path(__file__).parents[2] / "docs" / "reductions.md"
MARKERS = ("<!-- raw readings: begin -->\n", "<!-- raw readings: end -->\n")
CONFIDENCE = 0.998
"""Of the bounds within which χ² over all books should lie, two-sided: ±3 standard errors."""


@dataclass(frozen=True)
class Circumstances:
    """How the books of one kind are kept. `bounded` says whether χ² is exact for them, so that its bounds hold."""

    title: str
    habits: Habits
    states_errors: bool
    bounded: bool = True


CIRCUMSTANCES = (
    Circumstances("two faces, complete rounds", Habits(missing=0.0), states_errors=True),
    Circumstances(
        "two faces, a third of the sights missing from later rounds", Habits(missing=1 / 3), states_errors=True
    ),
    Circumstances("the same, the horizon closed", Habits(missing=1 / 3, closes_horizon=True), states_errors=False),
    Circumstances(
        "a third of the sights on one face, the instrument's errors known",
        Habits(missing=0.2, single=1 / 3, eccentricity=0.0),
        states_errors=True,
    ),
    Circumstances(
        "the same, the errors taken from the setup's pairs",
        Habits(missing=0.2, single=1 / 3, eccentricity=0.0),
        states_errors=False,
        bounded=False,
    ),
)


@dataclass(frozen=True)
class Comparison:
    """One kind of one book: reduced minus true over stated sd (rows,), for directions off the weighted mean of their
    setup over the sd that has; the sum of squares and its degrees of freedom."""

    standardised: FloatArray
    statistic: float
    freedom: int


def compared(circumstances: Circumstances, number: int) -> dict[str, Comparison]:
    """Every kind of one book."""
    generator = np.random.default_rng([SEED, number])
    plan = invented_plan(generator)
    raw = read_by_a_party(plan, generator, circumstances.habits, states_errors=circumstances.states_errors)
    with tempfile.TemporaryDirectory() as folder:
        raw.folder.write(Path(folder))
        job = read_job(folder)
    geometry = true_geometry(plan)
    found = {}
    for rows in job.observations:
        error = rows.observed[:, 0] - rows.predict(geometry)[:, 0]
        sd = rows.precision.constant
        if isinstance(rows, SlopeDistances):
            sd = np.hypot(sd, rows.precision.proportional * rows.observed[:, 0])
        if isinstance(rows, Directions):
            found[rows.kind] = _of_directions(rows.setup_index, wrapped(error), sd)
        else:
            found[rows.kind] = Comparison(error / sd, float(np.sum((error / sd) ** 2)), len(error))
    return found


def invented_plan(generator: np.random.Generator) -> Job:
    """Twelve marks, a round at each, and a level line along every third sight."""
    plan = total_station_net(generator)
    lines = next(rows for rows in plan.observations if isinstance(rows, SlopeDistances)).marks[::3]
    lengths = generator.uniform(300.0, 1200.0, len(lines))
    kinds: list[Observations] = [*plan.observations, Equipment().height_differences(lines, lengths)]
    return assemble(plan.title, plan.frame, plan.marks, kinds)


def _of_directions(setup: IntArray, error: FloatArray, sd: FloatArray) -> Comparison:
    """Directions know nothing of their common orientation: they are compared about their weighted mean."""
    count = int(setup.max()) + 1
    start = error[np.unique(setup, return_index=True)[1]]
    beyond, weight = wrapped(error - start[setup]), 1.0 / sd**2
    total = np.bincount(setup, weight, count)
    off = beyond - (np.bincount(setup, weight * beyond, count) / total)[setup]
    own = np.sqrt(sd**2 - 1.0 / total[setup])
    return Comparison(off / own, float(np.sum(weight * off**2)), len(error) - count)


@dataclass(frozen=True)
class Verdict:
    """One kind over many books."""

    circumstances: Circumstances
    kind: str
    standardised: FloatArray
    statistic: float
    freedom: int

    @property
    def bounds(self) -> tuple[float, float]:
        """Of χ²/degrees of freedom."""
        tails = ((1 - CONFIDENCE) / 2, (1 + CONFIDENCE) / 2)
        lower, upper = (chi_square_quantile(tail, self.freedom) / self.freedom for tail in tails)
        return lower, upper

    @property
    def ratio(self) -> float:
        """χ² over its degrees of freedom: 1 is what was promised."""
        return self.statistic / self.freedom

    @property
    def holds(self) -> bool:
        """Whether the ratio lies within its bounds."""
        lower, upper = self.bounds
        return lower <= self.ratio <= upper


def verdicts(books: int) -> Iterator[Verdict]:
    """Every kind under all circumstances, so many books of each."""
    for place, circumstances in enumerate(CIRCUMSTANCES):
        found = [compared(circumstances, 10_000 * place + number) for number in range(books)]
        for kind in found[0]:
            parts = [book[kind] for book in found]
            yield Verdict(
                circumstances,
                kind,
                np.concatenate([part.standardised for part in parts]),
                sum(part.statistic for part in parts),
                sum(part.freedom for part in parts),
            )


def report(found: list[Verdict]) -> str:
    """The table of the page."""
    lines = [
        "| books | kind | reduced | χ²/f | within | beyond 1.96 sd |",
        "| --- | --- | ---: | ---: | --- | ---: |",
    ]
    for verdict in found:
        lower, upper = verdict.bounds
        beyond = np.mean(np.abs(verdict.standardised) > 1.96)
        lines.append(
            f"| {verdict.circumstances.title} | {verdict.kind.replace('_', ' ')} | {len(verdict.standardised):,} "
            f"| {verdict.ratio:.4f} | {lower:.4f} … {upper:.4f}{'' if verdict.holds else ', missed'} | {beyond:.2%} |"
        )
    return "\n".join(lines) + "\n"


def write_into_page(table: str, page: Path = PAGE) -> None:
    """Put the table between its markers."""
    before, rest = page.read_text(encoding="utf-8").split(MARKERS[0])
    _, after = rest.split(MARKERS[1])
    page.write_text(before + MARKERS[0] + table + MARKERS[1] + after, encoding="utf-8")


def main() -> int:
    """Run the study and put its table into the page. 1 when a bound that should hold is missed."""
    found = list(verdicts(BOOKS))
    table = report(found)
    print(table)
    write_into_page(table)
    return int(any(verdict.circumstances.bounded and not verdict.holds for verdict in found))


if __name__ == "__main__":
    sys.exit(main())

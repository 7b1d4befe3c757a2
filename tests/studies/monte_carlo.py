"""Do the global test and the confidence regions keep their promise? Invented jobs, adjusted and held against the truth.

    python -m tests.studies.monte_carlo    # rewrites the table of docs/validation-networks.md

A promise of 95 % is kept when the share found lies within three standard errors of it. Marks of one job share their
errors, so the standard error comes from the scatter of whole jobs: the root of the sum over jobs of
(found − promised)², or that of independent trials where this is larger, as for events too rare to show their scatter.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from adjust import Adjustment, Job, adjust
from adjust.adjusting import grid_axes
from adjust.arrays import BoolArray, FloatArray
from adjust.observations import ControlCoordinates, HeightDifferences, Precision, Vectors
from adjust.observations.sighted import SightedObservations
from adjust.simulate import NETWORKS, Truth, observe

JOBS = 2800
"""Two hundred of every shape on each basis of standard deviations."""
SEED = 20260118
START_SD = 0.3
"""Metres: every other job gives start coordinates so far off; the rest leave the start to the program."""
PAGE = Path(__file__).parents[2] / "docs" / "validation-networks.md"
MARKERS = ("<!-- monte carlo: begin -->\n", "<!-- monte carlo: end -->\n")
"""The table of the page stands between these."""


@dataclass(frozen=True)
class Outcome:
    """What one job says: for each promise how often it was kept (hits) and how often it was made (trials)."""

    network: str
    basis: str
    hits: dict[str, int]
    trials: dict[str, int]


@dataclass(frozen=True)
class Share:
    """How often a promise was kept over many jobs, and how often it should have been."""

    trials: int
    found: float
    promised: float
    standard_error: float

    @property
    def off(self) -> float:
        """Found minus promised in standard errors."""
        return (self.found - self.promised) / self.standard_error


PROMISES = {
    "global test passes": 0.95,
    "truth in the 95 % ellipse": 0.95,
    "truth in the 95 % circle": 0.95,
    "height within its 95 % interval": 0.95,
    "w within ±3.29": 0.999,
}
"""Promised shares: the job's confidence, the 95 % figures, and one minus the significance of a single test."""


def simulated(jobs: int, seed: int = SEED, claim: float = 1.0) -> Iterator[Outcome]:
    """Outcomes of so many jobs, all shapes of network and both bases of standard deviations in turn.

    `claim` is what the jobs say of their sds, as a multiple of the true ones.
    """
    shapes = list(NETWORKS)
    for number in range(jobs):
        name, basis = shapes[number % len(shapes)], ("prior", "posterior")[number // len(shapes) % 2]
        generator = np.random.default_rng([seed, number])
        plan = NETWORKS[name](generator)
        plan = replace(plan, statistics=replace(plan.statistics, sd_basis=basis))
        job, truth = observe(plan, generator, start_sd=START_SD if number % 4 < 2 else None)
        yield outcome(name, basis, adjust(with_sds_multiplied(job, claim)), truth)


def with_sds_multiplied(job: Job, factor: float) -> Job:
    """The job with every claimed sd so many times as large."""
    changed = []
    for rows in job.observations:
        if isinstance(rows, SightedObservations | HeightDifferences):
            precision = rows.precision
            columns = (getattr(precision, name) * factor for name in Precision.__dataclass_fields__)
            changed.append(replace(rows, precision=Precision(*columns)))
        elif isinstance(rows, Vectors):
            changed.append(replace(rows, covariances=rows.covariances * factor**2))
        elif isinstance(rows, ControlCoordinates):
            changed.append(replace(rows, sd=rows.sd * factor))
    return replace(job, observations=tuple(changed))


def outcome(name: str, basis: str, result: Adjustment, truth: Truth) -> Outcome:
    """Compare one adjustment with the truth."""
    error = errors_along_grid(result, truth)
    free_plan, free_height = result.unknowns.sought[:, 0], result.unknowns.sought[:, 2]
    kept = {
        "global test passes": np.array([result.solution.global_test.passed]),
        "truth in the 95 % ellipse": in_ellipse(result, error)[free_plan],
        "truth in the 95 % circle": (np.hypot(error[:, 0], error[:, 1]) <= result.horizontal_95)[free_plan],
        "height within its 95 % interval": (np.abs(error[:, 2]) <= result.height_95)[free_height],
        "w within ±3.29": ~failed_tests(result),
    }
    return Outcome(
        name,
        basis,
        {promise: int(np.count_nonzero(values)) for promise, values in kept.items()},
        {promise: len(values) for promise, values in kept.items()},
    )


def errors_along_grid(result: Adjustment, truth: Truth) -> FloatArray:
    """Adjusted minus true (n, 3) easting, northing, height, metres; NaN where there is none."""
    error = result.job.frame.displacement(truth.coordinates, result.coordinates)
    turned: FloatArray = np.einsum("nij,nj->ni", grid_axes(result.geometry), np.nan_to_num(error))
    return np.where(np.isnan(error), np.nan, turned)


def in_ellipse(result: Adjustment, error: FloatArray) -> BoolArray:
    """Whether the true place (n,) lies in the confidence ellipse as it is reported: by its axes and its azimuth."""
    ellipse, factor = result.ellipses, result.ellipse_factor
    sine, cosine = np.sin(ellipse.azimuth), np.cos(ellipse.azimuth)
    along = error[:, 0] * sine + error[:, 1] * cosine
    across = error[:, 0] * cosine - error[:, 1] * sine
    with np.errstate(divide="ignore", invalid="ignore"):
        inside: BoolArray = np.hypot(along / ellipse.semi_major, across / ellipse.semi_minor) <= factor
    return inside


def failed_tests(result: Adjustment) -> BoolArray:
    """Which single tests of w fail, of those that can be made at all."""
    w = np.concatenate([rows.w.ravel() for rows in result.residuals])
    return np.abs(w[~np.isnan(w)]) > W_LIMIT


W_LIMIT = 3.2905267314919255
"""Φ⁻¹(1 − 0.001/2), the critical value of w for the usual significance."""


def shares(outcomes: Iterable[Outcome]) -> dict[str, Share]:
    """Every promise that was made at all, over many jobs."""
    every = list(outcomes)
    counts = {promise: [(o.hits[promise], o.trials[promise]) for o in every] for promise in PROMISES}
    return {
        promise: share(of_jobs, PROMISES[promise]) for promise, of_jobs in counts.items() if sum(n for _, n in of_jobs)
    }


def share(counts: list[tuple[int, int]], promised: float) -> Share:
    """One promise: hits and trials of each job."""
    hits, trials = np.array(counts, dtype=float).T
    of_jobs = np.sum((hits - promised * trials) ** 2)
    of_independent_trials = promised * (1 - promised) * trials.sum()
    scatter = np.sqrt(max(of_jobs, of_independent_trials))
    return Share(int(trials.sum()), float(hits.sum() / trials.sum()), promised, float(scatter / trials.sum()))


def report(outcomes: list[Outcome]) -> str:
    """The table of the validation page."""
    lines = [
        "| jobs | promise | made | promised | kept | off by standard errors |",
        "| --- | --- | ---: | ---: | ---: | ---: |",
    ]
    for title, chosen in selections(outcomes):
        lines += [row(title, promise, found) for promise, found in shares(chosen).items()]
    return "\n".join(lines) + "\n"


def row(title: str, promise: str, found: Share) -> str:
    """One line of the table."""
    cells = (title, promise, f"{found.trials:,}", f"{found.promised:.1%}", f"{found.found:.2%}", f"{found.off:+.1f}")
    return f"| {' | '.join(cells)} |"


def selections(outcomes: list[Outcome]) -> Iterator[tuple[str, list[Outcome]]]:
    """All jobs, then by basis of the standard deviations, then by shape of network."""
    yield f"all {len(outcomes):,}", outcomes
    grouping: list[tuple[Iterable[str], Callable[[Outcome], str]]] = [
        (("prior", "posterior"), lambda o: o.basis),
        (NETWORKS, lambda o: o.network),
    ]
    for names, key in grouping:
        for name in names:
            yield name, [o for o in outcomes if key(o) == name]


def write_into_page(table: str, page: Path = PAGE) -> None:
    """Put the table between its markers."""
    text = page.read_text(encoding="utf-8")
    before, rest = text.split(MARKERS[0])
    _, after = rest.split(MARKERS[1])
    page.write_text(before + MARKERS[0] + table + MARKERS[1] + after, encoding="utf-8")


def main() -> int:
    """Run the study, show the table, put it into the page. 1 when a promise over all jobs is off by more than three."""
    outcomes = list(simulated(JOBS))
    table = report(outcomes)
    print(table)
    write_into_page(table)
    return int(any(abs(found.off) > 3 for found in shares(outcomes).values()))


if __name__ == "__main__":
    sys.exit(main())

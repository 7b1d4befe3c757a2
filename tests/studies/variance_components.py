"""Do planted variance factors come back, and do blunders leave them alone? Invented jobs held against the truth.

    python -m tests.studies.variance_components    # rewrites the tables of docs/validation-weights.md

Every job is observed with the sds of its plan and claims others for some kinds, so that the factors are known. The
error of an estimate is that of its logarithm; over its sd it has unit scatter where the sd is right.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from adjust import Adjustment, Job, adjust
from adjust.errors import NetworkError
from adjust.simulate import gnss_net, levelling_net, observe, total_station_net, triangulation_grid
from adjust.variance_components import VarianceComponent, variance_components
from tests.planted_variances import claimed, struck

JOBS = 200
"""Of each network and each way of claiming sds."""
SPOILT_JOBS = 100
"""Of each network with blunders of each sort."""
SEED = 20_261_201
PAGE = Path(__file__).parents[2] / "docs" / "validation-weights.md"
CLEAN = ("<!-- planted: begin -->\n", "<!-- planted: end -->\n")
SPOILT = ("<!-- blunders: begin -->\n", "<!-- blunders: end -->\n")
"""The tables of the page stand between these."""

NETWORKS: dict[str, Callable[[np.random.Generator], Job]] = {
    "levels, 16 marks": levelling_net,
    "levels, 49 marks": lambda generator: levelling_net(generator, 7, 7),
    "triangulation, 20 marks": triangulation_grid,
    "total station, 20 marks": lambda generator: total_station_net(generator, 4, 5),
    "GNSS, 9 marks": gnss_net,
}
STATED: Mapping[str, float] = {}
PLANTED: Mapping[str, float] = {
    "direction": 1.5,
    "zenith": 1.8,
    "slope_distance": 0.6,
    "horizontal_distance": 2.5,
    "vector": 2.0,
    "height_difference": 3.0,
}
CLAIMS = {"as stated": STATED, "planted": PLANTED}
BLUNDERS: Sequence[tuple[int, float]] = ((1, 6.0), (1, 20.0), (1, 100.0), (2, 10.0), (2, 30.0), (4, 30.0))
"""How many, and their size in sds as planned."""
TWICE = float(np.log(2.0))


@dataclass(frozen=True)
class Judged:
    """One job: errors of ln factor over their sds, the largest error of one, and whether all limits hold the truth."""

    normalised: tuple[float, ...]
    largest: float
    held: bool
    left_out: int


def judged(found: Iterable[VarianceComponent], truth: Mapping[str, float]) -> Judged:
    """What one job's components come to."""
    known = [each for each in found if each.estimated]
    errors = [float(np.log(each.factor / truth.get(each.kind, 1.0))) for each in known]
    scaled = [error * each.factor / each.sd for error, each in zip(errors, known, strict=True)]
    held = all(each.lower <= truth.get(each.kind, 1.0) <= each.upper for each in known)
    left_out = sum(len(each.left_out) for each in known)
    return Judged(tuple(scaled), max(map(abs, errors), default=0.0), held, left_out)


def simulated(network: str, claims: str, blunders: tuple[int, float], jobs: int) -> Iterator[Adjustment]:
    """Adjusted jobs; those that blunders keep from settling are passed over."""
    for number in range(jobs):
        generator = np.random.default_rng([SEED, number])
        plan = NETWORKS[network](generator)
        job, _ = observe(plan, generator)
        count, size = blunders
        for _ in range(count):
            rows = job.observations[generator.integers(len(job.observations))]
            signed = size if generator.random() < 0.5 else -size
            job = struck(job, plan, rows.kind, {int(generator.integers(len(rows))): signed})
        try:
            yield adjust(claimed(job, CLAIMS[claims]))
        except NetworkError:
            continue


def clean_row(network: str, claims: str, jobs: int = JOBS) -> str:
    """One row of the first table."""
    outcomes = [
        judged(variance_components(each), CLAIMS[claims]) for each in simulated(network, claims, (0, 0.0), jobs)
    ]
    errors = np.concatenate([outcome.normalised for outcome in outcomes])
    held = np.mean([outcome.held for outcome in outcomes])
    out = np.mean([outcome.left_out for outcome in outcomes])
    return (
        f"| {network} | {claims} | {len(outcomes)} | {np.mean(errors):+.2f} | {np.sqrt(np.mean(errors**2)):.2f} "
        f"| {100 * held:.1f} % | {out:.2f} |"
    )


def spoilt_row(network: str, blunders: tuple[int, float], jobs: int = SPOILT_JOBS) -> str:
    """One row of the second table."""
    robust, plain = [], []
    for each in simulated(network, "planted", blunders, jobs):
        robust.append(judged(variance_components(each), PLANTED))
        plain.append(judged(variance_components(each, robust=False), PLANTED))
    cells = []
    for outcomes in (plain, robust):
        off = np.mean([outcome.largest > TWICE for outcome in outcomes])
        cells += [f"{100 * off:.1f} %", f"{100 * np.mean([outcome.held for outcome in outcomes]):.1f} %"]
    return f"| {network} | {blunders[0]} of {blunders[1]:g} sds | {len(robust)} | {' | '.join(cells)} |"


def clean_table(jobs: int = JOBS) -> str:
    """Errors and limits without blunders."""
    head = "| network | sds claimed | jobs | mean error | rms | limits hold | left out in a job |\n"
    rows = [clean_row(network, claims, jobs) for network in NETWORKS for claims in CLAIMS]
    return head + "| --- | --- | --- | --- | --- | --- | --- |\n" + "\n".join(rows) + "\n"


def spoilt_table(jobs: int = SPOILT_JOBS) -> str:
    """The same with blunders, against the estimate without robustness."""
    head = (
        "| network | blunders | jobs | plain: some factor off by 2 | plain: limits hold "
        "| robust: some factor off by 2 | robust: limits hold |\n"
    )
    rows = [spoilt_row(network, blunders, jobs) for network in NETWORKS for blunders in BLUNDERS]
    return head + "| --- | --- | --- | --- | --- | --- | --- |\n" + "\n".join(rows) + "\n"


def write_into_page(table: str, markers: tuple[str, str], page: Path = PAGE) -> None:
    """Put a table between its markers."""
    text = page.read_text(encoding="utf-8")
    before, rest = text.split(markers[0])
    _, after = rest.split(markers[1])
    page.write_text(before + markers[0] + table + markers[1] + after, encoding="utf-8")


def main() -> int:
    """Run the study, show the tables, put them into the page."""
    for table, markers in ((clean_table, CLEAN), (spoilt_table, SPOILT)):
        text = table()
        print(text, flush=True)
        write_into_page(text, markers)
    return 0


if __name__ == "__main__":
    sys.exit(main())

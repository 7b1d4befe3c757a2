"""Are starts right, and which solvable networks get none? Thousands of random sparse networks, observed exactly.

    python -m tests.studies.sparse_starts 6000    # rewrites the table of docs/methods-network.md

Three to seven marks, one to three of them control without further coordinates, and so few directions, angles, azimuths
and distances that most of the networks cannot be solved. Whether one can is told by the rank of its derivatives at the
truth; whether it has another solution, by least squares from a hundred scattered beginnings (a sample of them only).
"""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Sequence

import numpy as np
from scipy.optimize import least_squares

from adjust.arrays import FloatArray
from adjust.errors import NetworkError
from adjust.job import Job
from adjust.network import check_solvable, find_start
from adjust.unknowns import find_unknowns
from tests.building import PLANE, build_job, exact, geometry_at, laid_out, truth_of
from tests.studies.pages import rewrite

SIDE = 1000.0
"""Metres: the square in which the marks lie."""
AT_THE_TRUTH = 1.0
"""Metres: weak figures magnify rounding and the tolerance of the search."""
NOISELESS = 1e-5
"""Metres, with angles at 300 m: a fit of exact observations."""
SAMPLE = 60
"""Networks of full rank without a start that are looked at for further solutions."""

RATES = (
    {"rounds": 0.8, "azimuths": 0.3, "distances": 0.5},
    {"rounds": 0.8, "distances": 0.2},
    {"angles": 0.8, "azimuths": 0.2, "distances": 0.8},
    {"distances": 2.0},
    {"rounds": 0.5, "angles": 0.3, "azimuths": 0.5, "distances": 0.7},
    {"rounds": 0.9},
)
"""Expected rounds, angles and distances for each mark, and azimuths in the whole network."""


def sparse_network(seed: int) -> tuple[Job, FloatArray]:
    """A random network and its true coordinates (n, 3)."""
    generator = np.random.default_rng(seed)
    rates = RATES[seed % len(RATES)]
    names = [f"P{number}" for number in range(int(generator.integers(3, 8)))]
    local = {name: tuple(generator.uniform(0.0, SIDE, 2).tolist()) for name in names}

    def some(kind: str, marks: int, times: int = len(names)) -> list[tuple[str, ...]]:
        rows = int(generator.poisson(rates.get(kind, 0.0) * times))
        return [tuple(generator.permutation(names)[:marks].tolist()) for _ in range(rows)]

    rounds = [(f"at {row[0]}", row[0], target) for row in some("rounds", 5) for target in row[1:]]
    truth = laid_out(local, PLANE)
    control = names[: int(generator.integers(1, 4))]
    job = build_job(
        {name: truth[name] if name in control else None for name in names},
        fixed_plan=control,
        directions=rounds,
        angles=some("angles", 3),
        azimuths=some("azimuths", 2, 1),
        horizontals=some("distances", 2),
    )
    coordinates = truth_of(job, truth)
    return exact(job, coordinates), coordinates


def has_full_rank(job: Job, truth: FloatArray) -> bool:
    """Whether observations fix every unknown, by the derivatives at the truth."""
    unknowns, geometry = find_unknowns(job), geometry_at(job, truth)
    matrix = [np.empty((0, unknowns.count))]
    for rows in job.observations:
        scale = 1.0 if rows.unit == "m" else SIDE
        block = np.zeros((len(rows), unknowns.count + 1))
        derivatives = rows.differentiate(geometry)[:, 0] * scale
        number = np.arange(len(rows))[:, None, None]
        np.add.at(block, (number, unknowns.columns[rows.marks]), derivatives)
        if rows.setup is not None:
            block[np.arange(len(rows)), unknowns.coordinates + rows.setup] = -scale
        matrix.append(block[:, :-1])
    return bool(np.linalg.matrix_rank(np.vstack(matrix), tol=1e-6) == unknowns.count)


def solutions(job: Job, truth: FloatArray, beginnings: int = 100) -> int:
    """How many different solutions scattered beginnings find; 2 stands for more than one."""
    unknowns = find_unknowns(job)
    generator = np.random.default_rng(0)
    low, high = truth[:, :2].min() - SIDE / 3, truth[:, :2].max() + SIDE / 3

    def misfits(values: FloatArray) -> FloatArray:
        coordinates = truth.copy()
        coordinates[unknowns.sought] = values[: unknowns.coordinates]
        return _misfits(job, coordinates, values[unknowns.coordinates :])

    found: list[FloatArray] = []
    for _ in range(beginnings):
        scattered = generator.uniform(low, high, unknowns.coordinates)
        start = np.concatenate([scattered, generator.uniform(-np.pi, np.pi, unknowns.setups)])
        end = least_squares(misfits, start, max_nfev=100)
        place = end.x[: unknowns.coordinates]
        if np.abs(end.fun).max() < NOISELESS and all(np.abs(place - other).max() > AT_THE_TRUTH for other in found):
            found.append(place)
        if len(found) > 1:
            break
    return len(found)


def _misfits(job: Job, coordinates: FloatArray, orientations: FloatArray) -> FloatArray:
    """Predicted minus observed, metres, angles at 300 m."""
    geometry = geometry_at(job, coordinates)
    misfits = []
    for rows in job.observations:
        off = (rows.predict(geometry) - rows.observed)[:, 0]
        if rows.setup is not None:
            off = off - orientations[rows.setup]
        misfits.append(off if rows.unit == "m" else 300.0 * np.angle(np.exp(1j * off)))
    return np.concatenate(misfits)


def outcome(job: Job, truth: FloatArray) -> str:
    """What becomes of a network: `at the truth`, `elsewhere`, `refused` or `no start`."""
    unknowns = find_unknowns(job)
    try:
        check_solvable(job, unknowns)
    except NetworkError:
        return "refused"
    try:
        start = find_start(job, unknowns)
    except NetworkError:
        return "no start"
    off = np.where(unknowns.sought, start.geometry.coordinates - truth, 0.0)
    return "at the truth" if np.abs(off).max() < AT_THE_TRUTH else "elsewhere"


def tally(count: int) -> tuple[Counter[tuple[bool, str]], Counter[int]]:
    """Outcomes by rank over `count` networks; solutions of those of full rank without a start, a sample of them."""
    outcomes: Counter[tuple[bool, str]] = Counter()
    ambiguous: Counter[int] = Counter()
    for seed in range(count):
        job, truth = sparse_network(seed)
        if find_unknowns(job).coordinates == 0:
            continue
        full = has_full_rank(job, truth)
        result = outcome(job, truth)
        outcomes[full, result] += 1
        if full and result == "no start" and ambiguous.total() < SAMPLE:
            ambiguous[solutions(job, truth)] += 1
    return outcomes, ambiguous


def report(count: int) -> str:
    """The table of the methods page."""
    outcomes, ambiguous = tally(count)
    lines = [
        "| network | start at the truth | start elsewhere | no start | refused |",
        "| --- | --- | --- | --- | --- |",
    ]
    for full, name in ((True, "full rank"), (False, "defective")):
        cells = (outcomes[full, result] for result in ("at the truth", "elsewhere", "no start", "refused"))
        lines.append(f"| {name} | {' | '.join(str(cell) for cell in cells)} |")
    lines += ["", f"Of {ambiguous.total()} networks of full rank without a start, {ambiguous[2]} have two solutions."]
    return "\n".join(lines) + "\n"


def main(arguments: Sequence[str]) -> None:
    """Rewrite the page."""
    rewrite("methods-network.md", "sparse starts", report(int(arguments[0]) if arguments else 6000))


if __name__ == "__main__":
    main(sys.argv[1:])

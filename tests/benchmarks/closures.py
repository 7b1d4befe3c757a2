"""How long a check takes as networks grow.

    python -m tests.benchmarks.closures

Grids of marks with rounds, zenith angles, slope distances and levels along every line, three lines to a mark; the whole
check, with the search for start coordinates that it begins with.
"""

from __future__ import annotations

import sys
import time

import numpy as np

from adjust.job import Job
from adjust.network.closures import check_job
from adjust.observations import SlopeDistances
from adjust.simulate import Equipment, assemble, observe, total_station_net

SIDES = (32, 100)
"""Marks along a side: about 1,000 and 10,000 marks, 3,000 and 30,000 lines."""


def grid(side: int) -> Job:
    """A grid observed in three dimensions, with levels along every line; two opposite corners held."""
    generator = np.random.default_rng(side)
    plan = total_station_net(generator, side, side)
    lines = next(rows for rows in plan.observations if isinstance(rows, SlopeDistances)).marks
    levels = Equipment().height_differences(lines, np.full(len(lines), 400.0))
    return observe(assemble(plan.title, plan.frame, plan.marks, [*plan.observations, levels]), generator)[0]


def main() -> None:
    """Print one line for each size."""
    print("marks   lines  closures  seconds  CPU seconds")
    for side in map(int, sys.argv[1:]) if len(sys.argv) > 1 else SIDES:
        job = grid(side)
        wall, processor = time.perf_counter(), time.process_time()
        check = check_job(job)
        wall, processor = time.perf_counter() - wall, time.process_time() - processor
        lines = next(len(rows) for rows in job.observations if rows.kind == "height_difference")
        closures = sum(len(judged.closures) for judged in check.closures)
        print(f"{len(job.marks):6d} {lines:6d} {closures:9d} {wall:8.2f} {processor:12.2f}")


if __name__ == "__main__":
    main()

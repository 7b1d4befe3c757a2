"""Time the linear solver against its peers, all in one run, and print a table of ratios.

    python -m tests.benchmarks                    # 1,000, 10,000, 40,000 and 100,000 marks; about ten minutes
    python -m tests.benchmarks 1000 10000         # these sizes only
    python -m tests.benchmarks --write            # and put the table into docs/performance.md

Every contender runs in a process of its own, so that memory is its own and no library warms up another; of several
repetitions the quickest counts. Marks form a square grid, so their number is the nearest square.
"""

from __future__ import annotations

import argparse
import json
import os
import platform
import resource
import subprocess
import sys
from itertools import pairwise

import numpy as np

from tests.benchmarks.contenders import CONTENDERS, LARGEST
from tests.benchmarks.grid import grid_problem

SIZES = (1_000, 10_000, 40_000, 100_000)
PATIENCE = 1800
"""Seconds after which a contender is given up."""


def main() -> None:
    """Run what the command line asks for."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("marks", nargs="*", type=int, default=list(SIZES))
    parser.add_argument("--write", action="store_true", help="put the table into docs/performance.md")
    parser.add_argument("--only", choices=list(CONTENDERS), help="one contender, in this process; prints JSON")
    options = parser.parse_args()
    if options.only:
        print(json.dumps(measure(options.only, options.marks[0])))
        return
    table = report(options.marks or list(SIZES))
    print(table)
    if options.write:
        from tests.studies.pages import rewrite

        rewrite("performance.md", "benchmark", table)


def measure(name: str, marks: int) -> dict[str, object]:
    """Seconds of each part in the quickest repetition, and the peak memory of this process in bytes."""
    problem = grid_problem(marks)
    repetitions = 20 if marks <= 10_000 else 3
    runs = [CONTENDERS[name](problem) for _ in range(1 if name in ("GTSAM", "LSMR") else repetitions)]
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * (1 if sys.platform == "darwin" else 1024)
    return {"seconds": min(runs, key=lambda run: sum(run.values())), "peak": peak, "rows": problem.matrix.shape[0]}


def run(name: str, marks: int) -> dict[str, object] | str:
    """Measure in a process of its own; a text says why there is nothing."""
    command = [sys.executable, "-m", "tests.benchmarks", "--only", name, str(marks)]
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=PATIENCE, check=False)
    except subprocess.TimeoutExpired:
        return f"not done in {PATIENCE} s"
    if done.returncode:
        last = done.stderr.strip().splitlines()[-1:] or ["stopped without a word"]
        return last[0]
    return json.loads(done.stdout.strip().splitlines()[-1])


def report(sizes: list[int]) -> str:
    """The whole table."""
    lines = [
        f"{os.cpu_count()} cores ({platform.machine()}); Python {platform.python_version()}; NumPy {np.__version__}",
        "",
        "| marks | rows | contender | seconds | of which | Hubtack takes | peak memory |",
        "| ---: | ---: | --- | ---: | --- | ---: | ---: |",
    ]
    totals: dict[int, float] = {}
    for marks in sizes:
        ours: float | None = None
        for name in CONTENDERS:
            if marks > LARGEST[name]:
                continue
            found = run(name, marks)
            if isinstance(found, str):
                lines.append(f"| {marks:,} | | {name} | — | {found} | | |")
                continue
            total = sum(found["seconds"].values())
            if name == "Hubtack":
                ours = totals[marks] = total
            lines.append(row(marks, name, found, total, ours))
    return "\n".join([*lines, "", *growth(totals)]) + "\n"


def row(marks: int, name: str, found: dict, total: float, ours: float | None) -> str:
    """One line of the table; the ratio is Hubtack's time over the contender's."""
    parts = ", ".join(f"{part} {seconds:.3f}" for part, seconds in found["seconds"].items())
    ratio = "" if ours is None or name == "Hubtack" else f"{ours / total:.3g} ×"
    return (
        f"| {marks:,} | {found['rows']:,} | {name} | {total:.3f} | {parts} | {ratio} | {found['peak'] / 1e9:.2f} GB |"
    )


def growth(totals: dict[int, float]) -> list[str]:
    """Exponents of growth of Hubtack's time between successive sizes, and from 10,000 marks to the largest."""
    sizes = sorted(totals)
    pairs = list(pairwise(sizes))
    if 10_000 in totals and sizes[-1] > 10_000:
        pairs.append((10_000, sizes[-1]))
    return [
        f"Hubtack's time grows as n^{np.log(totals[b] / totals[a]) / np.log(b / a):.2f} from {a:,} to {b:,} marks."
        for a, b in dict.fromkeys(pairs)
    ]


if __name__ == "__main__":
    main()

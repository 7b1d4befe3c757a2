"""Level loops, lines between benchmarks, and runs there and back, by hand."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from numpy.testing import assert_allclose

from adjust.job import Job
from adjust.network.closures import Check, check_job
from adjust.network.closures.closures import Judged
from adjust.observations import HeightDifferences
from adjust.tolerances import Tolerances
from tests.building import LENGTH_SD, build_job
from tests.published import published


def with_lengths(job: Job, lengths: list[float]) -> Job:
    """Metres, for each line."""
    rows = tuple(
        replace(kind, length=np.array(lengths)) if isinstance(kind, HeightDifferences) else kind
        for kind in job.observations
    )
    return replace(job, observations=rows)


def judged(check: Check, name: str) -> Judged:
    (found,) = (judged for judged in check.closures if judged.closures.check == name)
    return found


def marks_of(check: Check, name: str, closure: int = 0) -> str:
    found = judged(check, name)
    return "".join(check.job.marks.names[mark] for mark in found.closures.marks[closure].tolist())


def test_a_loop_by_hand() -> None:
    """12 mm √K over 0.8 + 0.6 + 1.1 km allows 18.97 mm; 1.2345 + 0.4312 − 1.6860 misses by −20.3 mm."""
    job = build_job(
        "ABC",
        levels=[("A", "B", 1.2345), ("B", "C", 0.4312), ("C", "A", -1.6860)],
        tolerances=Tolerances(standards=("FGCC 1984 third order class I",)),
    )
    check = check_job(with_lengths(job, [800.0, 600.0, 1100.0]))
    loop = judged(check, "level_loop")
    assert marks_of(check, "level_loop") == "ABCA"
    assert_allclose(loop.closures.misclosure, [[-0.0203]], rtol=0, atol=1e-12)  # m
    assert_allclose(loop.allowed, [[0.012 * np.sqrt(2.5)]], rtol=0, atol=1e-12)  # m
    assert_allclose(loop.closures.length, [2500.0], rtol=0, atol=1e-9)  # m
    assert [check.observed.source(row) for row in loop.closures.rows[0]] == [
        "levels.csv:2",
        "levels.csv:3",
        "levels.csv:4",
    ]
    assert loop.exceeds.tolist() == [True]
    assert not check.passed


def test_a_line_between_benchmarks() -> None:
    """From A at 100 m over X to B at 103 m: 1.002 + 2.001 arrives 3 mm high."""
    job = build_job(
        {"A": (None, None, 100.0), "X": None, "B": (None, None, 103.0)},
        fixed_height="AB",
        levels=[("A", "X", 1.002), ("X", "B", 2.001)],
    )
    check = check_job(job)
    line = judged(check, "level_line")
    assert marks_of(check, "level_line") in ("AXB", "BXA")
    sign = 1.0 if marks_of(check, "level_line") == "AXB" else -1.0
    assert_allclose(sign * line.closures.misclosure, [[0.003]], rtol=0, atol=1e-12)  # m
    assert_allclose(line.closures.sd, [[LENGTH_SD * np.sqrt(2.0)]], rtol=0, atol=1e-12)  # m


def test_weighted_benchmarks_bring_their_own_sd() -> None:
    job = build_job({"A": (0.0, 0.0, 100.0), "B": (0.0, 1.0, 103.0)}, weighted="AB", levels=[("A", "B", 3.0)])
    line = judged(check_job(job), "level_line")
    assert_allclose(line.closures.sd, [[np.sqrt(2 * 0.01**2 + LENGTH_SD**2)]], rtol=0, atol=1e-12)  # m


def test_runs_there_and_back() -> None:
    """Forward 1.000, backward −1.004: they disagree by −4 mm; the loop has their mean 1.002."""
    job = build_job(
        "ABC",
        levels=[("A", "B", 1.000), ("B", "A", -1.004), ("B", "C", 1.0), ("C", "A", -2.0)],
        tolerances=Tolerances(standards=("FGCC 1984 first order class I",)),
    )
    check = check_job(with_lengths(job, [1000.0] * 4))
    runs = judged(check, "level_runs")
    assert_allclose(np.abs(runs.closures.misclosure), [[0.004]], rtol=0, atol=1e-12)  # m
    assert_allclose(runs.allowed, [[0.003]], rtol=0, atol=1e-12)  # m: 3 mm √D at 1 km
    assert runs.exceeds.tolist() == [True]
    loop = judged(check, "level_loop")
    assert_allclose(np.abs(loop.closures.misclosure), [[0.002]], rtol=0, atol=1e-12)  # m
    assert_allclose(loop.closures.sd, [[LENGTH_SD * np.sqrt(2.5)]], rtol=0, atol=1e-12)  # m: half the variance of a run
    assert len(loop.closures.rows[0]) == 4


def test_three_runs_are_held_against_the_first() -> None:
    job = build_job("AB", levels=[("A", "B", 1.0), ("B", "A", -1.001), ("A", "B", 0.998)])
    runs = judged(check_job(job), "level_runs")
    assert_allclose(runs.closures.misclosure.ravel(), [0.001, -0.002], rtol=0, atol=1e-12)  # m


def test_lengths_between_coordinates_stand_in_for_those_not_stated() -> None:
    job = build_job({"A": (0.0, 0.0), "B": (3000.0, 4000.0)}, levels=[("A", "B", 1.0), ("B", "A", -1.001)])
    runs = judged(check_job(job), "level_runs")
    assert_allclose(runs.closures.length, [5000.0], rtol=0, atol=1e-9)  # m


def test_published_net_closes_as_its_residuals_say() -> None:
    """The seven-line net on two benchmarks (L2): misclosures are those of the printed rises, by hand."""
    inputs = published("levelling.json")["L2"]["inputs"]
    heights = {name: (None, None, height) for name, height in inputs["fixed"].items()}
    free = dict.fromkeys(("P1", "P2", "P3"))
    rows = [(row["frm"], row["to"], row["dh"]) for row in inputs["observations"]]
    check = check_job(build_job({**heights, **free}, fixed_height=list(heights), levels=rows))
    rise = {(start, end): value for start, end, value in rows} | {(end, start): -value for start, end, value in rows}
    names = check.job.marks.names
    closures = [found.closures for found in check.closures]
    assert sum(map(len, closures)) == len(rows) - len(free)
    for found in closures:
        for number in range(len(found)):
            walked = [names[mark] for mark in found.marks[number].tolist()]
            due = heights.get(walked[-1], (0, 0, 0.0))[2] - heights.get(walked[0], (0, 0, 0.0))[2]
            by_hand = sum(rise[step] for step in pairwise(walked)) - due
            assert found.misclosure[number, 0] == pytest.approx(by_hand, abs=1e-9)  # m

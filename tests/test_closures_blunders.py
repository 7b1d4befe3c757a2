"""Planted mistakes: which closures fail, the line they share, what is named first, what the misclosure suggests."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from adjust.job import Job
from adjust.network.closures import Check, check_job
from adjust.network.closures.clues import slip
from adjust.observations import HeightDifferences
from adjust.simulate import NETWORKS, observe
from adjust.units import ARCSEC
from tests.building import build_job, exact, truth_of
from tests.studies.mutations import GROSS, graded_mistakes, judge, outcome, wrong_value

HEIGHTS = {"A": 100.0, "B": 101.3, "C": 99.2, "D": 103.7, "E": 98.4, "F": 100.9}
NET = ("AB", "BC", "CA", "BD", "DC", "DE", "EC", "EF", "FC")
"""Four triangles in a row about C, neighbours sharing one line."""


def level_net(**errors: float) -> Job:
    """Exact levels of `NET`, some rises off by so many metres."""
    rises = {line: HEIGHTS[line[1]] - HEIGHTS[line[0]] + errors.get(line, 0.0) for line in NET}
    return build_job(list(HEIGHTS), levels=[(*line, rise) for line, rise in rises.items()])


def names_of(check: Check, marks: object) -> str:
    return "".join(check.job.marks.names[mark] for mark in marks)  # type: ignore[attr-defined]


def test_two_failing_loops_share_one_line() -> None:
    check = check_job(level_net(DC=0.05))
    (shared,) = check.shared
    assert names_of(check, shared.marks) == "CD"
    assert [check.observed.source(row) for row in shared.rows] == ["levels.csv:6"]
    (suspicion,) = check.suspicions
    assert [check.observed.source(row) for row in suspicion.rows] == ["levels.csv:6"]
    assert (suspicion.failing, suspicion.passing) == (2, 0)


def test_a_line_of_one_loop_is_told_from_its_neighbours() -> None:
    """A–B is in one loop only, like C–A: both are named; B–C, which a closing loop shares, is not."""
    check = check_job(level_net(AB=0.05))
    assert check.shared == ()
    (suspicion,) = check.suspicions
    assert {names_of(check, check.observed.marks(row)) for row in suspicion.rows} == {"AB", "CA"}


def test_two_mistakes_are_named_one_after_the_other() -> None:
    check = check_job(level_net(DC=0.05, EF=-0.08))
    first, second = check.suspicions
    assert "DC" in {names_of(check, check.observed.marks(row)) for row in first.rows}
    assert "EF" in {names_of(check, check.observed.marks(row)) for row in second.rows}


def test_ends_exchanged_are_recognised() -> None:
    job = level_net()
    (rows,) = job.observations
    assert isinstance(rows, HeightDifferences)
    turned = replace(rows, observed=np.where(rows.marks[:, :1] == 3, -rows.observed, rows.observed))
    check = check_job(replace(job, observations=(turned,)))
    texts = [clue.text for clue in check.clues]
    assert any(text == "with the ends of levels.csv:6 exchanged it would close" for text in texts)


@pytest.mark.parametrize(
    ("misclosure", "allowed", "unit", "expected"),
    [
        (0.1003, 0.001, "m", "nearly 0.1 m"),
        (-1.9998, 0.002, "m", "nearly 2 m"),
        (0.1403, 0.001, "m", ""),
        (0.1003, 0.010, "m", ""),
        (np.radians(10.0) + 4 * ARCSEC, 10 * ARCSEC, "rad", "nearly 10°"),
        (-np.radians(0.9), 10 * ARCSEC, "rad", "nearly 1 gon"),
        (60.5 * ARCSEC, 2 * ARCSEC, "rad", "nearly 1′"),
        (60.5 * ARCSEC, 10 * ARCSEC, "rad", ""),
        (np.radians(180.0), 10 * ARCSEC, "rad", "nearly 180°"),
    ],
)
def test_round_figures_tell_of_slips(misclosure: float, allowed: float, unit: str, expected: str) -> None:
    assert slip(misclosure, allowed, unit) == expected


LINK = {
    "Z": (0.0, -500.0),
    "A": (0.0, 0.0),
    "P": (140.0, 60.0),
    "Q": (250.0, -20.0),
    "R": (400.0, 30.0),
    "B": (520.0, 150.0),
    "Y": (900.0, 400.0),
}


def link(angle_error: dict[str, float] | None = None, length_error: dict[str, float] | None = None) -> Job:
    """A traverse from A over P, Q and R to B, its ends oriented on Z and Y."""
    way = "ZAPQRBY"
    angles = [(at, back, on) for back, at, on in zip(way, way[1:], way[2:], strict=False)]
    sides = list(pairwise(way[1:-1]))
    given = {name: place if name in "ZABY" else None for name, place in LINK.items()}
    job = build_job(given, fixed_plan="ZABY", angles=angles, horizontals=sides)
    places = {name: (*place, 0.0) for name, place in LINK.items()}
    job = exact(job, truth_of(job, places))
    turned, lengths = job.observations
    for row, (at, _, _) in enumerate(angles):
        turned.observed[row, 0] += (angle_error or {}).get(at, 0.0)
    for row, (one, other) in enumerate(sides):
        lengths.observed[row, 0] += (length_error or {}).get(one + other, 0.0)
    return job


@pytest.mark.parametrize("station", list("APQRB"))
def test_one_wrong_angle_of_a_traverse_is_found(station: str) -> None:
    """By where the traverse ends: the angular misclosure itself says nothing of the station."""
    check = check_job(link(angle_error={station: np.radians(1.0)}))
    texts = [clue.text for clue in check.clues]
    assert f"one wrong angle, at {station}, would explain it" in texts
    assert "the misclosure is nearly 1°" in texts


@pytest.mark.parametrize("side", ["AP", "PQ", "QR", "RB"])
def test_one_wrong_length_of_a_traverse_is_found(side: str) -> None:
    check = check_job(link(length_error={side: 0.5}))
    found = next(clue for clue in check.clues if clue.text.startswith("one wrong length"))
    assert {side, side[::-1]} & {found.text.split(", ")[1].replace("–", "")}
    angles = next(judged for judged in check.closures if judged.closures.check == "azimuth_link")
    assert not angles.exceeds.any()


def test_wrong_control_is_named() -> None:
    """A benchmark 0.2 m off: every line to it fails, the loops close."""
    generator = np.random.default_rng(4)
    job, _ = observe(NETWORKS["levelling"](generator), generator)
    held = np.flatnonzero(job.marks.control[:, 1])
    given = job.marks.given.copy()
    given[held[0], 2] += 0.2
    check = check_job(replace(job, marks=replace(job.marks, given=given)))
    assert set(check.suspicions[0].marks) == set(held.tolist())
    assert all(not judged.exceeds.any() for judged in check.closures if judged.closures.check == "level_loop")


@pytest.mark.parametrize("mistake", GROSS, ids=lambda mistake: f"{mistake.network}: {mistake.name}")
def test_gross_mistakes_are_pointed_at(mistake: object) -> None:
    """A small run of the study behind docs/validation-closures.md: nine of ten at the least."""
    outcomes = [outcome(mistake, number) for number in range(10)]  # type: ignore[arg-type]
    checked = [result for result in outcomes if result.checked]
    assert sum(result.loop for result in checked) >= 0.9 * len(checked)
    assert sum(result.line for result in checked) >= 0.8 * len(checked)


def test_errors_of_five_tolerances_are_pointed_at() -> None:
    for mistake in graded_mistakes(5.0):
        checked = [result for result in (outcome(mistake, number) for number in range(6)) if result.checked]
        assert sum(result.loop for result in checked) >= 0.9 * len(checked), mistake.name


def test_nothing_is_pointed_at_where_nothing_is_wrong() -> None:
    generator = np.random.default_rng(2)
    job, _ = observe(NETWORKS["levelling"](generator), generator)
    check = check_job(job)
    planted = replace(wrong_value(HeightDifferences, (0.0,))(job, generator), job=job)
    result = judge(check, planted)
    assert not any((result.found, result.loop, result.line, result.row))
    assert (check.suspicions, check.shared, check.clues) == ((), (), ())

"""What changed between two adjustments: marks that moved and by how much, suspects that came and went."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from adjust import Adjustment, adjust, read_job
from adjust.frames import PlaneFrame
from adjust.reports.change import change_between, change_lines
from tests.exported import FIELD_DATA, adjustment_of

TOWN = FIELD_DATA / "town_traverse"


@pytest.fixture
def edited(tmp_path: Path) -> Callable[[str, Callable[[list[str]], list[str]]], Adjustment]:
    """The town traverse adjusted again after a change of the lines of one of its tables."""

    def again(table: str, change: Callable[[list[str]], list[str]]) -> Adjustment:
        folder = shutil.copytree(TOWN, tmp_path / "town", dirs_exist_ok=True)
        lines = (folder / table).read_text("utf-8").splitlines()
        (folder / table).write_text("\n".join(change(lines)) + "\n", "utf-8")
        return adjust(read_job(folder))

    return again


def without_the_worst(lines: list[str]) -> list[str]:
    worst = int(adjustment_of("town_traverse").suspects[0].rpartition(":")[2])
    return lines[: worst - 1] + lines[worst:]


def test_nothing_changed() -> None:
    change = change_between(adjustment_of("town_traverse"), adjustment_of("town_traverse"))
    assert change_lines(change) == ["No mark moved.", "vᵀPv: 772.52, now 772.52."]


def test_moves_are_the_differences_of_coordinates(edited: Callable[..., Adjustment]) -> None:
    before, after = adjustment_of("town_traverse"), edited("distances.csv", without_the_worst)
    change = change_between(before, after)
    differences = after.coordinates[:, :2] - before.coordinates[:, :2]
    size = np.hypot(*differences.T)
    names = after.job.marks.names
    assert set(change.moved) == {names[row] for row in np.flatnonzero(size > 1e-5)}
    assert change.moved[0] == names[int(np.argmax(size))]
    for name, move in zip(change.moved, change.moves, strict=True):
        np.testing.assert_allclose(move[:2], differences[after.job.marks.index[name]], rtol=0, atol=1e-12)  # m
    assert np.all(np.diff(np.hypot(*change.moves[:, :2].T)) <= 0)
    assert np.isnan(change.moves[:, 2]).all()  # nobody levelled


def test_suspects_that_went_are_named_though_lines_shifted(edited: Callable[..., Adjustment]) -> None:
    """The row of the planted blunder is taken out; rows below it move up a line and are still the same rows."""
    before, after = adjustment_of("town_traverse"), edited("distances.csv", without_the_worst)
    change = change_between(before, after)
    assert after.accepted
    assert not change.new_suspects
    assert len(change.gone_suspects) == len(before.suspects)
    assert change.gone_suspects[0].startswith("horizontal 302 → 303 (distances.csv:")
    lines = change_lines(change)
    assert any(line.startswith("No longer suspect: horizontal 302 → 303") for line in lines)
    assert f"Observations: {before.solution.observations}, now {before.solution.observations - 1}." in lines
    backward = change_between(after, before)
    assert backward.new_suspects == change.gone_suspects
    assert not backward.gone_suspects


def test_a_comment_above_shifts_all_lines_and_changes_nothing(edited: Callable[..., Adjustment]) -> None:
    before, after = adjustment_of("town_traverse"), edited("distances.csv", lambda lines: ["# checked", *lines])
    assert before.suspects != after.suspects  # the sources name other lines
    change = change_between(before, after)
    assert change.new_suspects == change.gone_suspects == change.moved == ()


def test_marks_that_came_and_went(edited: Callable[..., Adjustment]) -> None:
    before = adjustment_of("town_traverse")
    after = edited("marks.csv", lambda lines: [*lines, "NEW" + "," * lines[0].count(",")])
    change = change_between(before, after)
    assert (change.new_marks, change.gone_marks) == (("NEW",), ())
    assert "New marks: NEW." in change_lines(change)
    assert change_between(after, before).gone_marks == ("NEW",)


def test_moves_on_the_ellipsoid_are_along_the_grid() -> None:
    before = adjustment_of("dam_control")
    moved = before.job.marks.index["D1"]
    step = np.zeros_like(before.coordinates)
    rotation = before.job.frame.grid_rotation(before.coordinates)[moved]
    step[moved] = 0.01 * np.sin(rotation), 0.01 * np.cos(rotation), -0.002  # m: to grid north, and down
    shifted = before.job.frame.moved(before.coordinates, step)
    after = replace(before, geometry=replace(before.geometry, coordinates=shifted))
    change = change_between(before, after)
    assert change.moved == ("D1",)
    np.testing.assert_allclose(change.moves[0], (0.0, 0.01, -0.002), rtol=0, atol=1e-7)  # m


def test_another_frame_is_not_compared() -> None:
    before = adjustment_of("total station")
    after = replace(before, job=replace(before.job, frame=PlaneFrame(earth_curvature=False)))
    assert change_lines(change_between(before, after))[0].startswith("The frame changed")

"""The demonstration jobs: made again to the last byte, and they show what their pages say."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest

from adjust import Adjustment, adjust, read_job
from adjust.residuals import Residuals
from adjust.simulate.demos import DEMOS
from adjust.simulate.demos.dam_control import CREST
from adjust.simulate.demos.town_traverse import MISBOOKED

FIELD_DATA = Path(__file__).parent.parent / "field_data"


@cache
def adjusted(name: str) -> Adjustment:
    return adjust(read_job(FIELD_DATA / name))


def contents(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in folder.iterdir() if path.is_file()}


@pytest.mark.parametrize("name", DEMOS)
def test_made_again_to_the_last_byte(name: str, tmp_path: Path) -> None:
    DEMOS[name]().write(tmp_path / name)
    assert contents(tmp_path / name) == contents(FIELD_DATA / name)


def test_nothing_else_lies_there() -> None:
    assert {path.name for path in FIELD_DATA.iterdir() if path.is_dir()} == set(DEMOS)


@pytest.mark.parametrize("name", DEMOS)
def test_pages_say_that_the_data_are_invented(name: str) -> None:
    page = (FIELD_DATA / name / "README.md").read_text(encoding="utf-8")
    assert "**Invented data.**" in page
    assert f"hubtack adjust field_data/{name}" in page


@pytest.mark.parametrize("name", ["fen_levels", "dam_control"])
def test_sound_jobs_are_accepted(name: str) -> None:
    assert adjusted(name).accepted


class TestFenLevels:
    def test_heights_alone(self) -> None:
        result = adjusted("fen_levels")
        assert np.isnan(result.coordinates[:, :2]).all()
        assert np.isfinite(result.coordinates[:, 2]).all()

    def test_the_spur_is_unchecked(self) -> None:
        rows = adjusted("fen_levels").residuals[0]
        spur = rows.observations.marks[:, 1] == adjusted("fen_levels").job.marks.index["F6"]
        np.testing.assert_array_equal(rows.redundancy[:, 0] == 0, spur)

    def test_the_spur_has_the_largest_sd(self) -> None:
        result = adjusted("fen_levels")
        assert result.job.marks.names[int(np.argmax(result.standard_deviations[:, 2]))] == "F6"

    def test_two_days_in_two_files(self) -> None:
        labels = [adjusted("fen_levels").residuals[0].observations.provenance.label(row) for row in (0, 10)]
        assert labels == ["levels_day1.csv:4", "levels_day2.csv:8"]


def row_of(result: Adjustment, kind: str, at: str, to: str) -> tuple[Residuals, int]:
    """The residuals of a kind and the row of the line from `at` to `to`."""
    (rows,) = (rows for rows in result.residuals if rows.observations.kind == kind)
    wanted = [result.job.marks.index[at], result.job.marks.index[to]]
    (row,) = np.flatnonzero((rows.observations.marks == wanted).all(axis=1))
    return rows, int(row)


class TestTownTraverse:
    def test_the_misbooked_distance_is_the_first_suspect(self) -> None:
        result = adjusted("town_traverse")
        rows, row = row_of(result, "horizontal_distance", *MISBOOKED)
        assert result.solution.global_test.passed is False
        assert result.suspects[0] == rows.observations.provenance.label(row)
        assert result.suspects[0] in (FIELD_DATA / "town_traverse" / "README.md").read_text(encoding="utf-8")

    def test_the_residual_over_the_redundancy_finds_the_error(self) -> None:
        rows, row = row_of(adjusted("town_traverse"), "horizontal_distance", *MISBOOKED)
        estimate = -rows.residual[row, 0] / rows.redundancy[row, 0]
        sd = rows.sd[row, 0] / np.sqrt(rows.redundancy[row, 0])
        assert estimate == pytest.approx(-0.090, rel=0, abs=4 * sd)  # m: four of the estimate's own sds
        assert f"about {round(estimate, 2):+.2f} m" in (FIELD_DATA / "town_traverse" / "README.md").read_text("utf-8")

    def test_without_it_all_is_well(self, tmp_path: Path) -> None:
        """As the page says: a column `use`, `no` in that row."""
        for name, content in contents(FIELD_DATA / "town_traverse").items():
            (tmp_path / name).write_bytes(content)
        line = int(adjusted("town_traverse").suspects[0].rpartition(":")[2])
        lines = (tmp_path / "distances.csv").read_text(encoding="utf-8").splitlines()
        lines[1:] = [f"{text},{'use' if number == 2 else ''}" for number, text in enumerate(lines[1:], 2)]
        lines[line - 1] += "no"
        (tmp_path / "distances.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
        again = adjust(read_job(tmp_path))
        assert again.accepted
        assert len(again.job.left_out) == 1


class TestDamControl:
    def test_three_crafts_at_once(self) -> None:
        kinds = [rows.observations.kind for rows in adjusted("dam_control").residuals]
        expected = ["direction", "slope_distance", "zenith", "height_difference", "vector", "control"]
        assert kinds == expected

    def test_statuses(self) -> None:
        result = adjusted("dam_control")
        status = dict(zip(result.job.marks.names, result.statuses, strict=True))
        assert status["REF1"] == ("fixed", "fixed")
        assert status["REF3"] == ("weighted", "weighted")
        assert status["HB1"] == ("none", "fixed")
        assert status["HB2"] == ("none", "adjusted")

    def test_the_crest_is_better_in_height(self) -> None:
        result = adjusted("dam_control")
        rows = [result.job.marks.index[name] for name in CREST]
        sd = result.standard_deviations[rows]
        assert np.all(sd[:, 2] < sd[:, :2].min(axis=1) / 3)

    def test_grid_north_lies_about_one_degree_away(self) -> None:
        result = adjusted("dam_control")
        rotation = result.job.frame.grid_rotation(result.coordinates)
        np.testing.assert_allclose(np.degrees(rotation[:4]), 0.95, rtol=0, atol=0.05)  # deg: "about one"

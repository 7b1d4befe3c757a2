"""The user's guide does what it says: its job folder, its command, its output and its messages."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner

from adjust import adjust, read_job
from cli.main import hubtack

GUIDE = Path(__file__).parents[1] / "docs" / "users-guide.md"
DEMO = Path(__file__).parents[1] / "field_data" / "town_traverse"
FILES = re.compile(r"^`([a-z]+\.(?:toml|csv))`(?:(?!\n\n).)*:\n\n```(?:toml|csv)\n(.*?)```", re.DOTALL | re.MULTILINE)
PRINTED = re.compile(r"```text\n(.*?)```", re.DOTALL)


@pytest.fixture
def ridge(tmp_path: Path) -> Path:
    """The job folder that the guide has its reader write."""
    folder = tmp_path / "ridge"
    folder.mkdir()
    for name, text in FILES.findall(GUIDE.read_text("utf-8")):
        (folder / name).write_text(text, "utf-8")
    assert sorted(path.name for path in folder.iterdir()) == [
        "directions.csv",
        "distances.csv",
        "job.toml",
        "marks.csv",
    ]
    return folder


def printed(number: int) -> str:
    return PRINTED.findall(GUIDE.read_text("utf-8"))[number].strip("\n")


def test_the_command_prints_and_lists_what_the_guide_shows(ridge: Path) -> None:
    result = CliRunner().invoke(hubtack, ["adjust", str(ridge)], standalone_mode=False)
    assert result.return_value == 0
    assert printed(0) in result.stdout
    assert printed(1) in (ridge / "out" / "listing.txt").read_text("utf-8")


def test_the_demo_names_the_planted_blunder(tmp_path: Path) -> None:
    folder = shutil.copytree(DEMO, tmp_path / "demo")
    result = CliRunner().invoke(hubtack, ["adjust", str(folder)], standalone_mode=False)
    assert result.return_value == 1
    assert printed(2) in result.stdout
    check = CliRunner().invoke(hubtack, ["check", str(folder)], standalone_mode=False)
    assert check.return_value == 1
    assert printed(3) in check.stdout


def test_the_blunder_is_found_explained_and_decided(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    shutil.copytree(DEMO, tmp_path / "field_data" / "town_traverse")
    monkeypatch.chdir(tmp_path)
    commands = [line.split()[1:] for line in re.findall(r"^hubtack .*decisions\.csv$", GUIDE.read_text("utf-8"), re.M)]
    assert [command[0] for command in commands] == ["blunders", "adjust"]
    found = CliRunner().invoke(hubtack, commands[0], standalone_mode=False)
    assert found.return_value == 1
    assert printed(4) in found.stdout
    table = Path("decisions.csv")
    shown, edited = printed(5).splitlines(), printed(6).splitlines()
    lines = [line for line in table.read_text("utf-8").splitlines() if not line.startswith("#")]
    assert len(lines) == len(shown)
    assert all(line.startswith(f"{start},") for line, start in zip(lines, shown, strict=True))
    table.write_text("\n".join(edited) + "\n", "utf-8")
    decided = CliRunner().invoke(hubtack, commands[1], standalone_mode=False)
    assert decided.return_value == 0
    assert printed(7) in decided.stdout
    assert printed(8) in Path("field_data/town_traverse/out/listing.txt").read_text("utf-8")
    assert Path("field_data/town_traverse/distances.csv").read_bytes() == (DEMO / "distances.csv").read_bytes()


def test_a_letter_in_a_number_is_named_as_the_guide_says(ridge: Path) -> None:
    table = ridge / "distances.csv"
    table.write_text(table.read_text("utf-8").replace("377.623", "37a.623"), "utf-8")
    result = CliRunner().invoke(hubtack, ["adjust", str(ridge)], standalone_mode=False)
    assert result.return_value == 2
    assert printed(9) in result.stderr


def test_the_notebook_lines_answer(ridge: Path) -> None:
    result = adjust(read_job(ridge))
    assert result.coordinates.shape == result.standard_deviations.shape == (4, 3)
    assert result.covariance(["1", "2"]).shape == (6, 6)
    ellipse = result.relative_ellipse("1", "2")
    assert 0 < float(ellipse.semi_minor) <= float(ellipse.semi_major) < 0.01  # m
    assert 0 <= float(ellipse.azimuth) < np.pi
    assert result.suspects == ()

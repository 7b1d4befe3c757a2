"""Cells of single lines, read again from the job folder; and what a book would have where there is no folder."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from adjust import read_job
from adjust.blunders import Cell, Hypothesis
from adjust.blunders.cells import cells_of
from adjust.field_book.written import written
from adjust.simulate import NETWORKS, observe
from tests.job_folders import PLANE

FIELD_DATA = Path(__file__).parent.parent / "field_data"


def folder_with(tmp_path: Path, **files: str) -> Path:
    for name, text in PLANE.items():
        (tmp_path / name).write_text(text, encoding="utf-8")
    for name, text in files.items():
        (tmp_path / f"{name}.csv").write_text(text, encoding="utf-8")
    return tmp_path


def test_cells_stand_under_the_plain_name_of_their_column() -> None:
    line = written(FIELD_DATA / "dam_control", [("zeniths.csv", 3)])["zeniths.csv", 3]
    assert line["zenith"] == Cell("zenith_dms", "88-58-16.1")
    assert line["to"].text == "P2"


def test_files_that_the_job_file_names_are_found() -> None:
    lines = written(FIELD_DATA / "fen_levels", [("levels_day2.csv", 5), ("levels_day1.csv", 4)])
    assert lines["levels_day1.csv", 4]["rise"].text == "-0.5686"
    assert lines["levels_day2.csv", 5]["from"].text == "F2"


def test_text_is_kept_as_it_stands(tmp_path: Path) -> None:
    table = '\ufeff# dry\r\nnote;to;slope_m;at\r\n"a; b";A;1 \r\n;B; 300,120;001\r\n'
    folder = folder_with(tmp_path, distances=table)
    line = written(folder / "job.toml", [("distances.csv", 4)])["distances.csv", 4]
    assert line == {"to": Cell("to", "B"), "slope": Cell("slope_m", "300,120"), "at": Cell("at", "001")}


def test_lines_that_are_gone_are_left_out(tmp_path: Path) -> None:
    folder = folder_with(tmp_path)
    assert written(folder, [("angles.csv", 1), ("angles.csv", 99), ("nowhere.csv", 2), ("job.toml", 2)]) == {}
    assert written(tmp_path / "nowhere", [("angles.csv", 2)]) == {}


def test_a_mean_has_the_cells_of_all_its_lines() -> None:
    folder = FIELD_DATA / "dam_control"
    job = read_job(folder)
    place, rows = next((place, rows) for place, rows in enumerate(job.observations) if rows.kind == "zenith")
    suspect = Hypothesis("observation", "", ((place, np.array([2])),), ("",), "rad")
    (lines,) = cells_of(job, [suspect], folder)
    assert len(lines) == 1 + (0 if rows.provenance.further is None else len(rows.provenance.further[2]))
    assert lines[0]["zenith"].title == "zenith_dms"


@pytest.mark.parametrize("shape", NETWORKS)
def test_a_job_in_memory_has_the_cells_that_a_book_would_have(shape: str) -> None:
    job, _ = observe(NETWORKS[shape](np.random.default_rng(1)), np.random.default_rng(2))
    suspects = [
        Hypothesis("observation", "", ((place, np.array([0])),), ("",), rows.unit)
        for place, rows in enumerate(job.observations)
    ]
    for (line,), rows in zip(cells_of(job, suspects), job.observations, strict=True):
        for role, mark in zip(rows.roles, rows.marks[0], strict=True):
            assert line["mark" if rows.kind == "control" else role].text == job.marks.names[mark]
        assert all(cell.text for cell in line.values())


def test_control_has_the_cells_of_its_mark() -> None:
    folder = FIELD_DATA / "town_traverse"
    job = read_job(folder)
    suspect = Hypothesis("control", "", ((0, np.array([0])),), ("east", "north"), "m", job.marks.index["K117"])
    ((from_file,),) = cells_of(job, [suspect], folder)
    ((from_memory,),) = cells_of(job, [suspect])
    assert from_file["easting"] == Cell("easting_m", "1984.351")
    assert float(from_memory["easting"].text) == 1984.351

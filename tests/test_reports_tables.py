"""coordinates.csv and residuals.csv carry the figures of results.json, with units in the column names."""

import csv
import json
import re
from pathlib import Path

import pytest

from adjust.reports import write_reports
from tests.adjusted_networks import JOBS, adjusted


def rows_of(path):
    """Comments, and rows by column name."""
    lines = path.read_text("utf-8").splitlines()
    comments = [line for line in lines if line.startswith("#")]
    assert lines[: len(comments)] == comments
    return comments, list(csv.DictReader(lines[len(comments) :]))


@pytest.fixture(params=list(JOBS))
def written(request, tmp_path):
    write_reports(adjusted(request.param), tmp_path)
    return tmp_path, json.loads((tmp_path / "results.json").read_text("utf-8"))


def same(cell, figure):
    """The cell reads back as the very same number or text."""
    if figure is None:
        return cell == ""
    return float(cell) == figure if isinstance(figure, float) else cell == figure


def test_coordinates_are_the_marks_of_the_results(written):
    folder, results = written
    _, rows = rows_of(folder / "coordinates.csv")
    assert [row["mark"] for row in rows] == [mark["mark"] for mark in results["marks"]]
    for row, mark in zip(rows, results["marks"], strict=True):
        flat = {key: value for key, value in mark.items() if not isinstance(value, dict | list)}
        for name in ("ellipse", "ellipse_confidence"):
            flat |= {f"{name}_{key}": value for key, value in mark[name].items()}
        for place, name in {(0, 0): "ee", (0, 1): "en", (0, 2): "eh", (1, 1): "nn", (1, 2): "nh", (2, 2): "hh"}.items():
            flat[f"cov_{name}_mm2"] = mark["covariance_mm2"][place[0]][place[1]]
        assert set(row) == set(flat)
        assert all(same(row[key], value) for key, value in flat.items())


def test_residuals_are_the_observations_of_the_results(written):
    folder, results = written
    _, rows = rows_of(folder / "residuals.csv")
    for row, record in zip(rows, results["observations"], strict=True):
        other = "deg" if record["unit"] == "m" else "m"
        for key, value in record.items():
            if key in ("observed", "adjusted", "residual", "sd", "minimal_detectable_bias"):
                assert same(row[f"{key}_{record['unit']}"], value)
                assert row[f"{key}_{other}"] == ""
            elif key == "suspect":
                assert row[key] == ("yes" if value else "no")
            else:
                assert same(row[key], value)


def test_every_caution_stands_ahead_of_both_tables(written):
    folder, results = written
    for name in ("coordinates.csv", "residuals.csv"):
        comments, _ = rows_of(folder / name)
        assert comments == [f"# Caution: {caution}" for caution in results["cautions"]]


def test_every_row_has_as_many_cells_as_the_header(written):
    for name in ("coordinates.csv", "residuals.csv"):
        lines = (written[0] / name).read_text("utf-8").splitlines()
        widths = {len(cells) for cells in csv.reader(line for line in lines if not line.startswith("#"))}
        assert len(widths) == 1


def test_mark_names_stay_text(tmp_path):
    from dataclasses import replace

    adjustment = adjusted("unchecked")
    names = ("007", 'hub "east", 1')
    renamed = replace(adjustment, job=replace(adjustment.job, marks=replace(adjustment.job.marks, names=names)))
    write_reports(renamed, tmp_path)
    _, rows = rows_of(tmp_path / "coordinates.csv")
    assert tuple(row["mark"] for row in rows) == names
    assert [mark["mark"] for mark in json.loads((tmp_path / "results.json").read_text())["marks"]] == list(names)


def test_snippet_of_the_reference_reads_the_table(tmp_path, monkeypatch):
    """The code block of docs/results.md, run where it says it runs."""
    reference = (Path(__file__).parents[1] / "docs" / "results.md").read_text("utf-8")
    snippet = re.search(r"```python\n(.*?)```", reference, re.DOTALL)
    write_reports(adjusted("unchecked"), tmp_path / "out")
    monkeypatch.chdir(tmp_path)
    names = {}
    exec(snippet[1], names)
    assert [row["mark"] for row in names["marks"]] == ["A", "B"]


def test_reference_describes_every_key(written):
    _, results = written
    reference = (Path(__file__).parents[1] / "docs" / "results.md").read_text("utf-8")
    keys = set(results) | set(results["job"]) | set(results["solution"]) | set(results["solution"]["global_test"])
    for records in ("marks", "observations", "relative"):
        for record in results[records]:
            keys |= set(record)
    assert [key for key in sorted(keys) if f"`{key}`" not in reference and key != "confidence"] == []

"""CSV and workbook exports, read back with csv and openpyxl."""

from __future__ import annotations

import csv
from pathlib import Path
from typing import Any

import openpyxl
import pytest

from adjust.reports import write_reports
from adjust.reports.exports import Options, export
from adjust.reports.exports import workbook as workbook_module
from tests.exported import ALL, HOSTILE, adjustment_of, plain_of, saved, with_hostile_names


@pytest.mark.parametrize("name", ALL)
def test_csv_of_marks_and_observations_is_what_the_adjustment_wrote(name: str, tmp_path: Path) -> None:
    write_reports(adjustment_of(name), tmp_path)
    for table, written in (("marks", "coordinates.csv"), ("observations", "residuals.csv")):
        export(saved(name), "csv", tmp_path / "export.csv", Options(table=table))  # type: ignore[arg-type]
        assert (tmp_path / "export.csv").read_bytes() == (tmp_path / written).read_bytes()


def test_csv_of_lines(tmp_path: Path) -> None:
    export(saved("dam_control"), "csv", tmp_path / "lines.csv", Options(table="lines"))
    with (tmp_path / "lines.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    plain = plain_of("dam_control")
    assert len(rows) == len(plain["relative"])
    for row, line in zip(rows, plain["relative"], strict=True):
        assert (row["from"], row["to"]) == (line["from"], line["to"])
        assert row["distance_m"] == ("" if line["distance_m"] is None else repr(line["distance_m"]))
        observed = {
            record["kind"]
            for record in plain["observations"]
            if {record["from"] or record["at"], record["to"]} == {line["from"], line["to"]}
        }
        assert set(row["kinds"].split()) == observed


def sheets(path: Path) -> dict[str, list[list[Any]]]:
    book = openpyxl.load_workbook(path)
    return {sheet.title: [[cell.value for cell in row] for row in sheet.iter_rows()] for sheet in book}


@pytest.mark.parametrize("name", ALL)
def test_workbook_holds_every_figure(name: str, tmp_path: Path) -> None:
    path = tmp_path / "results.xlsx"
    export(saved(name), "xlsx", path)
    read, plain = sheets(path), plain_of(name)

    def digits(value: Any) -> Any:
        return float(f"{value:.16g}") if isinstance(value, float) else value  # what openpyxl writes of a number

    assert list(read) == ["Summary", "Marks", "Lines", "Observations"]
    head, *rows = read["Marks"]
    for row, mark in zip(rows, plain["marks"], strict=True):
        found = dict(zip(head, row, strict=True))
        for key in ("mark", "plan_status", "easting_m", "height_m", "sd_height_mm", "horizontal_95_mm"):
            assert found[key] == digits(mark[key])
        assert found["cov_nh_mm2"] == digits(mark["covariance_mm2"][1][2])
        assert found["ellipse_azimuth_deg"] == digits(mark["ellipse"]["azimuth_deg"])
    head, *rows = read["Observations"]
    for row, observation in zip(rows, plain["observations"], strict=True):
        found = dict(zip(head, row, strict=True))
        assert found["source"] == observation["source"]
        assert found[f"residual_{observation['unit']}"] == digits(observation["residual"])
        assert found["w"] == digits(observation["w"])
    summary = [tuple(row[:2]) for row in read["Summary"]]
    assert ("variance_factor", digits(plain["solution"]["variance_factor"])) in summary
    assert [text for key, text in summary if key == "caution"] == plain["cautions"]


def test_text_is_text(tmp_path: Path) -> None:
    """No mark's name becomes a formula, a number or an error."""
    path = tmp_path / "results.xlsx"
    export(saved("dam_control", with_hostile_names), "xlsx", path)
    column = openpyxl.load_workbook(path)["Marks"]["A"][1 : len(HOSTILE) + 1]
    assert [cell.value for cell in column] == list(HOSTILE)
    assert {cell.data_type for cell in column} == {"s"}


def test_headers_stay_in_view_and_filter(tmp_path: Path) -> None:
    path = tmp_path / "results.xlsx"
    export(saved("dam_control"), "xlsx", path)
    sheet = openpyxl.load_workbook(path)["Marks"]
    assert sheet.freeze_panes == "B2"
    assert sheet.auto_filter.ref == sheet.dimensions


def test_a_table_that_no_sheet_holds_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from adjust.errors import OutputError

    monkeypatch.setattr(workbook_module, "MOST_ROWS", 100)
    with pytest.raises(OutputError, match="export csv instead"):
        export(saved("dam_control"), "xlsx", tmp_path / "results.xlsx")


def test_the_same_results_make_the_same_bytes(tmp_path: Path) -> None:
    for name in ("a", "b"):
        export(saved("dam_control"), "xlsx", tmp_path / name)
    assert (tmp_path / "a").read_bytes() == (tmp_path / "b").read_bytes()

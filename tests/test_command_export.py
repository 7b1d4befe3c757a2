"""`hubtack export`: where files go, what is said, and what happens where something is missing."""

from __future__ import annotations

import re
import shutil
import sys
from pathlib import Path

import pytest

from adjust.reports.exports import FORMATS
from cli.export import NAMES
from cli.main import run
from tests.exported import text_of

ROOT = Path(__file__).parents[1]
LIBRARIES = {"gpkg": ("pyogrio", "gis"), "dxf": ("ezdxf", "cad"), "xlsx": ("openpyxl", "office")}


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "results.json").write_text(text_of("dam_control"), "utf-8")
    return tmp_path


def test_the_command_names_every_format() -> None:
    assert tuple(FORMATS) == NAMES


@pytest.mark.parametrize("form", NAMES)
def test_a_folder_or_its_file_give_the_same_export_beside_it(
    form: str, folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["export", str(folder), "--to", form]) == 0
    path = folder / f"results{FORMATS[form].suffix}"
    assert capsys.readouterr().out == f"Wrote {path}.\n"
    other = folder / "elsewhere" / "file"
    assert run(["export", str(folder / "results.json"), "--to", form, "--out", str(other)]) == 0
    assert other.read_bytes() == path.read_bytes()


def test_the_transformation_is_said(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    run(["export", str(folder), "--to", "geojson"])
    assert "“ETRS89 to WGS 84 (1)”, accuracy 1 m" in capsys.readouterr().err


@pytest.mark.parametrize("form", LIBRARIES)
def test_a_missing_library_is_named_with_its_cure(
    form: str, folder: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    name, extra = LIBRARIES[form]
    monkeypatch.setitem(sys.modules, name, None)
    assert run(["export", str(folder), "--to", form]) == 2
    said = capsys.readouterr().err
    assert name in said
    assert f"pip install 'hubtack[{extra}]'" in said
    assert [path.name for path in folder.iterdir()] == ["results.json"]


def test_a_refused_export_leaves_the_earlier_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "results.json").write_text(text_of("fen_levels"), "utf-8")
    (tmp_path / "results.dxf").write_text("earlier", "utf-8")
    assert run(["export", str(tmp_path), "--to", "dxf"]) == 2
    assert "no mark has plan coordinates" in capsys.readouterr().err
    assert (tmp_path / "results.dxf").read_text("utf-8") == "earlier"


def test_results_that_are_none_are_status_2(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["export", str(tmp_path / "nowhere"), "--to", "csv"]) == 2
    assert "hubtack adjust" in capsys.readouterr().err


def test_an_unknown_format_or_exaggeration_is_status_2(folder: Path) -> None:
    assert run(["export", str(folder), "--to", "paper"]) == 2
    assert run(["export", str(folder), "--to", "dxf", "--exaggeration", "0"]) == 2


def test_the_page_on_exports_does_what_it_says(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Its commands and its program run from the checkout's field data."""
    text = (ROOT / "docs" / "exports.md").read_text("utf-8")
    shutil.copytree(ROOT / "field_data" / "dam_control", tmp_path / "field_data" / "dam_control")
    monkeypatch.chdir(tmp_path)
    commands = re.findall(r"^hubtack (.*)$", text, re.MULTILINE)
    assert len(commands) == 3
    assert [run(command.split()) for command in commands] == [0, 0, 0]
    (program,) = re.findall(r"```python\n(.*?)```", text, re.DOTALL)
    names: dict[str, object] = {}
    exec(program, names)
    assert Path("dam.geojson").is_file()
    assert "1 m" in str(names["notes"])

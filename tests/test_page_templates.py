"""Templates kept compiled: found again, made anew when they change or are spoilt, done without where they must be."""

from __future__ import annotations

import sys
from pathlib import Path

import jinja2
import pytest

from adjust.reports.page.compiled import CompiledTemplates


def rendered(folder: Path, text: str) -> str:
    loader = jinja2.DictLoader({"page": text})
    return jinja2.Environment(loader=loader, bytecode_cache=CompiledTemplates(folder)).get_template("page").render(n=7)


@pytest.fixture(autouse=True)
def _writing(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "dont_write_bytecode", False)


def test_a_template_is_compiled_once(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    assert rendered(tmp_path, "{{ n }} marks") == "7 marks"
    assert len(list((tmp_path / "__pycache__").iterdir())) == 1

    def never(*_: object) -> None:
        raise AssertionError("compiled again")

    monkeypatch.setattr(jinja2.Environment, "compile", never)
    assert rendered(tmp_path, "{{ n }} marks") == "7 marks"


def test_what_changed_or_was_spoilt_is_compiled_anew(tmp_path: Path) -> None:
    assert rendered(tmp_path, "{{ n }} marks") == "7 marks"
    assert rendered(tmp_path, "{{ n }} lines") == "7 lines"
    (kept,) = (tmp_path / "__pycache__").iterdir()
    for content in (b"", b"spoilt", kept.read_bytes()[:-9]):
        kept.write_bytes(content)
        assert rendered(tmp_path, "{{ n }} lines") == "7 lines"


def test_a_place_that_cannot_be_written_is_no_trouble(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "__pycache__").write_text("a file in the way")
    assert rendered(tmp_path, "{{ n }} marks") == "7 marks"
    monkeypatch.setattr(sys, "dont_write_bytecode", True)
    assert rendered(tmp_path / "elsewhere", "{{ n }} marks") == "7 marks"
    assert not (tmp_path / "elsewhere").exists()

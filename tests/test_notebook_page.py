"""docs/notebook.md: its examples run one after the other and print what stands below them."""

from __future__ import annotations

import ast
import re
import shutil
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[1]
PAGE = ROOT / "docs" / "notebook.md"
EXAMPLE = re.compile(r"```python\n(.*?)```(?:\n\n```text\n(.*?)```)?", re.DOTALL)


def shown(code: str, names: dict[str, Any]) -> str | None:
    """What a notebook shows below a cell: its last line, where that is an expression."""
    *statements, last = ast.parse(code).body
    if not isinstance(last, ast.Expr):
        statements, last = [*statements, last], None  # type: ignore[assignment]
    exec(compile(ast.Module(statements, []), str(PAGE), "exec"), names)
    return repr(eval(compile(ast.Expression(last.value), str(PAGE), "eval"), names)) if last else None


def _lines(text: str | None) -> list[str]:
    return [line.rstrip() for line in (text or "").strip("\n").splitlines()]


def test_examples_print_what_the_page_shows(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for name in ("dam_control", "town_traverse"):
        shutil.copytree(ROOT / "field_data" / name, tmp_path / "field_data" / name)
    monkeypatch.chdir(tmp_path)
    examples = EXAMPLE.findall(PAGE.read_text("utf-8"))
    assert len(examples) >= 8
    names: dict[str, Any] = {}
    for code, printed in examples:
        result = shown(code, names)
        if printed:
            assert _lines(result) == _lines(printed), code

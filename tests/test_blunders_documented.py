"""The pages on blunders and decisions say what the program does: keys, columns, sentences and examples."""

from __future__ import annotations

import json
import re
import typing
from pathlib import Path

import pytest

from adjust import FieldDataError, read_job
from adjust.blunders import hypothesis
from adjust.field_book.decisions import DECISIONS
from cli.main import run
from tests.exported import FIELD_DATA, plain_of

DOCS = Path(__file__).parents[1] / "docs"
BLUNDERS, DECIDED, RESULTS = ((DOCS / f"{name}.md").read_text("utf-8") for name in ("blunders", "decisions", "results"))
TOWN = FIELD_DATA / "town_traverse"


def keys_of(record: object) -> set[str]:
    """All keys of nested records."""
    if isinstance(record, list):
        return set().union(*map(keys_of, record))
    if isinstance(record, dict):
        return set(record) | set().union(*map(keys_of, record.values()))
    return set()


def test_every_key_of_blunders_json_is_described(tmp_path: Path) -> None:
    assert run(["blunders", str(TOWN), "--out", str(tmp_path)]) == 1
    written = json.loads((tmp_path / "blunders.json").read_text("utf-8"))
    block = BLUNDERS.split("## blunders.json")[1]
    keys = set(written) | keys_of([written["job"], written["detectability"]])
    assert [key for key in sorted(keys) if not re.search(rf"\b{key}\b", block)] == []


def test_every_key_of_a_blunder_is_described() -> None:
    section = RESULTS.split("### blunders")[1].split("### decisions")[0]
    found = plain_of("town_traverse")["blunders"]
    assert found
    assert [key for key in sorted(keys_of(found)) if f"`{key}`" not in section] == []


def test_every_nature_is_described() -> None:
    section = RESULTS.split("### blunders")[1].split("### decisions")[0]
    for nature in typing.get_args(hypothesis.Nature):
        assert f"`{nature}`" in section


def test_every_column_of_the_table_is_described() -> None:
    rows = re.findall(r"^\| `(\w+)` \| (required|) ?\|", DECIDED, re.MULTILINE)
    assert [(name, bool(need)) for name, need in rows] == [
        (column.name, column.required) for column in DECISIONS.columns
    ]


def test_the_example_of_the_page_can_be_carried_out(tmp_path: Path) -> None:
    (example,) = re.findall(r"```csv decisions\.csv\n(.*?)```", DECIDED, re.DOTALL)
    (tmp_path / "decisions.csv").write_text(example, "utf-8")
    job = read_job(TOWN, tmp_path / "decisions.csv")
    assert [decision.decision for decision in job.decisions] == ["correct", "leave_out", "keep"]


def test_messages_of_the_page_are_those_of_the_program(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (messages,) = re.findall(r"```text\n(.*?)```", DECIDED, re.DOTALL)
    monkeypatch.chdir(tmp_path)
    Path("decisions.csv").write_text(
        "source,decision,value,reason\ndistance.csv:13,keep,,\ndistances.csv:13,correct,,x\ndistances.csv:9,leave_out,,\n",
        "utf-8",
    )
    said = []
    with pytest.raises(FieldDataError) as caught:
        read_job(TOWN, "decisions.csv")
    said += map(str, caught.value.mistakes)
    Path("decisions.csv").write_text("source,decision\ndistance.csv:13,keep\n", "utf-8")
    with pytest.raises(FieldDataError) as caught:
        read_job(TOWN, "decisions.csv")
    said += map(str, caught.value.mistakes)
    assert sorted(set(said)) == sorted(messages.strip().split("\n"))


def test_the_commands_of_the_pages_have_these_options() -> None:
    for page in (BLUNDERS, DECIDED):
        for line in re.findall(r"^hubtack (\w+) (.*)$", page, re.MULTILINE):
            command, rest = line
            assert set(re.findall(r"--[a-z]+", rest)) <= {"--write", "--decisions", "--out"}
            assert command in ("blunders", "adjust")

"""The reference page of the job folder says what the reader does."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from adjust import FieldDataError, read_job
from adjust.field_book.job_file import (
    DEFAULT_KEYS,
    DatumSection,
    FrameSection,
    Instrument,
    JobFile,
    StatisticsSection,
    Target,
    TolerancesSection,
)
from adjust.field_book.reference import refreshed
from adjust.field_book.schema import TABLES
from adjust.units import ANGLE_ENDINGS, LENGTH_ENDINGS
from tests.job_folders import write_folder

PAGE = (Path(__file__).parent.parent / "docs" / "job-folder.md").read_text(encoding="utf-8")


def files_under(heading: str) -> dict[str, str]:
    """The named code blocks of one chapter of the page."""
    chapter = PAGE.split(f"\n## {heading}\n")[1].split("\n## ")[0]
    return dict(re.findall(r"```\w+ (\S+)\n(.*?)```", chapter, re.DOTALL))


def test_tables_are_those_of_the_schema() -> None:
    assert refreshed(PAGE) == PAGE
    assert re.findall(r"<!-- table (\w+) -->", PAGE) == list(TABLES)


@pytest.mark.parametrize(
    "section", [JobFile, FrameSection, DatumSection, Instrument, StatisticsSection, Target, TolerancesSection]
)
def test_every_key_is_described(section: type[JobFile]) -> None:
    described = PAGE.split("\n## job.toml\n")[1].split("\n## ")[0]
    for key in section.model_fields:
        assert f"`{key}`" in described or f"`[{key}" in described, key
    for key in (*DEFAULT_KEYS, *TABLES):
        assert f"`{key}`" in described, key


def test_every_unit_is_described() -> None:
    for ending in (*LENGTH_ENDINGS, *ANGLE_ENDINGS):
        assert f"`_{ending}`" in PAGE


@pytest.mark.parametrize(
    ("heading", "rows"), [("A first job", 3), ("An example on the ellipsoid", 5), ("An example of raw readings", 7)]
)
def test_examples_can_be_read(heading: str, rows: int, tmp_path: Path) -> None:
    job = read_job(write_folder(tmp_path, files_under(heading)))
    assert sum(map(len, job.observations)) == rows
    assert job.notes == ()


def test_the_mistaken_example_is_answered_as_printed(tmp_path: Path) -> None:
    heading = "When something is wrong"
    printed = PAGE.split(f"\n## {heading}\n")[1].split("```text\n")[1].split("```")[0]
    with pytest.raises(FieldDataError) as caught:
        read_job(write_folder(tmp_path, files_under("A first job") | files_under(heading)))
    assert str(caught.value) == printed.rstrip("\n")

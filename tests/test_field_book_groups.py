"""Groups and instruments of rows: read from the tables, carried by reduced observations, written again."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from adjust import Job, read_job
from adjust.field_book.schema import TABLES, Quantity
from adjust.field_book.writing import write_job
from adjust.observations import Labels, Observations, concatenated
from tests.job_folders import PLANE, RAW, job_of, mistakes_of


def kind_of(job: Job, kind: str) -> Observations:
    return next(rows for rows in job.observations if rows.kind == kind)


def words(labels: Labels | None, rows: int) -> list[str]:
    return [""] * rows if labels is None else [labels.of(row) for row in range(rows)]


def with_column(text: str, title: str, cells: list[str]) -> str:
    """A table with a column more."""
    head, *rows = text.rstrip("\n").split("\n")
    filled = [f"{row},{cell}" for row, cell in zip(rows, cells, strict=True)]
    return "\n".join([f"{head},{title}", *filled]) + "\n"


def test_groups_stay_text_and_blank_ones_are_none(tmp_path: Path) -> None:
    cells = ["007", "7", "", "007", "night"]
    job = job_of(tmp_path, PLANE, {"directions.csv": with_column(PLANE["directions.csv"], "group", cells)})
    rows = kind_of(job, "direction")
    assert words(rows.provenance.group, len(rows)) == cells
    assert kind_of(job, "angle").provenance.group is None


def test_rows_carry_the_instrument_that_the_defaults_give_them(tmp_path: Path) -> None:
    job = job_of(tmp_path, PLANE)
    assert set(words(kind_of(job, "direction").provenance.instrument, 5)) == {"TS1"}
    levels = kind_of(job, "height_difference")
    assert set(words(levels.provenance.instrument, len(levels))) == {"NA2"}


def test_means_of_pointings_carry_the_group_of_their_setup(tmp_path: Path) -> None:
    table = RAW["pointings.csv"]
    cells = ["morning" if line.startswith("S1,") else "noon" for line in table.rstrip("\n").split("\n")[1:]]
    job = job_of(tmp_path, RAW, {"pointings.csv": with_column(table, "group", cells)})
    rows = kind_of(job, "direction")
    assert words(rows.provenance.group, len(rows)) == ["morning"] * 3 + ["noon"] * 2
    assert set(words(kind_of(job, "slope_distance").provenance.group, 1)) <= {"morning", "noon"}


def test_a_setup_in_two_groups_is_refused(tmp_path: Path) -> None:
    table = RAW["pointings.csv"]
    cells = ["a"] * (table.rstrip("\n").count("\n") - 1) + ["b"]
    found = mistakes_of(tmp_path, RAW, {"pointings.csv": with_column(table, "group", cells)})
    assert [mistake.column for mistake in found] == ["group"]
    assert "another group" in found[0].message


def test_sections_carry_the_group_of_their_line_and_a_line_has_one(tmp_path: Path) -> None:
    table = RAW["level_book.csv"]
    count = table.rstrip("\n").count("\n")
    job = job_of(tmp_path / "one", RAW, {"level_book.csv": with_column(table, "group", ["wet"] * count)})
    rows = kind_of(job, "height_difference")
    assert words(rows.provenance.group, len(rows)) == ["wet"] * len(rows)
    cells = ["wet", *["dry"] * (count - 1)]
    found = mistakes_of(tmp_path / "two", RAW, {"level_book.csv": with_column(table, "group", cells)})
    assert {mistake.column for mistake in found} == {"group"}


def test_groups_come_back_from_a_written_job(tmp_path: Path) -> None:
    cells = ["x", "", "y", "y", "x"]
    table = with_column(PLANE["directions.csv"], "group", cells)
    write_job(job_of(tmp_path / "first", PLANE, {"directions.csv": table}), tmp_path / "second")
    back = kind_of(read_job(tmp_path / "second"), "direction")
    assert words(back.provenance.group, 5) == cells


def test_words_of_parts_are_numbered_anew(tmp_path: Path) -> None:
    """Parts with words of their own, and one without any, below each other."""
    rows = kind_of(job_of(tmp_path, PLANE), "direction")
    count = len(rows)

    def grouped(*names: str) -> Observations:
        labels = Labels(names, np.arange(count) % (len(names) + 1) - 1)
        return replace(rows, provenance=replace(rows.provenance, group=labels))

    whole = concatenated([grouped("a", "b"), rows, grouped("b", "c")])
    expected = [*words(grouped("a", "b").provenance.group, count), *[""] * count]
    expected += words(grouped("b", "c").provenance.group, count)
    assert words(whole.provenance.group, 3 * count) == expected
    assert whole.take(np.arange(2 * count, 3 * count)).provenance.group is not None


@pytest.mark.parametrize("table", ["directions", "angles", "azimuths", "distances", "zeniths", "levels", "vectors"])
def test_every_table_of_observations_takes_a_group(table: str) -> None:
    assert TABLES[table].column("group").quantity is Quantity.TEXT

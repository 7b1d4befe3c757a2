"""Which rows are judged together, and what is said of them."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from adjust import Job, adjust, read_job
from adjust.field_book.writing import write_job
from adjust.observations import Labels, Observations, Provenance
from adjust.simulate import observe, total_station_net, triangulation_grid
from adjust.variance_components import VarianceComponent, variance_components
from adjust.variance_components.groups import LEAST_REDUNDANCY_OF_GROUP, find_groups
from tests.planted_variances import claimed, grouped


@pytest.fixture(scope="module")
def job() -> Job:
    return observe(triangulation_grid(np.random.default_rng(1)), np.random.default_rng(2))[0]


def in_files(rows: Observations, files: list[str]) -> Observations:
    names = tuple(dict.fromkeys(files))
    file = np.array([names.index(name) for name in files])
    return replace(rows, provenance=Provenance(names, file, np.arange(2, len(rows) + 2)))


def by_instruments(rows: Observations, instruments: list[str]) -> Observations:
    names = tuple(dict.fromkeys(instruments))
    number = np.array([names.index(name) for name in instruments])
    return replace(rows, provenance=replace(rows.provenance, instrument=Labels(names, number)))


def named(rows: Observations, redundancy: float = 0.5) -> list[str]:
    return [group.name for group in find_groups([rows], np.full(len(rows), redundancy))]


def halves(rows: Observations, first: str, second: str) -> list[str]:
    return [first] * (len(rows) // 2) + [second] * (len(rows) - len(rows) // 2)


def test_one_file_and_one_instrument_are_the_kind(job: Job) -> None:
    directions = job.observations[0]
    assert named(directions) == ["directions"]
    assert named(by_instruments(directions, ["TS1"] * len(directions))) == ["directions"]


def test_files_are_days(job: Job) -> None:
    directions = job.observations[0]
    assert named(in_files(directions, halves(directions, "day1.csv", "day2.csv"))) == [
        "directions, day1.csv",
        "directions, day2.csv",
    ]


def test_instruments_and_files_divide_together(job: Job) -> None:
    rows = in_files(job.observations[0], halves(job.observations[0], "day1.csv", "day2.csv"))
    count = len(rows)
    rows = by_instruments(rows, ["TS1" if row % 2 else "TS2" for row in range(count)])
    assert named(rows) == [
        "directions, TS2, day1.csv",
        "directions, TS1, day1.csv",
        "directions, TS1, day2.csv",
        "directions, TS2, day2.csv",
    ]


def test_a_group_wins_and_crosses_files(job: Job) -> None:
    rows = in_files(job.observations[0], halves(job.observations[0], "day1.csv", "day2.csv"))
    words = ["dusk" if row % 2 else "" for row in range(len(rows))]
    assert named(grouped(rows, words)) == ["directions, day1.csv", "directions, group dusk", "directions, day2.csv"]


def test_every_row_belongs_to_one_group(job: Job) -> None:
    rows = in_files(job.observations[0], halves(job.observations[0], "day1.csv", "day2.csv"))
    kinds = [grouped(rows, ["x" if row % 3 else "" for row in range(len(rows))]), job.observations[1]]
    count = sum(map(len, kinds))
    places = np.concatenate([group.rows for group in find_groups(kinds, np.full(count, 0.5))])
    np.testing.assert_array_equal(np.sort(places), np.arange(count))


def test_groups_that_are_too_small_are_put_together_and_named(job: Job) -> None:
    """Three days of four directions each, r = 0.5: 2 each, 6 together; the other rows are enough by themselves."""
    rows = job.observations[0]
    files = [f"day{row // 4}.csv" if row < 12 else "main.csv" for row in range(len(rows))]
    groups = find_groups([in_files(rows, files)], np.full(len(rows), 0.5))
    assert [group.name for group in groups] == ["directions, main.csv", "other directions"]
    assert groups[1].merged == tuple(f"directions, day{day}.csv" for day in range(3))
    np.testing.assert_array_equal(groups[1].rows, np.arange(12))


def test_a_kind_of_nothing_but_small_groups_is_one_group(job: Job) -> None:
    rows = job.observations[0].take(np.arange(12))
    groups = find_groups([in_files(rows, [f"day{row // 4}.csv" for row in range(12)])], np.full(12, 0.5))
    assert [group.name for group in groups] == ["directions"]


def test_days_that_differ_are_told_apart(tmp_path: Path) -> None:
    """Distances of a second day, three times as bad: written as two files of a job and read again."""
    generator = np.random.default_rng(7)
    plan = triangulation_grid(generator, 6, 6)
    job, _ = observe(plan, generator)
    worse, _ = observe(claimed(plan, {"horizontal_distance": 1 / 3}), generator)
    write_job(job, tmp_path)
    lines = (tmp_path / "distances.csv").read_text(encoding="utf-8").splitlines()
    write_job(claimed(worse, {"horizontal_distance": 3.0}), tmp_path)
    other = (tmp_path / "distances.csv").read_text(encoding="utf-8").splitlines()
    half = len(lines) // 2
    write_job(job, tmp_path)
    (tmp_path / "distances.csv").unlink()
    (tmp_path / "day1.csv").write_text("\n".join(lines[:half]) + "\n", encoding="utf-8")
    (tmp_path / "day2.csv").write_text("\n".join([other[0], *other[half:]]) + "\n", encoding="utf-8")
    with (tmp_path / "job.toml").open("a", encoding="utf-8") as file:
        file.write('\n[tables]\ndistances = ["day1.csv", "day2.csv"]\n')
    found = {component.name: component for component in variance_components(adjust(read_job(tmp_path)))}
    first, second = (found[f"horizontal distances, day{day}.csv"] for day in (1, 2))
    assert (first.file, second.file) == ("day1.csv", "day2.csv")
    assert not first.differs
    assert second.differs
    assert second.lower < 3.0 < second.upper


def component(**changes: object) -> VarianceComponent:
    usual = {
        "name": "zenith angles",
        "kind": "zenith",
        "instrument": None,
        "file": None,
        "group": None,
        "merged": (),
        "observations": 40,
        "redundancy": 25.0,
        "factor": 1.8,
        "sd": 0.2,
        "lower": 1.5,
        "upper": 2.3,
        "confidence": 0.95,
        "left_out": (),
    }
    return VarianceComponent(**{**usual, **changes})  # type: ignore[arg-type]


def test_sentences() -> None:
    nothing = "Too little checks the zenith angles to say how well their sds were stated."
    for expected, changes in (
        ("The zenith angles behave as 1.80 × worse than stated (factor between 1.50 and 2.30).", {}),
        (
            "The zenith angles behave as 2.00 × better than stated (factor between 0.40 and 0.70).",
            {"factor": 0.5, "lower": 0.4, "upper": 0.7},
        ),
        (
            "The zenith angles agree with their stated sds (factor 1.10, between 0.90 and 1.40).",
            {"factor": 1.1, "lower": 0.9, "upper": 1.4},
        ),
        (nothing, {"factor": float("nan")}),
        (nothing, {"lower": 0.01, "upper": 0.9}),
        (
            "The zenith angles behave as 12 × worse than stated (factor between 10 and 15). "
            "Judged together, being too few each: a; b. Without 1 zenith angle too far off: zeniths.csv:7.",
            {"factor": 12.2, "lower": 10.1, "upper": 15.4, "merged": ("a", "b"), "left_out": ("zeniths.csv:7",)},
        ),
    ):
        assert component(**changes).sentence == expected


def test_too_few_to_say_anything_of_are_not_estimated() -> None:
    """One weighted mark in a GNSS network checks its coordinates against nothing but themselves."""
    job, _ = observe(total_station_net(np.random.default_rng(3), 2, 2), np.random.default_rng(4))
    for found in variance_components(adjust(job)):
        assert found.estimated == (not np.isnan(found.sd))
        if found.redundancy < LEAST_REDUNDANCY_OF_GROUP / 2:
            assert not found.differs

"""`hubtack reduce`: the reduced job adjusts as the raw one does, and the reports say what was found."""

import json
import tempfile
from pathlib import Path

import numpy as np
import pytest

from adjust import adjust, read_job
from adjust.reports.reduction_text import listed_reduction, reduction_text
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_pointings import Habits
from adjust.units import ARCSEC
from cli.main import run
from tests.job_folders import PLANE, RAW, changed, write_folder
from tests.studies.raw_readings import invented_plan

SAME = 1e-6
"""Metres: 0.001 mm."""


@pytest.fixture(scope="module")
def raw(tmp_path_factory):
    generator = np.random.default_rng(11)
    folder = tmp_path_factory.mktemp("raw")
    habits = Habits(missing=0.3, single=0.1, closes_horizon=True, eccentricity=0.0)
    read_by_a_party(invented_plan(generator), generator, habits).folder.write(folder)
    return folder


@pytest.fixture(scope="module")
def reduced(raw, tmp_path_factory):
    folder = tmp_path_factory.mktemp("reduced")
    assert run(["reduce", str(raw), "--out", str(folder)]) == 0
    return folder


def test_reduced_job_adjusts_as_the_raw_one(raw, reduced):
    of_raw, of_reduced = adjust(read_job(raw)), adjust(read_job(reduced))
    assert of_raw.job.marks.names == of_reduced.job.marks.names
    np.testing.assert_allclose(of_reduced.coordinates, of_raw.coordinates, rtol=0, atol=SAME)
    statistics = [result.solution.global_test.statistic for result in (of_raw, of_reduced)]
    assert statistics[0] == pytest.approx(statistics[1], rel=0, abs=1e-6)
    np.testing.assert_allclose(of_reduced.standard_deviations, of_raw.standard_deviations, rtol=0, atol=1e-9)  # m


def test_reduced_job_of_many_corrections_reads_back(tmp_path):
    """Heights, targets, centring of each kind, a side shot, single faces: all rows equal."""
    raw = write_folder(tmp_path / "raw", RAW)
    assert run(["reduce", str(raw), "--out", str(tmp_path / "out")]) == 0
    for first, second in zip(read_job(raw).observations, read_job(tmp_path / "out").observations, strict=True):
        np.testing.assert_array_equal(first.marks, second.marks)
        np.testing.assert_allclose(second.observed, first.observed, rtol=0, atol=1e-12)
        heights = ("heights",) if first.kind in ("slope_distance", "zenith") else ()
        for part in ("centring", "target_centring", "proportional", *heights):
            expected = getattr(first.precision, part)
            np.testing.assert_allclose(getattr(second.precision, part), expected, rtol=0, atol=1e-15)


def test_files_and_summary(raw, tmp_path, capsys):
    assert run(["reduce", str(raw), "--out", str(tmp_path)]) == 0
    said = capsys.readouterr().out
    assert said.startswith(
        "Raw readings made 46 directions, 46 zenith angles, 23 slope distances, 8 height differences."
    )
    assert {"job.toml", "marks.csv", "directions.csv", "distances.csv", "zeniths.csv", "levels.csv"} < {
        path.name for path in tmp_path.iterdir()
    }


def test_default_folder_lies_in_the_job(tmp_path):
    write_folder(tmp_path, RAW)
    assert run(["reduce", str(tmp_path / "job.toml")]) == 0
    assert (tmp_path / "reduced" / "reduction.json").exists()


def test_records_name_their_readings(reduced):
    records = json.loads((reduced / "reduction.json").read_text("utf-8"))
    assert records["schema"] == "hubtack-reduction/1"
    assert {record["kind"]: record["means"] for record in records["spreads"]} == {
        "directions": 46,
        "zeniths": 46,
        "slopes": 23,
    }
    errors = [record["error_arcsec"] for record in records["collimations"]]
    assert np.mean(errors) == pytest.approx(9.0, rel=0, abs=4 * 1.5 / np.sqrt(len(errors)))  # ″, 4 standard errors
    indices = [record["error_arcsec"] for record in records["indices"]]
    assert np.mean(indices) == pytest.approx(-14.0, rel=0, abs=4 * 2.0 / np.sqrt(len(indices)))  # ″, 4 standard errors
    assert all(record["source"].startswith("pointings.csv:") for record in records["directions_scatter"])
    assert all(abs(record["difference_mm"]) < 1e-6 for record in records["lines"])
    assert len(records["sections"]) == 8
    assert records["both_ends"] == []  # the plan measures each line from one end
    assert len(records["horizons"]) == len({record["source"] for record in records["horizons"]}) > 0


def test_output_is_the_same_to_the_byte(raw, reduced, tmp_path):
    run(["reduce", str(raw), "--out", str(tmp_path)])
    for path in sorted(reduced.iterdir()):
        if path.is_file():
            assert (tmp_path / path.name).read_bytes() == path.read_bytes()


def test_circle_that_slipped_is_status_1(tmp_path, capsys):
    """One reading of the second round 10′ off: the spread of the rounds says so."""
    slipped = changed("pointings.csv", "153-28-15", "153-38-15", RAW)
    assert run(["reduce", str(write_folder(tmp_path, slipped))]) == 1
    assert "Scatter beyond what the job file states: directions" in capsys.readouterr().out


def test_unusable_field_data_is_status_2(tmp_path, capsys):
    broken = changed("pointings.csv", "153-28-15", "153-68-15", RAW)
    assert run(["reduce", str(write_folder(tmp_path, broken))]) == 2
    assert "pointings.csv:9: circle_dms: read '153-68-15' with 68 minutes" in capsys.readouterr().err
    assert not (tmp_path / "reduced").exists()


def test_folder_with_other_tables_is_refused(tmp_path, capsys):
    write_folder(tmp_path, RAW)
    assert run(["reduce", str(tmp_path), "--out", str(tmp_path)]) == 2
    assert "would be read as part of the reduced job" in capsys.readouterr().err
    assert (tmp_path / "job.toml").read_text("utf-8") == RAW["job.toml"]


def test_text_for_people(raw):
    lines = reduction_text(read_job(raw))
    text = "\n".join(lines)
    for heading in (
        "Pointings",
        "Horizon closures, largest first",
        "Level lines: arithmetic check",
        "Sections between",
    ):
        assert heading in text
    assert max(map(len, lines)) <= 100


def test_listing_has_a_section_only_for_raw_jobs(raw, tmp_path):
    assert "Raw readings" in listed_reduction(read_job(raw))
    assert listed_reduction(read_job(write_folder(tmp_path, PLANE))) == []


def test_reduced_tables_of_a_reduced_job_are_itself(tmp_path, capsys):
    write_folder(tmp_path / "job", PLANE)
    assert run(["reduce", str(tmp_path / "job"), "--out", str(tmp_path / "out")]) == 0
    assert "no raw readings" in capsys.readouterr().out
    assert len(read_job(tmp_path / "out").observations) == len(read_job(tmp_path / "job").observations)


def test_true_collimation_is_found_in_every_setup():
    """Mean over a setup's pairs within 4 of its own standard errors, twelve setups."""
    generator = np.random.default_rng(12)
    plan = invented_plan(generator)
    job_folder = read_by_a_party(plan, generator, Habits(missing=0.0, eccentricity=0.0), states_errors=False).folder
    with tempfile.TemporaryDirectory() as folder:
        job_folder.write(Path(folder))
        errors = read_job(folder).reduction.pointings.directions.errors
    pairs = np.bincount(errors.setup)
    mean = np.bincount(errors.setup, errors.error) / pairs
    assert np.all(np.abs(mean - 9 * ARCSEC) < 4 * 1.5 * ARCSEC / np.sqrt(pairs))

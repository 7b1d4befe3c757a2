"""A job written to a folder reads back as the same job."""

from __future__ import annotations

import tomllib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust import Job, read_job
from adjust.field_book.cells import EXACT, Style, table_text
from adjust.field_book.tolerances import OWN_FIGURES
from adjust.field_book.toml_text import toml_text
from adjust.field_book.writing import describe_job, write_job
from adjust.frames import GeoidGrid, PlaneFrame
from adjust.job import Datum, Statistics
from adjust.observations import HeightDifferences, Observations
from adjust.simulate import NETWORKS, observe, true_geometry
from adjust.simulate.demos import DEMOS
from adjust.tolerances import STANDARDS
from adjust.units import ARCSEC, DEGREE
from tests.building import build_job

FIELD_DATA = Path(__file__).parent.parent / "field_data"
RADIANS = 1e-14  # rad: a degree value of up to 360 has lost this much by conversion at most
METRES = 1e-9  # m: millions of metres in double precision
OWN_QUANTITIES = {figure.quantity for figure in OWN_FIGURES}


def measured(name: str, seed: int = 1) -> tuple[Job, Job]:
    """An invented job and its plan, whose given coordinates are the true ones."""
    plan = NETWORKS[name](np.random.default_rng(seed))
    return observe(plan, np.random.default_rng(seed + 1))[0], plan


def through_a_folder(job: Job, folder: Path, style: Style = EXACT) -> Job:
    write_job(job, folder, style)
    return read_job(folder)


def kinds(job: Job) -> list[Observations]:
    return list(job.observations)


@pytest.mark.parametrize("name", NETWORKS)
def test_values_come_back(name: str, tmp_path: Path) -> None:
    job, _ = measured(name)
    back = through_a_folder(job, tmp_path)
    assert [rows.kind for rows in back.observations] == [rows.kind for rows in job.observations]
    for rows, again in zip(job.observations, back.observations, strict=True):
        np.testing.assert_array_equal(again.marks, rows.marks)
        assert list(map(again.provenance.label, range(len(again)))) == list(
            map(rows.provenance.label, range(len(rows)))
        )
        tolerance = RADIANS if rows.unit == "rad" else METRES
        np.testing.assert_allclose(again.observed, rows.observed, rtol=0, atol=tolerance)


@pytest.mark.parametrize("name", NETWORKS)
def test_precision_comes_back(name: str, tmp_path: Path) -> None:
    job, plan = measured(name)
    back = through_a_folder(job, tmp_path)
    geometry = true_geometry(plan)
    for rows, again in zip(job.observations, back.observations, strict=True):
        ratio = again.covariance(geometry) / rows.covariance(geometry)
        np.testing.assert_allclose(ratio, 1.0, rtol=0, atol=1e-12)  # covariances relative to each other


@pytest.mark.parametrize("name", NETWORKS)
def test_marks_come_back(name: str, tmp_path: Path) -> None:
    job, _ = measured(name)
    back = through_a_folder(job, tmp_path)
    assert back.marks.names == job.marks.names
    np.testing.assert_array_equal(back.marks.control, job.marks.control)
    start = np.where(np.isnan(job.marks.given), 0.0, job.marks.given)
    end = np.where(np.isnan(back.marks.given), 0.0, back.marks.given)
    np.testing.assert_allclose(job.frame.displacement(start, end), 0.0, rtol=0, atol=5e-9)  # m: 17 digits of a latitude
    np.testing.assert_array_equal(np.isnan(back.marks.given), np.isnan(job.marks.given))
    np.testing.assert_allclose(back.marks.sd, job.marks.sd, rtol=0, atol=METRES)
    np.testing.assert_allclose(back.marks.geoid, job.marks.geoid, rtol=0, atol=METRES)
    np.testing.assert_allclose(back.marks.deflection, job.marks.deflection, rtol=0, atol=RADIANS)


@pytest.mark.parametrize("name", NETWORKS)
def test_rounds_and_settings_come_back(name: str, tmp_path: Path) -> None:
    job, _ = measured(name)
    statistics = Statistics(confidence=0.99, significance=0.01, power=0.9, sd_basis="posterior")
    job = replace(job, statistics=statistics, refraction_coefficient=0.2, date="2026-05-11")
    back = through_a_folder(job, tmp_path)
    for field in ("title", "frame", "setups", "date", "datum", "statistics", "orthometric", "refraction_coefficient"):
        assert getattr(back, field) == getattr(job, field)
    for rows, again in zip(job.observations, back.observations, strict=True):
        if rows.setup is not None:
            np.testing.assert_array_equal(again.setup, rows.setup)


def test_rows_out_of_use_stay_in_the_books(tmp_path: Path) -> None:
    job, _ = measured("traverses")
    directions, distances = job.observations
    kept = np.arange(len(distances)) != 4
    job = replace(job, observations=(directions, distances.take(kept)), left_out=(distances.take(~kept),))
    back = through_a_folder(job, tmp_path)
    np.testing.assert_array_equal(back.observations[1].observed, job.observations[1].observed)
    np.testing.assert_array_equal(back.left_out[0].observed, job.left_out[0].observed)
    np.testing.assert_array_equal(back.left_out[0].marks, job.left_out[0].marks)


def test_inner_constraints_name_their_marks(tmp_path: Path) -> None:
    job, _ = measured("levelling")
    job = replace(job, datum=Datum("inner", (2, 5, 7)))
    assert through_a_folder(job, tmp_path).datum == job.datum


def test_flat_plane_frame(tmp_path: Path) -> None:
    job = replace(measured("traverses")[0], frame=PlaneFrame(earth_curvature=False))
    assert through_a_folder(job, tmp_path).frame == job.frame


def test_geoid_grid_goes_along(tmp_path: Path) -> None:
    grid = tmp_path / "away" / "geoid.tif"
    grid.parent.mkdir()
    grid.write_bytes(b"any content: writing does not look into it")
    job = replace(measured("GNSS")[0], geoid_grid=GeoidGrid(grid))
    write_job(job, tmp_path / "job")
    assert (tmp_path / "job" / "geoid.tif").read_bytes() == grid.read_bytes()
    assert tomllib.loads((tmp_path / "job" / "job.toml").read_text())["frame"]["geoid_grid"] == "geoid.tif"


@pytest.mark.parametrize("name", ["0012", "A,B", 'say "peg"', "#3", "Ö 7", "it's; here", "1e5", "nan"])
def test_names_stay_text(name: str, tmp_path: Path) -> None:
    job = build_job({name: (None, None, 5.0), "B": None}, fixed=[name], levels=[(name, "B", 1.25)])
    assert through_a_folder(job, tmp_path).marks.names == (name, "B")


def test_rows_on_an_instrument_name_it() -> None:
    job, _ = measured("traverses")
    keys = {"direction_arcsec": 1.5, "distance_mm": 1.0, "distance_ppm": 1.5}
    keys |= {"centring_mm": 0.5, "target_centring_mm": 0.5, "height_mm": 0.5}
    written = describe_job(job, instruments={"TS9": keys, "old": {"distance_mm": 5.0}})
    assert set(written.tables["directions"]["instrument"]) == {"TS9"}
    assert written.job_file["instruments"] == {"TS9": keys, "old": {"distance_mm": 5.0}}


def test_default_instrument_needs_no_column() -> None:
    job, _ = measured("traverses")
    keys = {"direction_arcsec": 1.5, "centring_mm": 0.5, "target_centring_mm": 0.5}
    written = describe_job(job, instruments={"T": keys}, defaults={"instrument": "T"})
    assert "instrument" not in written.tables["directions"]
    assert "sd_arcsec" not in written.tables["directions"]


def test_instruments_are_described_where_none_is_given(tmp_path: Path) -> None:
    job, plan = measured("traverses")
    distances = job.observations[1]
    worse = replace(distances.precision, constant=np.where(np.arange(len(distances)) < 4, 0.005, 0.001))
    job = replace(job, observations=(job.observations[0], replace(distances, precision=worse)))
    back = through_a_folder(job, tmp_path)
    expected = job.observations[1].covariance(true_geometry(plan))
    np.testing.assert_allclose(
        back.observations[1].covariance(true_geometry(plan)),
        expected,
        rtol=0,
        atol=1e-15,  # m²: a thousandth of 1 mm²
    )


def test_a_levelled_line_on_an_instrument_states_its_sd(tmp_path: Path) -> None:
    job, _ = measured("levelling")
    rows = kinds(job)[0]
    assert isinstance(rows, HeightDifferences)
    sd = rows.precision.stated
    modelled = replace(rows, precision=replace(rows.precision, stated=np.full_like(sd, np.nan), constant=sd))
    back = through_a_folder(replace(job, observations=(modelled,)), tmp_path).observations[0]
    assert isinstance(back, HeightDifferences)
    np.testing.assert_allclose(back.precision.stated, sd, rtol=0, atol=1e-15)  # m


def test_a_surveyors_style_rounds(tmp_path: Path) -> None:
    job, _ = measured("total station, ellipsoid")
    style = Style({"direction": 1, "slope": 4}, sexagesimal=True, grid=True)
    back = through_a_folder(job, tmp_path, style)
    head, row = (tmp_path / "directions.csv").read_text().splitlines()[:2]
    assert head == "setup,at,to,direction_dms"
    assert row.rpartition(".")[2].isdigit()
    assert len(row.rpartition(".")[2]) == 1
    for rows, again, rounding in zip(kinds(job)[:2], kinds(back)[:2], (0.05 * ARCSEC, 5e-5), strict=True):
        assert 0 < np.abs(again.observed - rows.observed).max() <= rounding * (1 + 1e-9)
    assert (tmp_path / "marks.csv").read_text().startswith("mark,easting_m,northing_m,height_m")


@pytest.mark.parametrize(("sexagesimal", "cells"), [(True, ["0-00-00.0", "359-59-59.9"]), (False, ["0.0", "359.9"])])
def test_what_rounds_up_to_a_whole_turn_is_zero(sexagesimal: bool, cells: list[str]) -> None:
    unit = ARCSEC if sexagesimal else DEGREE
    style = Style({"direction": 1}, sexagesimal=sexagesimal)
    angles = 2 * np.pi - np.array([0.04, 0.06]) * unit
    assert list(style.angle("direction", angles, full_circle=True).values()) == [cells]


@pytest.mark.parametrize("name", DEMOS)
def test_demonstrations_come_back(name: str, tmp_path: Path) -> None:
    """Several files for a table, instruments, descriptions with commas, vectors with correlations."""
    job = read_job(FIELD_DATA / name)
    back = through_a_folder(job, tmp_path)
    assert back.marks.descriptions == job.marks.descriptions
    assert (back.title, back.date, back.orthometric) == (job.title, job.date, job.orthometric)
    for rows, again in zip(job.observations, back.observations, strict=True):
        tolerance = RADIANS if rows.unit == "rad" else METRES
        np.testing.assert_allclose(again.observed, rows.observed, rtol=0, atol=tolerance)
        np.testing.assert_array_equal(again.marks, rows.marks)


def test_sexagesimal_angles_come_back(tmp_path: Path) -> None:
    job, _ = measured("total station, ellipsoid")
    back = through_a_folder(job, tmp_path, Style(sexagesimal=True))
    np.testing.assert_allclose(back.observations[0].observed, job.observations[0].observed, rtol=0, atol=RADIANS)


def test_correlations_come_back(tmp_path: Path) -> None:
    job, plan = measured("GNSS")
    back = through_a_folder(job, tmp_path, Style(correlations=True))
    geometry = true_geometry(plan)
    np.testing.assert_allclose(
        back.observations[0].covariance(geometry),
        job.observations[0].covariance(geometry),
        rtol=0,
        atol=1e-18,  # m²: variances are about 1e-5 m²
    )


def test_a_foreign_table_is_not_swallowed(tmp_path: Path) -> None:
    (tmp_path / "levels.csv").write_text("from,to,rise_m\n")
    with pytest.raises(FileExistsError, match=r"levels\.csv"):
        write_job(measured("traverses")[0], tmp_path)
    assert not (tmp_path / "job.toml").exists()


def test_comments_stand_above_the_header() -> None:
    assert table_text({"mark": ["A"]}, ["by foot"]) == "# by foot\nmark\nA\n"


@given(st.text(), st.text(st.characters(codec="utf-8"), min_size=1), st.floats(allow_nan=False, allow_infinity=False))
def test_toml_reads_back(text: str, key: str, number: float) -> None:
    text = text.encode("utf-8", "replace").decode()
    content = {key: text, "section": {"number": number, "list": [text, "b"], "yes": True, key: {"deep": 3}}}
    assert tomllib.loads(toml_text(content)) == content


@given(st.lists(st.floats(-1e7, 1e7), min_size=1))
def test_lengths_come_back_within_a_unit_in_the_last_place(lengths: list[float]) -> None:
    values = np.array(lengths)
    read = np.array(EXACT.length("sd", values, "mm")["sd_mm"], dtype=float) * 1e-3
    assert np.all(np.abs(read - values) <= np.spacing(np.abs(values)))


TOLERANCES = """
standard = "ordinary"
faces_arcsec = 12.5
level_runs_mm_per_sqrt_km = 4
level_loops_mm_per_sqrt_km = 7.3
angles_arcsec_per_sqrt_n = 10
triangles_arcsec = 9
station_arcsec = 8
position_ratio = 15000
position_mm_per_sqrt_km = 30
distances_mm = 5
distances_ppm = 0
vectors_mm = 0
vectors_ppm = 2.5
sd_factor = 2.5
confidence = 0.99
instrument_height_m = [0.8, 2.1]
target_height_m = [0.0, 5]
same_mark_m = 0.05
"""
SPECIFICATION = """
horizontal_mm = 10
height_mm = 7.5
relative_mm = 3
relative_ppm = 12
height_difference_ppm = 4
pairs = "all"
marks = ["B", "A"]
"""


def test_tolerances_and_specification_come_back(tmp_path: Path) -> None:
    """The figures agree within the 12 digits that are written."""
    standard = next(iter(STANDARDS))
    (tmp_path / "job.toml").write_text(
        f"[tolerances]{TOLERANCES.replace('ordinary', standard)}\n[specification]{SPECIFICATION}", "utf-8"
    )
    (tmp_path / "marks.csv").write_text("mark,height_m,height_control\nA,1,fixed\nB,,\n", "utf-8")
    (tmp_path / "levels.csv").write_text("from,to,rise_m,sd_mm\nA,B,1,1\n", "utf-8")
    job = read_job(tmp_path)
    back = through_a_folder(job, tmp_path / "again")
    assert back.specification == job.specification
    assert job.specification.own
    assert job.specification.marks == (1, 0)
    assert replace(back.tolerances, own={}) == replace(job.tolerances, own={})
    assert back.tolerances.own.keys() == job.tolerances.own.keys() == OWN_QUANTITIES
    for quantity, rules in job.tolerances.own.items():
        for rule, again in zip(rules, back.tolerances.own[quantity], strict=True):
            assert again.printed == rule.printed
            for part in ("constant", "per_root", "proportional"):
                assert getattr(again, part) == pytest.approx(getattr(rule, part), rel=1e-11, abs=0)

"""A job folder becomes the job it describes: values, precision, control, what is left out."""

from __future__ import annotations

from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from adjust import Job, read_job
from adjust.frames import EllipsoidFrame, PlaneFrame
from adjust.job import Control
from adjust.observations import Directions, Observations, SlopeDistances, Vectors
from adjust.units import ARCSEC, DEGREE, GON
from tests.job_folders import ELLIPSOID, PLANE, changed, job_of, write_folder

RADIANS = 1e-14  # rad: rounding of a full circle
METRES = 1e-12  # m: rounding of some hundred metres


def kind_of(job: Job, kind: str) -> Observations:
    return next(rows for rows in job.observations if rows.kind == kind)


COMPARED = ("frame", "marks", "observations", "setups", "date", "datum", "statistics", "orthometric", "left_out")


def plain(value: Any) -> Any:
    """Nested dataclasses as dictionaries, without where rows came from."""
    if is_dataclass(value):
        return {part.name: plain(getattr(value, part.name)) for part in fields(value) if part.name != "provenance"}
    return [type(value), *map(plain, value)] if isinstance(value, tuple) else value


def assert_same_jobs(one: Job, other: Job) -> None:
    """Equal but for title, notes, fingerprint and where rows came from."""
    for part in COMPARED:
        np.testing.assert_equal(plain(getattr(one, part)), plain(getattr(other, part)), err_msg=part)


def test_every_kind_is_read(tmp_path: Path) -> None:
    job = job_of(tmp_path, PLANE)
    assert [(rows.kind, len(rows)) for rows in job.observations] == [
        ("direction", 5),
        ("angle", 1),
        ("azimuth", 1),
        ("slope_distance", 2),
        ("zenith", 1),
        ("height_difference", 2),
    ]
    assert (job.title, job.date, job.frame) == ("Plane test job", "2026-04-18", PlaneFrame(earth_curvature=True))
    assert job.notes == ()


def test_a_job_is_named_by_its_folder_or_its_file(tmp_path: Path) -> None:
    folder = write_folder(tmp_path / "dam", PLANE | {"job.toml": PLANE["job.toml"].partition("\n")[2]})
    assert_same_jobs(read_job(folder), read_job(str(folder / "job.toml")))
    assert read_job(folder).input_sha256 == read_job(folder / "job.toml").input_sha256
    assert read_job(folder).title == "dam"


def test_values_in_radians_and_metres(tmp_path: Path) -> None:
    job = job_of(tmp_path, PLANE)
    directions = kind_of(job, "direction")
    expected = (303 + 41 / 60 + 24.2 / 3600) * DEGREE
    assert directions.observed[1, 0] == pytest.approx(expected, rel=0, abs=RADIANS)
    assert kind_of(job, "angle").observed[0, 0] == pytest.approx(62.5666 * GON, rel=0, abs=RADIANS)
    assert kind_of(job, "azimuth").observed[0, 0] == pytest.approx(71.5651 * DEGREE, rel=0, abs=RADIANS)
    assert kind_of(job, "slope_distance").observed[1, 0] == 316.2346
    assert kind_of(job, "height_difference").observed[0, 0] == 1.0002


def test_rows_know_their_marks_and_their_lines(tmp_path: Path) -> None:
    job = job_of(tmp_path, changed("angles.csv", "002,001,A", "# a comment\n\n002,001,A"))
    angles = kind_of(job, "angle")
    assert [job.marks.names[mark] for mark in angles.marks[0]] == ["002", "001", "A"]
    assert angles.provenance.label(0) == "angles.csv:4"
    assert job.marks.provenance.label(2) == "marks.csv:4"


def test_setups_are_numbered_as_they_come(tmp_path: Path) -> None:
    job = job_of(tmp_path, PLANE)
    directions = kind_of(job, "direction")
    assert job.setups == ("S1", "S2")
    np.testing.assert_array_equal(directions.setup, [0, 0, 0, 1, 1])


def test_the_same_target_twice_in_one_setup(tmp_path: Path) -> None:
    job = job_of(tmp_path, changed("directions.csv", "S2,A,001,0-00-00.0", "S2,A,001,0-00-00.0\nS2,A,001,0-00-01.0"))
    assert len(kind_of(job, "direction")) == 6


def test_names_stay_text(tmp_path: Path) -> None:
    table = "mark,height_m,height_control\n007,1,fixed\n7,,\n7.0,,\n1e2,,\nnan,,\n"
    levels = "from,to,rise_m,sd_mm\n007,7,1,1\n7,7.0,1,1\n7.0,1e2,1,1\n1e2,nan,1,1\n"
    job = job_of(tmp_path, {"job.toml": "", "marks.csv": table, "levels.csv": levels})
    assert job.marks.names == ("007", "7", "7.0", "1e2", "nan")


# Precision: sd² of an instrument's row as the job file's comments state it (docs/job-folder.md).


def test_instrument_columns(tmp_path: Path) -> None:
    precision = kind_of(job_of(tmp_path, PLANE), "slope_distance").precision
    np.testing.assert_allclose(precision.constant, 0.001, rtol=1e-15)
    np.testing.assert_allclose(precision.proportional, 1.5e-6, rtol=1e-15)
    np.testing.assert_allclose(precision.centring, 0.0004, rtol=1e-15)
    np.testing.assert_allclose(precision.target_centring, 0.0006, rtol=1e-15)
    np.testing.assert_allclose(precision.heights, 0.0005, rtol=1e-15)
    assert np.isnan(precision.stated).all()


def test_an_angle_is_the_difference_of_two_directions(tmp_path: Path) -> None:
    assert kind_of(job_of(tmp_path / "1", PLANE), "angle").precision.constant[0] == pytest.approx(
        1.5 * ARCSEC * np.sqrt(2), rel=1e-15
    )
    stated = changed("job.toml", "direction_arcsec = 1.5", "direction_arcsec = 1.5\nangle_arcsec = 1.8")
    assert kind_of(job_of(tmp_path / "2", stated), "angle").precision.constant[0] == pytest.approx(
        1.8 * ARCSEC, rel=1e-15
    )


def test_an_azimuth_is_as_good_as_a_direction_unless_stated(tmp_path: Path) -> None:
    without_sd = changed("azimuths.csv", ",sd_arcsec\nA,B,71.5651,3", "\nA,B,71.5651")
    azimuths = kind_of(job_of(tmp_path / "1", without_sd), "azimuth")
    assert azimuths.precision.constant[0] == pytest.approx(1.5 * ARCSEC, rel=1e-15)
    job_file = PLANE["job.toml"].replace("zenith_arcsec", "azimuth_arcsec = 5\nzenith_arcsec")
    azimuths = kind_of(job_of(tmp_path / "2", {**without_sd, "job.toml": job_file}), "azimuth")
    assert azimuths.precision.constant[0] == pytest.approx(5 * ARCSEC, rel=1e-15)


def test_levelling_by_length_and_by_setups(tmp_path: Path) -> None:
    by_length = kind_of(job_of(tmp_path / "1", PLANE), "height_difference").precision.constant
    np.testing.assert_allclose(by_length, 0.0007 * np.sqrt([0.4, 0.5]), rtol=1e-15)
    tables = {
        "job.toml": PLANE["job.toml"].replace("per_sqrt_km = 0.7", "per_setup = 0.2"),
        "levels.csv": "from,to,rise_m,setups\n001,A,1,4\nA,B,2,9\n",
    }
    by_setups = kind_of(job_of(tmp_path / "2", PLANE, tables), "height_difference").precision.constant
    np.testing.assert_allclose(by_setups, [0.0004, 0.0006], rtol=1e-15)


def test_a_rows_own_sd_wins(tmp_path: Path) -> None:
    precision = kind_of(job_of(tmp_path, PLANE), "azimuth").precision
    assert precision.stated[0] == pytest.approx(3 * ARCSEC, rel=1e-15)


def test_a_rows_own_instrument_wins_over_the_defaults(tmp_path: Path) -> None:
    tables = {
        "job.toml": PLANE["job.toml"] + "[instruments.old]\nlevel_mm_per_sqrt_km = 2.0\n",
        "levels.csv": "from,to,rise_m,length_km,instrument\n001,A,1,1,old\nA,B,2,1,\n",
    }
    constant = kind_of(job_of(tmp_path, PLANE, tables), "height_difference").precision.constant
    np.testing.assert_allclose(constant, [0.002, 0.0007], rtol=1e-15)


def test_an_instrument_may_state_ppm_alone(tmp_path: Path) -> None:
    precision = kind_of(job_of(tmp_path, changed("job.toml", "distance_mm = 1.0\n", "")), "slope_distance").precision
    np.testing.assert_array_equal(precision.constant, [0.0, 0.0])
    np.testing.assert_allclose(precision.proportional, 1.5e-6, rtol=1e-15)


# Observations of particular make.


def test_instrument_and_target_heights(tmp_path: Path) -> None:
    distances = kind_of(job_of(tmp_path, PLANE), "slope_distance")
    assert isinstance(distances, SlopeDistances)
    np.testing.assert_array_equal(distances.heights, [[1.55, 1.60], [1.52, 1.60]])


def test_a_missing_target_height_is_said(tmp_path: Path) -> None:
    job = job_of(tmp_path, changed("distances.csv", "001,A,360.5567,1.55,1.60", "001,A,360.5567,1.55,"))
    distances = kind_of(job, "slope_distance")
    assert isinstance(distances, SlopeDistances)
    np.testing.assert_array_equal(distances.heights[0], [1.55, 0.0])
    assert any("1 of 2 rows lack an instrument or target height" in note for note in job.notes)


def test_slope_and_horizontal_distances_share_a_table(tmp_path: Path) -> None:
    table = "at,to,slope_m,horizontal_ft\n001,A,360.5567,\nA,B,,1000\n"
    job = job_of(tmp_path, PLANE, {"distances.csv": table})
    assert kind_of(job, "slope_distance").observed.tolist() == [[360.5567]]
    horizontal = kind_of(job, "horizontal_distance")
    assert horizontal.observed[0, 0] == pytest.approx(304.8, rel=0, abs=METRES)
    assert horizontal.provenance.label(0) == "distances.csv:3"


def test_vectors_by_sds_and_correlations(tmp_path: Path) -> None:
    vectors = kind_of(job_of(tmp_path, ELLIPSOID), "vector")
    assert isinstance(vectors, Vectors)
    np.testing.assert_array_equal(vectors.observed, [[-521.540, 930.331, 337.251]])
    expected = 1e-6 * np.array([[25, 4, 15], [4, 16, 7.2], [15, 7.2, 36]])
    np.testing.assert_allclose(vectors.covariances[0], expected, rtol=1e-14)


def test_vectors_by_covariances(tmp_path: Path) -> None:
    table = (
        "from,to,dx_m,dy_m,dz_m,cov_xx_m2,cov_xy_m2,cov_xz_m2,cov_yy_m2,cov_yz_m2,cov_zz_m2,session\n"
        "P1,P2,-521.540,930.331,337.251,25e-6,4e-6,15e-6,16e-6,7.2e-6,36e-6,107a\n"
    )
    by_sd = kind_of(job_of(tmp_path / "1", ELLIPSOID), "vector")
    by_covariance = kind_of(job_of(tmp_path / "2", ELLIPSOID, {"vectors.csv": table}), "vector")
    assert isinstance(by_sd, Vectors)
    assert isinstance(by_covariance, Vectors)
    np.testing.assert_allclose(by_sd.covariances, by_covariance.covariances, rtol=1e-14)


# Rows left out.


def test_rows_left_out_stay_in_the_book(tmp_path: Path) -> None:
    table = "from,to,rise_m,length_km,use\n001,A,1.0,0.4,yes\nA,B,2.0,0.5,no\nA,B,2.1,0.5,\n"
    job = job_of(tmp_path, PLANE, {"levels.csv": table})
    assert kind_of(job, "height_difference").observed.tolist() == [[1.0], [2.1]]
    assert [(rows.kind, rows.observed.tolist()) for rows in job.left_out] == [("height_difference", [[2.0]])]
    assert job.notes == ("1 row with use = no left out of the adjustment: levels.csv:3",)


def test_a_setup_left_out_is_no_unknown(tmp_path: Path) -> None:
    table = PLANE["directions.csv"].replace("direction_dms\n", "direction_dms,use\n")
    rows = [line + ("" if "use" in line else ",no" if line.startswith("S1") else ",") for line in table.splitlines()]
    job = job_of(tmp_path, PLANE, {"directions.csv": "\n".join(rows)})
    assert job.setups == ("S2",)
    np.testing.assert_array_equal(kind_of(job, "direction").setup, [0, 0])
    left_out = job.left_out[0]
    assert isinstance(left_out, Directions)
    np.testing.assert_array_equal(left_out.setup, [-1, -1, -1])


# Control.


def test_control_fixed_weighted_and_free(tmp_path: Path) -> None:
    table = (
        "mark,easting_m,northing_m,height_m,plan_control,height_control,sd_easting_mm,sd_northing_mm,sd_height_mm\n"
        "001,1000,2000,50,fixed,weighted,,,4\n002,1400,2000,52,weighted,free,2,3,\nA,1200,2300,51,,,,,\nB,,,,,,,,\n"
    )
    job = job_of(tmp_path, PLANE, {"marks.csv": table})
    free, fixed, weighted = Control.FREE, Control.FIXED, Control.WEIGHTED
    np.testing.assert_array_equal(job.marks.control, [[fixed, weighted], [weighted, free], [free, free], [free, free]])
    control = kind_of(job, "control")
    assert control.marks.ravel().tolist() == [0, 1, 1]
    assert control.component.tolist() == [2, 0, 1]
    np.testing.assert_allclose(control.sd, [0.004, 0.002, 0.003], rtol=1e-15)
    np.testing.assert_array_equal(control.observed, np.zeros((3, 1)))
    assert [control.provenance.label(row) for row in range(3)] == ["marks.csv:2", "marks.csv:3", "marks.csv:3"]


def test_idle_sds_are_said(tmp_path: Path) -> None:
    table = (
        "mark,easting_m,northing_m,height_m,height_control,sd_height_mm\n"
        "001,1000,2000,50,fixed,\n002,1400,2000,52,,3\nA,,,,,\nB,,,,,\n"
    )
    job = job_of(tmp_path, PLANE, {"marks.csv": table})
    assert job.notes == ("sds in marks.csv count only for weighted control; those of 002 are not used",)


def test_inner_constraints_hold_no_control(tmp_path: Path) -> None:
    job_file = PLANE["job.toml"] + '[datum]\nmode = "inner"\nmarks = ["A", "001"]\n'
    marks = (
        PLANE["marks.csv"]
        .replace("height_control\n", "height_control,sd_height_mm\n")
        .replace("fixed\n", "weighted,3\n")
    )
    marks = marks.replace("51.0,,", "51.0,,,").replace("2400.0,,,", "2400.0,,,,")
    job = job_of(tmp_path, PLANE, {"job.toml": job_file, "marks.csv": marks})
    assert (job.datum.mode, job.datum.marks) == ("inner", (2, 0))
    assert "control" not in [rows.kind for rows in job.observations]
    assert job.notes == ("inner constraints: the control of 2 marks is not held (001, 002)",)


def test_statistics(tmp_path: Path) -> None:
    job_file = PLANE["job.toml"] + '[statistics]\nconfidence = 0.99\nsd_basis = "posterior"\n'
    statistics = job_of(tmp_path, PLANE, {"job.toml": job_file}).statistics
    assert (statistics.confidence, statistics.significance, statistics.power) == (0.99, 0.001, 0.80)
    assert statistics.sd_basis == "posterior"


# The ellipsoid frame.


def test_grid_coordinates_become_longitude_and_latitude(tmp_path: Path) -> None:
    job = job_of(tmp_path, ELLIPSOID)
    assert isinstance(job.frame, EllipsoidFrame)
    back = job.frame.grid_coordinates(job.marks.given)
    np.testing.assert_allclose(back, [[500000, 5400000], [501000, 5400500]], rtol=0, atol=1e-6)  # m: PROJ's inverse
    np.testing.assert_array_equal(job.marks.given[:, 2], [400, 410])
    assert job.marks.given[0, 0] == pytest.approx(9 * DEGREE, rel=0, abs=1e-12)  # rad: the central meridian of zone 32


def test_latitudes_and_longitudes(tmp_path: Path) -> None:
    table = "mark,latitude_dms,longitude_deg,height_m\nP1,48-45-00,9,400\nP2,-0-30-00,351,410\n"
    job = job_of(tmp_path, ELLIPSOID, {"marks.csv": table})
    expected = np.radians([[9, 48.75], [-9, -0.5]])
    np.testing.assert_allclose(job.marks.given[:, :2], expected, rtol=0, atol=RADIANS)


ORTHOMETRIC = ELLIPSOID["job.toml"].replace('"ellipsoidal"', '"orthometric"')
WITH_GEOID = ELLIPSOID["marks.csv"].replace("control\n", "control,geoid_m\n").replace("fixed\n", "fixed,47.3\n")


def test_geoid_heights(tmp_path: Path) -> None:
    marks = WITH_GEOID.replace("410.000,,", "410.000,,,47.2")
    job = job_of(tmp_path, ELLIPSOID, {"job.toml": ORTHOMETRIC, "marks.csv": marks})
    assert job.orthometric
    np.testing.assert_array_equal(job.marks.geoid, [47.3, 47.2])
    assert job.notes == ()


def test_no_geoid_at_all_is_said(tmp_path: Path) -> None:
    job = job_of(tmp_path, ELLIPSOID, {"job.toml": ORTHOMETRIC})
    np.testing.assert_array_equal(job.marks.geoid, [0, 0])
    assert job.notes == (
        "no geoid heights are given: the geoid is taken to be the ellipsoid, its height 0 at every mark",
    )


def test_a_geoid_that_nothing_needs_may_be_incomplete(tmp_path: Path) -> None:
    marks = WITH_GEOID.replace("410.000,,", "410.000,,,")
    job = job_of(tmp_path, ELLIPSOID, {"marks.csv": marks})  # ellipsoidal heights, no levelling
    np.testing.assert_array_equal(job.marks.geoid, [47.3, 0])


def test_heights_are_orthometric_unless_stated(tmp_path: Path) -> None:
    job = job_of(tmp_path, ELLIPSOID, changed("job.toml", 'heights = "ellipsoidal"\n', "", ELLIPSOID))
    assert job.orthometric
    assert any("taken as orthometric" in note for note in job.notes)


def test_deflections(tmp_path: Path) -> None:
    marks = WITH_GEOID.replace("geoid_m", "deflection_north_arcsec,deflection_east_arcsec").replace("47.3", "5.5,-3")
    job = job_of(tmp_path, ELLIPSOID, {"marks.csv": marks.replace("410.000,,", "410.000,,,,")})
    np.testing.assert_allclose(job.marks.deflection, np.array([[5.5, -3], [0, 0]]) * ARCSEC, rtol=1e-15)


def test_a_plane_frame_says_what_it_does_not_use(tmp_path: Path) -> None:
    marks = "mark,easting_m,northing_m,height_m,geoid_m\n001,1000,2000,50,40\n002,1400,2000,52,\nA,,,,\nB,,,,\n"
    job = job_of(tmp_path, PLANE, {"marks.csv": marks})
    assert job.notes == ("a plane frame does not use geoid heights",)


# Files of the folder.


def test_a_csv_file_that_is_no_table_is_said(tmp_path: Path) -> None:
    job = job_of(tmp_path, PLANE, {"level.csv": PLANE["levels.csv"]})
    assert job.notes == ("not read, being no table of this job: level.csv (name it in [tables] if it is one)",)


def test_the_fingerprint_covers_what_is_read_and_nothing_else(tmp_path: Path) -> None:
    first = job_of(tmp_path / "1", PLANE).input_sha256
    assert job_of(tmp_path / "2", PLANE, {"README.md": "x", "other.csv": "y"}).input_sha256 == first
    seen = {first}
    for name in PLANE:
        seen.add(job_of(tmp_path / name, PLANE, {name: PLANE[name] + "# one more comment\n"}).input_sha256)
    assert len(seen) == len(PLANE) + 1
    assert len(first) == 64

"""`hubtack grid-sheet`: the published line as a job, and what the files hold."""

import csv
import shutil
from pathlib import Path

import pytest

from cli.main import run
from tests.job_folders import PLANE, write_folder

FIELD_DATA = Path(__file__).parents[1] / "field_data"
FLINDERS = {
    "job.toml": '[frame]\nkind = "ellipsoid"\ncrs = "EPSG:28355"\nheights = "ellipsoidal"\n',
    "marks.csv": (
        "mark,easting_m,northing_m,height_m,plan_control,height_control\n"
        "Flinders,273741.2971,5796489.7769,350.948,fixed,fixed\nBuninyong,228850.0,5828260.0,749.0,,\n"
    ),
    "vectors.csv": (
        "from,to,dx_m,dy_m,dz_m,sd_x_mm,sd_y_mm,sd_z_mm\nFlinders,Buninyong,8984.9662,47649.9592,25910.7015,5,5,5\n"
    ),
}
"""The line of the ICSM's GDA technical manuals, Buninyong found from Flinders Peak by the difference of their printed
geocentric coordinates."""


def rows(path):
    return list(csv.DictReader(path.read_text("utf-8").splitlines()))


@pytest.fixture
def flinders(tmp_path):
    folder = write_folder(tmp_path / "job", FLINDERS)
    assert run(["grid-sheet", str(folder)]) == 0
    return folder / "out"


def test_published_line(flinders):
    """Printed: 54 972.271 m on the ellipsoid, 54 992.279 m on the grid, line scale 1.00036397."""
    (line,) = rows(flinders / "grid_lines.csv")
    assert float(line["ellipsoid_m"]) == pytest.approx(54972.271, rel=0, abs=0.001)  # m: of the vector's rounding
    assert float(line["grid_m"]) == pytest.approx(54992.279, rel=0, abs=0.001)
    assert float(line["line_scale"]) == pytest.approx(1.00036397, rel=0, abs=5e-9)
    assert float(line["plane_bearing_deg"]) == pytest.approx(305 + 17 / 60 + 21.18 / 3600, rel=0, abs=2e-6)
    assert float(line["arc_to_chord_arcsec"]) == pytest.approx(19.467, rel=0, abs=0.01)


def test_published_marks(flinders):
    marks = {row["mark"]: row for row in rows(flinders / "grid_marks.csv")}
    for mark, scale, gamma in (("Flinders", 1.00023056, 1.58435), ("Buninyong", 1.00050567, 1.87867)):
        assert float(marks[mark]["point_scale"]) == pytest.approx(scale, rel=0, abs=5e-9)
        assert float(marks[mark]["convergence_deg"]) == pytest.approx(gamma, rel=0, abs=1e-5)
    text = (flinders / "grid_sheet.txt").read_text("utf-8")
    assert "1-35-03.65" in text
    assert "1.00036397" in text


def test_every_mark_with_a_place_and_every_line_between_them(tmp_path):
    shutil.copytree(FIELD_DATA / "dam_control", tmp_path / "job")
    assert run(["grid-sheet", str(tmp_path / "job"), "--out", str(tmp_path / "sheet")]) == 0
    marks, lines = rows(tmp_path / "sheet" / "grid_marks.csv"), rows(tmp_path / "sheet" / "grid_lines.csv")
    assert {"HB1", "HB2"}.isdisjoint({row["mark"] for row in marks})
    assert len(marks) == 11
    for line in lines:
        product = float(line["line_scale"]) * float(line["height_factor"])
        assert float(line["combined_factor"]) == pytest.approx(product, rel=0, abs=2e-10)
    measured = [line for line in lines if line["measured_grid_m"]]
    assert len(measured) > 20
    for line in measured:
        assert float(line["measured_ellipsoid_m"]) == pytest.approx(
            float(line["ellipsoid_m"]), rel=0, abs=0.004
        )  # m: 4 sd
        assert float(line["measured_grid_m"]) == pytest.approx(float(line["grid_m"]), rel=0, abs=0.004)
    width = max(map(len, (tmp_path / "sheet" / "grid_sheet.txt").read_text("utf-8").splitlines()))
    assert width <= 110


def test_a_map_that_is_not_conformal_is_cautioned(tmp_path):
    folder = write_folder(
        tmp_path / "job",
        FLINDERS
        | {
            "job.toml": '[frame]\nkind = "ellipsoid"\ncrs = "EPSG:3577"\nheights = "ellipsoidal"\n',
            "marks.csv": (
                "mark,latitude_deg,longitude_deg,height_m,plan_control,height_control\n"
                "Flinders,-37.951033417,144.424867889,350.948,fixed,fixed\nBuninyong,,,,,\n"
            ),
        },
    )
    assert run(["grid-sheet", str(folder)]) == 0
    assert "not conformal" in (folder / "out" / "grid_sheet.txt").read_text("utf-8")


def test_a_plane_frame_has_no_grid_sheet(tmp_path, capsys):
    assert run(["grid-sheet", str(write_folder(tmp_path, PLANE))]) == 2
    assert "needs a map projection" in capsys.readouterr().err
    assert not (tmp_path / "out").exists()

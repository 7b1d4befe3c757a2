"""Networks that cannot be solved as given: exit status 3, the marks named, nothing written."""

from __future__ import annotations

from pathlib import Path

import pytest

from cli.main import run
from tests.job_folders import ELLIPSOID, PLANE, Files, write_folder

JOB_FILE = """\
[frame]
kind = "plane"
[defaults]
instrument = "T"
[instruments.T]
direction_arcsec = 2
zenith_arcsec = 3
distance_mm = 2
level_mm_per_sqrt_km = 1
"""
CONTROL = "mark,easting_m,northing_m,height_m,plan_control,height_control\nA,1000,1000,50,fixed,fixed\n"
BASELINE = CONTROL + "B,2000,1000,60,fixed,fixed\n"


def plane(marks: str, **tables: str) -> Files:
    return {"job.toml": JOB_FILE, "marks.csv": marks} | {f"{name}.csv": text for name, text in tables.items()}


# What cannot be solved: the job, and the words that the message must have, marks among them.
CASES: dict[str, tuple[Files, tuple[str, ...]]] = {
    "levelling without a height": (
        plane("mark,height_m\nP,10\nQ,\n", levels="from,to,rise_m,length_km\nP,Q,1.0,1\n"),
        ("P", "height"),
    ),
    "plan without control": (
        plane(
            "mark,easting_m,northing_m\nP,0,0\nQ,100,0\nR,0,100\n",
            distances="at,to,horizontal_m\nP,Q,100\nQ,R,141.421\nR,P,100\n",
        ),
        ("P",),
    ),
    "vectors without control": (
        {**ELLIPSOID, "marks.csv": ELLIPSOID["marks.csv"].replace("fixed,fixed", ",")},
        ("P1",),
    ),
    "parts that hang apart": (
        plane(CONTROL + "P,,,,,\nQ,,,,,\nR,,,,,\n", levels="from,to,rise_m,length_km\nA,P,1.0,1\nQ,R,2.0,1\n"),
        ("Q", "R"),
    ),
    "one direction to a mark": (
        plane(
            BASELINE + "P,1500,1500,,,\n",
            directions="setup,at,to,direction_deg\n1,A,B,0\n1,A,P,315\n",
        ),
        ("P",),
    ),
    "one distance to a mark": (
        plane(BASELINE + "P,1500,1500,,,\n", distances="at,to,horizontal_m\nA,P,707.107\n"),
        ("P",),
    ),
    "an intersection along its own baseline": (
        plane(
            BASELINE + "P,1500,1000,,,\n",
            directions="setup,at,to,direction_deg\n1,A,B,0\n1,A,P,0\n2,B,A,0\n2,B,P,0\n",
        ),
        ("P",),
    ),
    "a resection from two marks": (
        plane(
            BASELINE + "P,1500,1500,,,\n",
            directions="setup,at,to,direction_deg\n1,P,A,0\n1,P,B,270\n",
        ),
        ("P",),
    ),
    "one fixed mark and no azimuth": (
        plane(
            CONTROL + "P,1500,1500,,,\nQ,1000,1500,,,\n",
            distances="at,to,horizontal_m\nA,P,707.107\nP,Q,500\nQ,A,500\n",
        ),
        ("P", "Q"),
    ),
    "directions without a length": (
        plane(
            CONTROL + "P,1500,1500,,,\nQ,1000,1500,,,\n",
            directions="setup,at,to,direction_deg\n1,A,P,45\n1,A,Q,0\n2,P,A,0\n2,P,Q,45\n3,Q,A,0\n3,Q,P,270\n",
        ),
        ("P", "Q"),
    ),
    "inner constraints carried by one mark": (
        {**PLANE, "azimuths.csv": None, "job.toml": PLANE["job.toml"] + '[datum]\nmode = "inner"\nmarks = ["002"]\n'},
        ("position", "mark 002", "more marks"),
    ),
    "a zenith angle to a mark without plan": (
        plane(CONTROL + "P,,,,,\n", zeniths="at,to,zenith_deg\nA,P,89\n"),
        ("P",),
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_status_3_names_the_marks(name: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    files, words = CASES[name]
    folder = write_folder(tmp_path, files)
    assert run(["adjust", str(folder)]) == 3
    message = capsys.readouterr().err
    assert all(word in message for word in words), message
    assert "Traceback" not in message
    assert not (folder / "out").exists()


def test_status_2_comes_before_the_network(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    marks = PLANE["marks.csv"].replace("fixed", "")
    folder = write_folder(tmp_path, {**PLANE, "marks.csv": marks.replace("1500.0", "15OO.0")})
    assert run(["adjust", str(folder)]) == 2
    assert capsys.readouterr().err.startswith("marks.csv:5: easting_m: read '15OO.0', expected a number")
    assert not (folder / "out").exists()


def test_the_jobs_that_the_tests_break_are_sound(tmp_path: Path) -> None:
    for name, base in (("plane", PLANE), ("ellipsoid", ELLIPSOID)):
        assert run(["adjust", str(write_folder(tmp_path / name, base))]) in (0, 1)

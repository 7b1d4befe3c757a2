"""`hubtack check`: exit statuses, what is said where, files written both or neither; and `adjust` carrying its
summary."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import adjust.reports.check_files as check_files
from adjust.field_book.writing import write_job
from adjust.reports.check_files import CHECK_REPORTS
from adjust.simulate import NETWORKS, Blunder, observe
from cli.main import run


def folder_of(parent: Path, network: str, *blunders: Blunder) -> Path:
    generator = np.random.default_rng(6)
    job, _ = observe(NETWORKS[network](generator), generator, blunders)
    write_job(job, parent / "job")
    return parent / "job"


def test_a_sound_job_is_status_0(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = folder_of(tmp_path, "levelling")
    assert run(["check", str(folder)]) == 0
    said = capsys.readouterr()
    assert said.out.startswith("All ")
    assert said.err == ""
    assert f"Wrote check.json and check.txt into {folder / 'out'}." in said.out
    assert sorted(path.name for path in (folder / "out").iterdir()) == sorted(CHECK_REPORTS)


def test_something_beyond_its_tolerance_is_status_1(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = folder_of(tmp_path, "levelling", Blunder("levels.csv:9", 0.1))
    assert run(["check", str(folder / "job.toml"), "--out", str(tmp_path / "out")]) == 1
    assert "levels.csv:9" in capsys.readouterr().out
    assert (tmp_path / "out" / "check.txt").exists()
    assert not (folder / "out").exists()


def test_a_job_that_cannot_be_read_is_status_2(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = folder_of(tmp_path, "levelling")
    (folder / "levels.csv").write_text("from,to,rise_m\nH01,nowhere,1.0\n", encoding="utf-8")
    assert run(["check", str(folder)]) == 2
    assert "levels.csv:2" in capsys.readouterr().err
    assert not (folder / "out").exists()


def test_a_network_that_cannot_be_solved_is_checked_all_the_same(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = folder_of(tmp_path, "triangulation")
    marks = (folder / "marks.csv").read_text(encoding="utf-8").splitlines()
    names = [line.split(",")[0] for line in marks]
    (folder / "marks.csv").write_text("\n".join(names) + "\n", encoding="utf-8")
    assert run(["adjust", str(folder)]) == 3
    capsys.readouterr()
    assert run(["check", str(folder)]) == 0
    assert "triangles" in capsys.readouterr().out


@pytest.mark.parametrize("spoilt", CHECK_REPORTS)
def test_both_files_or_neither(
    spoilt: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = folder_of(tmp_path, "levelling")
    assert run(["check", str(folder)]) == 0
    before = {name: (folder / "out" / name).read_bytes() for name in CHECK_REPORTS}

    def fail(*_: object) -> None:
        raise OSError(28, "No space left on device")

    writer = {"check.json": "write_check", "check.txt": "write_check_listing"}[spoilt]
    monkeypatch.setattr(check_files, writer, fail)
    (folder / "levels.csv").write_text(
        (folder / "levels.csv").read_text(encoding="utf-8").replace("\n", "\n# spoilt\n", 1), encoding="utf-8"
    )
    assert run(["check", str(folder)]) == 2
    assert "earlier results are as they were" in capsys.readouterr().err
    assert {name: (folder / "out" / name).read_bytes() for name in CHECK_REPORTS} == before


def test_tolerances_of_the_job_file_count(tmp_path: Path) -> None:
    folder = folder_of(tmp_path, "levelling", Blunder("levels.csv:9", 0.1))
    job_file = folder / "job.toml"
    written = job_file.read_text(encoding="utf-8")
    job_file.write_text(f"{written}\n[tolerances]\nsd_factor = 1000.0\n", encoding="utf-8")
    assert run(["check", str(folder)]) == 0


@pytest.mark.parametrize(
    ("lines", "said"),
    [
        ('standard = "FGCC 1984 second order class 1"', "did you mean 'FGCC 1984 second order class I'?"),
        ('standard = "Good enough"', "which is no standard known here"),
        ("target_height_m = [2.0, 1.0]", "expected the lowest height before the highest"),
        ("target_height_m = [2.0]", "target_height_m"),
        ("triangle_arcsec = 3.0", "did you mean 'triangles_arcsec'?"),
        ("sd_factor = 0.0", "sd_factor"),
    ],
)
def test_mistaken_tolerances_are_named(
    lines: str, said: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = folder_of(tmp_path, "levelling")
    job_file = folder / "job.toml"
    written = job_file.read_text(encoding="utf-8")
    job_file.write_text(f"{written}\n[tolerances]\n{lines}\n", encoding="utf-8")
    assert run(["check", str(folder)]) == 2
    message = capsys.readouterr().err
    assert message.startswith(f"job.toml:{len(written.splitlines()) + 3}: tolerances.")
    assert said in message


def test_figures_of_the_job_file_become_rules(tmp_path: Path) -> None:
    from adjust import read_job
    from adjust.tolerances import Quantity
    from adjust.units import ARCSEC

    folder = folder_of(tmp_path, "levelling")
    job_file = folder / "job.toml"
    figures = """
[tolerances]
standard = ["US Army second order", "WAC 332-130-090 1:5000"]
level_loops_mm_per_sqrt_km = 5.0
station_arcsec = 6.0
position_ratio = 20000.0
position_mm_per_sqrt_km = 100.0
distances_mm = 2.0
distances_ppm = 3.0
same_mark_m = 0.2
"""
    job_file.write_text(job_file.read_text(encoding="utf-8") + figures, encoding="utf-8")
    tolerances = read_job(folder).tolerances
    size = np.array([4000.0])

    def allowed(quantity: Quantity) -> list[float]:
        return [float(rule.allowed(size)[0]) for rule in tolerances.rules(quantity)]

    assert allowed(Quantity.LEVEL_LOOP) == pytest.approx([0.010])  # m: 5 mm √4
    assert allowed(Quantity.LEVEL_RUNS) == pytest.approx([0.018])  # m: 9 mm √4, of the standard
    assert allowed(Quantity.STATION) == pytest.approx([6 * ARCSEC])  # rad
    assert allowed(Quantity.ANGLES) == pytest.approx([30 * ARCSEC * np.sqrt(4000.0)])  # rad: of the standard
    assert sorted(allowed(Quantity.POSITION)) == pytest.approx([0.2, 0.2])  # m: 1:20 000 of 4 km, 100 mm √4
    assert allowed(Quantity.DISTANCE) == pytest.approx([0.002 + 0.012])  # m
    assert tolerances.same_mark == 0.2


def test_adjust_carries_the_summary(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = folder_of(tmp_path, "levelling", Blunder("levels.csv:9", 0.1))
    assert run(["adjust", str(folder)]) == 1
    listing = (folder / "out" / "listing.txt").read_text(encoding="utf-8")
    section = listing.split("Checks before the adjustment\n")[1].split("\n\nControl\n")[0]
    assert "levels.csv:9" in section
    assert "level loops" in section
    capsys.readouterr()


def test_help_says_what_it_does(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["check", "--help"]) == 0
    said = capsys.readouterr().out
    assert "Example: hubtack check" in said
    assert "something exceeds its tolerance" in said

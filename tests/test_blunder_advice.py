"""What is advised about coordinates that were given, and about errors that cannot be told apart."""

from __future__ import annotations

import shutil
from dataclasses import replace
from pathlib import Path

import numpy as np

from adjust import adjust, read_job
from adjust.blunders import Blunder, Findings, find_blunders
from adjust.reports.blunder_words import findings_verdict, off_by

FIELD_DATA = Path(__file__).parents[1] / "field_data"


def found_in(folder: Path, job: str, written: str, mistaken: str) -> Findings:
    """What is found in a demo job with one entry of its marks changed."""
    shutil.copytree(FIELD_DATA / job, folder / job, ignore=shutil.ignore_patterns("out"))
    marks = folder / job / "marks.csv"
    text = marks.read_text(encoding="utf-8")
    assert written in text
    marks.write_text(text.replace(written, mistaken), encoding="utf-8")
    return find_blunders(adjust(read_job(folder / job)), folder / job)


def only(findings: Findings) -> Blunder:
    (blunder,) = findings.blunders
    return blunder


def test_two_benchmarks_are_looked_up_and_no_rise_is_measured_again(tmp_path: Path) -> None:
    """Two held heights and their difference: whichever is wrong, every rise reads the same."""
    blunder = only(found_in(tmp_path, "fen_levels", "BM17,3.4820", "BM17,3.8420"))
    assert [other.name for other in blunder.alternatives] == ["height of control mark BM23"]
    assert blunder.advice.startswith("Look up each of these coordinates where they came from")


def test_a_weighted_coordinate_is_not_measured_again(tmp_path: Path) -> None:
    blunder = only(found_in(tmp_path, "dam_control", "REF3,599308.177", "REF3,599308.717"))
    assert blunder.alternatives
    assert blunder.advice.startswith("Look up each of these coordinates where they came from")


def test_one_sentence_says_that_another_may_stand_in_its_place(tmp_path: Path) -> None:
    findings = found_in(tmp_path, "fen_levels", "BM17,3.4820", "BM17,3.8420")
    job = read_job(tmp_path / "fen_levels")
    assert "BM17 (or another that cannot be told from it), probably digits 4 and 8" in findings_verdict(job, findings)


def test_an_sd_of_metres_is_told_in_metres(tmp_path: Path) -> None:
    blunder = only(found_in(tmp_path, "fen_levels", "BM17,3.4820", "BM17,3.8420"))
    assert off_by(replace(blunder, sd=np.array([2.5]))) == "up +360.19 ± 2.5000 m"
    assert off_by(replace(blunder, sd=np.array([0.0025]))) == "up +360.19 ± 2.50 mm"


def test_one_sentence_says_that_the_search_did_not_come_to_rest(tmp_path: Path) -> None:
    findings = found_in(tmp_path, "fen_levels", "BM17,3.4820", "BM17,3.8420")
    job = read_job(tmp_path / "fen_levels")
    doubt = "It did not come to rest: what it names may be wrong in part."
    assert doubt not in findings_verdict(job, findings)
    assert findings_verdict(job, replace(findings, settled=False)).endswith(doubt)

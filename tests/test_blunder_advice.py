"""What is advised about coordinates that were given, and about errors that cannot be told apart."""

from __future__ import annotations

import shutil
from dataclasses import replace
from pathlib import Path

import numpy as np

from adjust import adjust, read_job
from adjust.blunders import Blunder, Correction, Explanation, Findings, Hypothesis, find_blunders
from adjust.blunders.advice import advice
from adjust.reports.blunder_words import findings_verdict, instead_words, off_by

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
    assert blunder.advice.startswith("Look at marks.csv:3 in the book: if it should be height_m 3.4820")
    assert "if not, look up each of these coordinates where they came from" in blunder.advice
    assert "easure" not in blunder.advice.replace("was measured here", "")


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


def a_line(name: str) -> Hypothesis:
    return Hypothesis("observation", name, ((0, np.array([0])),), ("",), "m")


def exchanged(odds: float) -> Explanation:
    corrections = (Correction("distances.csv:7", "horizontal_m", "168.651"),)
    return Explanation("digits 6 and 5 exchanged", ("digits exchanged",), None, corrections, 0.5, odds)


def test_the_book_comes_before_measuring_again_where_an_explanation_convinces() -> None:
    suspect, others = a_line("distances.csv:7"), [a_line("distances.csv:8")]
    said = advice(suspect, [exchanged(3700.0)], others, "directions.csv:4", all_held=False)
    assert said == (
        "Look at distances.csv:7 in the book: if it should be horizontal_m 168.651, correct it, with the reason; "
        "if not, measure directions.csv:4 again: that tells which of these it is."
    )
    doubtful = advice(suspect, [exchanged(3.0)], others, "directions.csv:4", all_held=False)
    assert doubtful == "Measure directions.csv:4 again: that tells which of these it is."


def test_nothing_is_advised_on_sizes_that_do_not_settle(tmp_path: Path) -> None:
    said = advice(a_line("distances.csv:7"), [exchanged(3700.0)], [], None, all_held=False, settled=False)
    assert said.startswith("Begin with the closures")
    assert "distances.csv:7" not in said


def test_what_could_stand_in_its_place_is_explained_too(tmp_path: Path) -> None:
    """Of two benchmarks one has two digits exchanged and the other is named: the mistake is told all the same."""
    blunder = only(found_in(tmp_path, "fen_levels", "BM17,3.4820", "BM17,3.4280"))
    assert blunder.name == "height of control mark BM23"
    assert blunder.explanations == ()
    (explanation,) = blunder.instead_explained
    assert explanation is not None
    assert explanation.mistake == "digits 8 and 2 exchanged: 3.4820 in place of 3.4280"
    assert instead_words(blunder) == [f"height of control mark BM17 ({explanation.mistake})"]


def test_a_choice_between_equals_comes_to_rest(tmp_path: Path) -> None:
    """Of two that fit equally well the smaller error is named, and the network is looked at once more without it."""
    findings = found_in(tmp_path, "fen_levels", "BM17,3.4820", "BM17,4.3820")
    assert findings.settled
    assert only(findings).alternatives

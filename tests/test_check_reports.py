"""`check.json` and `check.txt`: the keys of the page, figures that agree with the check, and what a surveyor reads."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from adjust.job import Job
from adjust.network.closures import Check, check_job
from adjust.reports.check_files import CHECK_REPORTS, write_check_reports
from adjust.reports.check_listing import check_listing, check_section
from adjust.reports.check_words import NAMES, by_file, check_verdict
from adjust.reports.layout import WIDTH
from adjust.simulate import NETWORKS, Blunder, observe
from adjust.tolerances import STANDARDS, Tolerances
from tests.building import build_job

KEYS = ("schema", "job", "passed", "exceeding", "standards", "confidence", "checks", "closures", "traverses")
KEYS += ("remarks", "look_first", "shared_lines", "clues", "notes")
CLOSURE_KEYS = {"check", "marks", "observations", "unit", "misclosure", "sd", "allowed", "length_m", "angles"}
CLOSURE_KEYS |= {"rule", "exceeds"}


def simulated(network: str, *blunders: Blunder) -> Check:
    generator = np.random.default_rng(6)
    job, _ = observe(NETWORKS[network](generator), generator, blunders)
    return check_job(job)


CASES: dict[str, Callable[[], Check]] = {
    **{network: lambda network=network: simulated(network) for network in NETWORKS},
    "wrong rise": lambda: simulated("levelling", Blunder("levels.csv:9", 0.1)),
    "wrong direction": lambda: simulated("traverses", Blunder("directions.csv:9", np.radians(1.0))),
    "nothing to close": lambda: check_job(build_job({"A": (0.0, 0.0)}, fixed="A")),
}


def written(check: Check, folder: Path) -> dict[str, Any]:
    write_check_reports(check, folder)
    content: dict[str, Any] = json.loads((folder / "check.json").read_text(encoding="utf-8"))
    return content


@pytest.mark.parametrize("case", list(CASES))
def test_keys_and_figures(case: str, tmp_path: Path) -> None:
    check = CASES[case]()
    content = written(check, tmp_path)
    assert list(content) == [*KEYS]
    assert content["schema"] == "hubtack-check/1"
    assert content["passed"] is check.passed
    assert content["exceeding"] == check.exceeding
    assert len(content["closures"]) == sum(len(judged.closures) for judged in check.closures)
    records = iter(content["closures"])
    for judged in check.closures:
        for closure in range(len(judged.closures)):
            record = next(records)
            assert set(record) >= CLOSURE_KEYS
            assert record["check"] in NAMES
            scale = {"m": 1.0, "deg": np.degrees(1.0)}[record["unit"]]
            figures = record["misclosure"]
            values = list(figures.values()) if isinstance(figures, dict) else [figures]
            assert values == pytest.approx((judged.closures.misclosure[closure] * scale).tolist(), abs=1e-15)
            assert record["exceeds"] is bool(judged.exceeds[closure])
            assert record["observations"]


def test_a_failing_closure_is_told_in_full(tmp_path: Path) -> None:
    check = CASES["wrong rise"]()
    content = written(check, tmp_path)
    failing = [record for record in content["closures"] if record["exceeds"]]
    assert failing
    assert all("levels.csv:9" in record["observations"] for record in failing)
    assert "levels.csv:9" in content["look_first"][0]["observations"]
    text = (tmp_path / "check.txt").read_text(encoding="utf-8")
    assert "Look first at rise" in text.splitlines()[2]
    assert "(levels.csv:9)" in text
    assert "the misclosure is nearly 0.1 m" in text.replace("\n  ", " ")


def test_compass_rule_coordinates_are_marked_as_a_comparison(tmp_path: Path) -> None:
    check = CASES["traverses"]()
    content = written(check, tmp_path)
    assert content["traverses"]
    for record in content["traverses"]:
        assert [entry["mark"] for entry in record["compass_rule"]] == record["marks"][1:-1]
    assert "Compass-rule coordinates, for comparison" in (tmp_path / "check.txt").read_text(encoding="utf-8")


@pytest.mark.parametrize("case", list(CASES))
def test_the_listing_fits_the_screen_and_begins_with_the_verdict(case: str) -> None:
    check = CASES[case]()
    lines = check_listing(check)
    assert max(map(len, lines)) <= WIDTH
    assert " ".join(lines[2:]).startswith(check_verdict(check))


def test_standard_and_figure_stand_in_both(tmp_path: Path) -> None:
    name = "FGCC 1984 second order class I"
    check = simulated("triangulation")
    judged = check_job(replace(check.job, tolerances=Tolerances(standards=(name,))))
    content = written(judged, tmp_path)
    assert content["standards"] == [{"name": name, "source": STANDARDS[name].source}]
    rules = {record["check"]: record["rule"] for record in content["closures"]}
    assert rules["triangle"] == f'3" √n ({name}, figure from memory)'
    text = (tmp_path / "check.txt").read_text(encoding="utf-8")
    assert f'Allowed: 3" √n ({name}, figure from memory).' in text
    assert STANDARDS[name].source in " ".join(text.split())


@pytest.mark.parametrize("case", ["mixed", "wrong direction"])
def test_the_section_of_the_listing_is_short(case: str) -> None:
    check = CASES[case]()
    section = check_section(check)
    assert section[1] == "Checks before the adjustment"
    assert len(section) <= 10 + len(check.closures)


def test_verdicts() -> None:
    assert check_verdict(CASES["nothing to close"]()).startswith("Nothing closes")
    sound = CASES["levelling"]()
    count = sum(len(judged.closures) for judged in sound.closures)
    assert check_verdict(sound) == f"All {count} closures keep within what is allowed."
    levels = [("A", "B", 1.0), ("B", "C", 1.0), ("C", "A", -2.0)]
    loop = build_job(dict.fromkeys("ABC", (None, None, 1.0)), fixed_height="A", levels=levels)
    assert check_verdict(check_job(loop)) == "The one closure keeps within what is allowed."
    job = replace(odd_heights(), tolerances=Tolerances(target_heights=(0.0, 2.0)))
    assert check_verdict(check_job(job)).startswith("1 other finding exceeds what is allowed.")


def odd_heights() -> Job:
    truth = {"A": (0.0, 0.0, 1.0), "B": (100.0, 0.0, 2.0)}
    return build_job(truth, fixed_plan="AB", zeniths=[("A", "B", np.pi / 2, 1.5, 3.0)])


def test_lines_are_named_file_by_file() -> None:
    assert by_file(["a.csv:3", "b.csv:2+5", "a.csv:7"]) == "a.csv:3, 7; b.csv:2+5"


def test_the_same_check_is_written_byte_for_byte(tmp_path: Path) -> None:
    for folder in ("one", "other"):
        write_check_reports(CASES["mixed"](), tmp_path / folder)
    for name in CHECK_REPORTS:
        assert (tmp_path / "one" / name).read_bytes() == (tmp_path / "other" / name).read_bytes()

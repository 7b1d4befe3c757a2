"""A small, seeded run of the study of planted variance factors, and its arithmetic."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tests.studies.variance_components import (
    BLUNDERS,
    CLAIMS,
    CLEAN,
    JOBS,
    NETWORKS,
    PAGE,
    PLANTED,
    SPOILT,
    SPOILT_JOBS,
    judged,
    simulated,
    spoilt_row,
    write_into_page,
)
from tests.test_variance_groups import component


def test_errors_are_those_of_logarithms_over_their_sds() -> None:
    found = [component(), component(factor=float("nan"), lower=float("nan"), upper=float("nan"))]
    outcome = judged(found, {"zenith": 1.5})
    assert outcome.normalised == pytest.approx((np.log(1.8 / 1.5) * 1.8 / 0.2,))
    assert outcome.largest == pytest.approx(np.log(1.2))
    assert outcome.held
    assert not judged(found, {"zenith": 3.0}).held


def test_a_blunder_moves_the_plain_estimate_and_not_the_robust_one() -> None:
    cells = [cell.strip() for cell in spoilt_row("levels, 49 marks", (1, 100.0), 4).split("|")]
    assert cells[3:8] == ["4", "100.0 %", "0.0 %", "0.0 %", "100.0 %"]


def test_the_same_jobs_come_again() -> None:
    first, second = (next(iter(simulated("GNSS, 9 marks", "planted", (1, 6.0), 1))) for _ in range(2))
    np.testing.assert_array_equal(first.coordinates, second.coordinates)


def test_the_page_holds_the_tables_of_the_whole_study(tmp_path: Path) -> None:
    text = PAGE.read_text(encoding="utf-8")
    tables = [text.split(first)[1].split(last)[0] for first, last in (CLEAN, SPOILT)]
    for network in NETWORKS:
        assert all(f"| {network} | {claims} | {JOBS} |" in tables[0] for claims in CLAIMS)
        assert all(f"| {network} | {count} of {size:g} sds |" in tables[1] for count, size in BLUNDERS)
    assert tables[1].count(f"| {SPOILT_JOBS} |") > len(BLUNDERS)
    copy = tmp_path / "page.md"
    copy.write_text(text, encoding="utf-8")
    write_into_page(tables[0], CLEAN, copy)
    assert copy.read_text(encoding="utf-8") == text


def test_the_page_names_the_planted_factors() -> None:
    text = PAGE.read_text(encoding="utf-8")
    for factor in PLANTED.values():
        assert f" {factor:g}" in text

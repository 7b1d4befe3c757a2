"""A small, seeded run of the Monte Carlo study, and its arithmetic."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest

from adjust.simulate import NETWORKS
from tests.studies.monte_carlo import (
    MARKERS,
    PAGE,
    PROMISES,
    Outcome,
    report,
    share,
    shares,
    simulated,
    write_into_page,
)

JOBS = 8 * len(NETWORKS)
"""Four of each shape on each basis."""
LIMIT = 3.0
"""Standard errors, as in the study; the run is seeded, so that a limit passed stays passed."""


@cache
def outcomes() -> tuple[Outcome, ...]:
    return tuple(simulated(JOBS, seed=5))


@pytest.mark.parametrize("promise", PROMISES)
def test_promises_are_kept(promise: str) -> None:
    found = shares(outcomes())[promise]
    assert found.trials >= JOBS
    assert abs(found.off) < LIMIT


def test_too_bold_claims_are_found_out() -> None:
    """Sds claimed at two thirds of the truth: global test, regions and single tests break their promises."""
    found = shares(simulated(JOBS, seed=5, claim=2 / 3))
    assert all(found[promise].off < -LIMIT for promise in ("global test passes", "w within ±3.29"))
    prior = shares(o for o in simulated(JOBS, seed=5, claim=2 / 3) if o.basis == "prior")
    assert prior["truth in the 95 % ellipse"].off < -LIMIT


def test_every_shape_and_basis_takes_part() -> None:
    seen = {(outcome.network, outcome.basis) for outcome in outcomes()}
    assert seen == {(name, basis) for name in NETWORKS for basis in ("prior", "posterior")}


def test_standard_errors_come_from_whole_jobs() -> None:
    found = share([(5, 10), (10, 10), (20, 20)], promised=0.95)
    assert found.trials == 40
    assert found.found == 35 / 40
    assert found.standard_error == pytest.approx(np.sqrt(4.5**2 + 0.5**2 + 1.0**2) / 40, rel=1e-12)
    assert found.off == pytest.approx((35 - 38) / np.sqrt(21.5), rel=1e-12)


def test_standard_errors_are_not_below_those_of_independent_trials() -> None:
    found = share([(38, 40), (38, 40)], promised=0.95)
    assert found.standard_error == pytest.approx(np.sqrt(0.95 * 0.05 / 80), rel=1e-12)


def test_the_table_has_every_selection() -> None:
    table = report(list(outcomes()))
    for title in (f"all {JOBS}", "prior", "posterior", *NETWORKS):
        assert f"| {title} |" in table


def test_the_page_holds_the_table_of_the_whole_study(tmp_path: Path) -> None:
    text = PAGE.read_text(encoding="utf-8")
    table = text.split(MARKERS[0])[1].split(MARKERS[1])[0]
    assert "| all 2,800 | global test passes | 2,800 | 95.0% |" in table
    copy = tmp_path / "page.md"
    copy.write_text(text, encoding="utf-8")
    write_into_page(table, copy)
    assert copy.read_text(encoding="utf-8") == text

"""Prices of errors against published critical values, and the search against all sets there are."""

from __future__ import annotations

import json
import math
from itertools import combinations
from pathlib import Path

import numpy as np
import pytest

from adjust import Job, adjust
from adjust.blunders import find_blunders
from adjust.blunders.criterion import RARER, Criterion, beta_price, chi_square_price
from adjust.blunders.diagnosis import diagnose
from adjust.blunders.search import find_errors
from adjust.quality import critical_tau
from adjust.simulate import Blunder, levelling_net, observe
from tests.studies.blunder_networks import Network, Planted, draw, levels, vectors
from tests.studies.blunder_rivals import maximum_likelihood, plain_snooping
from tests.studies.blunders import Verdict

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "statistics.json").read_text("utf-8"))}


def test_one_error_pays_the_square_of_baardas_k() -> None:
    """From memory in the collection, entry F01."""
    printed = float(ENTRIES["F01"]["check"]["output"]["k"])
    assert math.sqrt(chi_square_price(0.001, 1)) == pytest.approx(printed, rel=0, abs=0.005)


@pytest.mark.parametrize("freedom", [4, 5, 6])
def test_errors_in_several_columns_pay_the_printed_chi_square(freedom: int) -> None:
    tails, printed = ENTRIES["S7"]["inputs"]["upper_tail_probability"], ENTRIES["S7"]["published_outputs"][str(freedom)]
    ours = [chi_square_price(tail, freedom) for tail in tails]
    np.testing.assert_allclose(ours, printed, rtol=0, atol=0.51e-5)  # printed to 5 decimals


@pytest.mark.parametrize("row", ENTRIES["S1"]["published_outputs"], ids=lambda row: f"n={row['n']}")
def test_on_estimated_sigma_the_bound_is_popes_tau_of_ugahs_table_1(row: dict[str, list[float]]) -> None:
    """Misprints of the table are told in tests/test_statistics_published.py; they are within 2 units of the fourth."""
    n, alphas = row["n"], ENTRIES["S1"]["inputs"]["alphas"]
    for alpha, printed in zip(alphas, row["values"], strict=True):
        criterion = Criterion(alpha / n, True, 1.0, n - 2)  # type: ignore[operator]
        assert criterion.critical((1, False), n - 2) == pytest.approx(printed, rel=0, abs=2.5e-4)  # type: ignore[operator]


def test_on_estimated_sigma_the_bound_is_tau_to_all_digits() -> None:
    for freedom in (3, 8, 50):
        for alpha in (0.05, 0.001):
            ours = Criterion(alpha, True, 1.0, freedom).critical((1, False), freedom)
            assert ours == pytest.approx(critical_tau(alpha, freedom), rel=1e-10)


def test_nothing_can_be_tested_with_one_degree_of_freedom_for_each_column() -> None:
    assert beta_price(0.001, 2, 2) == math.inf


def test_groups_are_tested_at_a_hundredth_of_the_level() -> None:
    known = Criterion(0.001, False, 50.0, 20)
    assert known.critical((2, True), 20) ** 2 == pytest.approx(-2 * math.log(0.001 * RARER), rel=1e-12)


def jobs(count: int, blunders: int, *, estimated: bool = False, vector: bool = False) -> list[Planted]:
    plan = vectors(2, 3) if vector else levels(3, 4)
    network = Network.of(plan(np.random.default_rng(3)), np.random.default_rng(4), vector, estimated)
    drawn = (draw(network, blunders, (1.0, 8.0), np.random.default_rng([5, number]), True) for number in range(count))
    return [job for job in drawn if job is not None]


@pytest.mark.parametrize("estimated", [False, True])
@pytest.mark.parametrize("blunders", [1, 2])
def test_no_set_of_single_rows_costs_less_than_the_one_found(blunders: int, estimated: bool) -> None:
    for job in jobs(6, blunders, estimated=estimated):
        evidence = job.network.evidence(job.observed)
        criterion = job.network.criterion(evidence)
        found = criterion.cost(evidence.allowing(diagnose(evidence, criterion, job.network.rows).chosen))
        for size in range(blunders + 2):
            for chosen in combinations(range(job.network.rows), size):
                try:
                    allowed = evidence.allowing(chosen)
                except np.linalg.LinAlgError:
                    continue
                if allowed.covariance.max(initial=0.0) * evidence.information.diagonal.max() < 1e4:
                    assert criterion.cost(allowed) >= found - 1e-9


def test_every_member_fails_its_test_and_nobody_else_does() -> None:
    for job in jobs(20, 3):
        evidence = job.network.evidence(job.observed)
        criterion = job.network.criterion(evidence)
        allowed = evidence.allowing(find_errors(evidence, criterion).chosen)
        bounds = [criterion.critical(evidence.sort(number), criterion.freedom) for number in allowed.chosen]
        assert np.all(np.sqrt(allowed.losses) > bounds)
        for number, gain in enumerate(allowed.gains):
            assert math.sqrt(gain) <= criterion.critical(evidence.sort(number), criterion.freedom)


def test_maximum_likelihood_of_the_study_is_the_least_over_all_sets() -> None:
    """The limit of the study, by brute force: single components and whole vectors, sets of up to two."""
    for job in jobs(2, 1, vector=True):
        evidence = job.network.evidence(job.observed)
        criterion = job.network.criterion(evidence)
        hypotheses = range(job.network.hypotheses.first_group)
        costs = {(): 0.0}
        for chosen in (pair for size in (1, 2) for pair in combinations(hypotheses, size)):
            columns = np.concatenate([evidence.columns_of(number) for number in chosen])
            scale = np.sqrt(evidence.information.diagonal[columns])
            block = evidence.information.block(columns, columns) / np.outer(scale, scale)
            if np.linalg.eigvalsh(block)[0] > 1e-3:
                costs[chosen] = criterion.cost(evidence.allowing(chosen))
        best = min(costs, key=lambda chosen: costs[chosen])
        assert maximum_likelihood(job, 2) == {job.network.sources[number] for number in best}


def masked() -> Planted:
    """Three errors in a level net of which snooping takes the wrong ones: the first such job of a seeded row."""
    for job in jobs(60, 3):
        if plain_snooping(job) != job.wrong and maximum_likelihood(job, 3) == job.wrong:
            return job
    raise AssertionError("no job is masked")


def test_errors_that_mask_each_other_are_found_together() -> None:
    job = masked()
    assert Verdict.of(job).right
    assert not plain_snooping(job) <= job.wrong  # swamping: a sound row was set aside


def test_looking_back_frees_a_row_that_was_suspected_first() -> None:
    """Two errors of one mark's lines push the third line out first; with both allowed for it passes its test."""
    job = masked()
    evidence = job.network.evidence(job.observed)
    criterion = job.network.criterion(evidence)
    sound = sorted(plain_snooping(job) - job.wrong)
    suspected = tuple(job.network.sources.index(line) for line in sound)
    from_there = find_errors(evidence, criterion, suspected)
    assert not set(suspected) & set(from_there.chosen)


def test_masked_errors_are_found_the_whole_way() -> None:
    """The same three errors in readings, through start, adjustment and words."""
    names = find_masked_names()
    job, sizes = names
    found = find_blunders(adjust(job))
    assert {blunder.name for blunder in found.blunders} == {planted.source for planted in sizes}


def find_masked_names() -> tuple[Job, tuple[Blunder, ...]]:
    """Two lines of a mark of four wrong by the same amount, which look like one error of the mark's other two."""
    plan = levelling_net(np.random.default_rng(1))
    (lines,) = plan.observations
    count = np.bincount(lines.marks.ravel())
    mark = int(np.flatnonzero(count >= 5)[0])
    rows = np.flatnonzero((lines.marks == mark).any(axis=1))[:2]
    sizes = tuple(
        Blunder(lines.provenance.label(int(row)), 0.02 if lines.marks[row, 1] == mark else -0.02) for row in rows
    )
    return observe(plan, np.random.default_rng(2), sizes)[0], sizes

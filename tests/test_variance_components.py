"""Variance components: certified analysis of variance, other programs' restricted likelihood, planted factors."""

from __future__ import annotations

import json
import warnings
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import minimize

from adjust import Adjustment, adjust
from adjust.arrays import FloatArray, IntArray
from adjust.job import Datum
from adjust.simulate import NETWORKS, observe, triangulation_grid
from adjust.variance_components import variance_components
from adjust.variance_components.estimation import Estimate, estimate
from adjust.variance_components.fit import Weighted
from adjust.variance_components.information import information
from tests.building import build_job
from tests.planted_variances import claimed, dense, factors, grouped, with_sd

PUBLISHED = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "statistics.json").read_text("utf-8"))}
EXACTLY = 1e-5
"""Sds of ln σ²: the iteration goes on until a step is below it."""
CLAIMED = 0.1  # m: the sd of every row of the one-way network, right for neither of its groups


def one_way(values: dict[str, list[float]]) -> Adjustment:
    """One-way analysis of variance with random groups as a levelling network.

    Every value is a rise from a benchmark to the mark of its group; the marks scatter about a mark of unknown height,
    to which each is tied by a rise of nothing. The first rises have the variance within groups, the second that
    between.
    """
    marks: dict[str, tuple[float | None, ...] | None] = {"bench": (None, None, 0.0), "mean": None}
    marks |= dict.fromkeys(values)
    within = [("bench", name, value) for name, every in values.items() for value in every]
    between = [("mean", name, 0.0) for name in values]
    job = build_job(marks, fixed_height=["bench"], levels=[*within, *between])
    rows = grouped(with_sd(job.observations[0], CLAIMED), ["within"] * len(within) + ["between"] * len(between))
    return adjust(replace(job, observations=(rows,)))


def nist() -> tuple[dict[str, list[float]], float, float]:
    """NIST StRD, analysis of variance, SiRstv: the values by group, and the certified mean squares."""
    entry = PUBLISHED["D2"]
    values: dict[str, list[float]] = {}
    for group, value in entry["inputs"]["rows"]:
        values.setdefault(group, []).append(float(value))
    outputs = entry["published_outputs"]
    return values, float(outputs["between_MS"]), float(outputs["within_MS"])


def variances(found: Estimate) -> FloatArray:
    return np.asarray(np.exp(found.logarithm) * CLAIMED**2)


def test_certified_balanced_analysis_of_variance() -> None:
    """Balanced and positive, REML is the ANOVA estimate: σ² = MSW, σ_a² = (MSB − MSW)/n (Searle, Casella & McCulloch
    1992, *Variance Components*, section 4.5; from memory). Mean squares certified by NIST (StRD, SiRstv)."""
    values, between, within = nist()
    found = estimate(one_way(values), robust=False, settled=EXACTLY)
    assert [group.group for group in found.groups] == ["within", "between"]
    np.testing.assert_allclose(variances(found)[0], within, rtol=1e-7, atol=0)
    np.testing.assert_allclose(variances(found)[1], (between - within) / 5, rtol=1e-5, atol=0)


def test_sds_of_a_balanced_analysis_of_variance() -> None:
    """var σ̂² = 2σ⁴/f_w, var σ̂_a² = 2/n² (E_b²/f_b + σ⁴/f_w), f_b = 4, f_w = 20 (Searle, Casella & McCulloch 1992,
    section 3.8; from memory), E_b and σ² at their estimates."""
    values, between, within = nist()
    found = estimate(one_way(values), robust=False, settled=EXACTLY)
    expected = np.array([2 * within**2 / 20, 2 / 25 * (between**2 / 4 + within**2 / 20)])
    relative = np.diag(found.covariance) * variances(found) ** 2 / expected
    np.testing.assert_allclose(relative, 1.0, rtol=0, atol=1e-4)  # of the variance itself


def test_the_same_by_a_mixed_model_of_statsmodels() -> None:
    from statsmodels.regression.mixed_linear_model import MixedLM

    generator = np.random.default_rng(3)
    values = {str(g): list(10 + shift + generator.normal(0, 0.05, 4)) for g, shift in enumerate(_shifts(generator))}
    found = variances(estimate(one_way(values), robust=False, settled=EXACTLY))
    every = np.concatenate(list(values.values()))
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        fitted = MixedLM(every, np.ones((len(every), 1)), np.repeat(list(values), 4)).fit(reml=True, gtol=1e-9)
    np.testing.assert_allclose(found, [fitted.scale, float(fitted.cov_re.squeeze())], rtol=2e-4, atol=0)


def _shifts(generator: np.random.Generator) -> FloatArray:
    return generator.normal(0, 0.2, 12)


def restricted_likelihood(adjustment: Adjustment, found: Estimate) -> FloatArray:
    """ln σ² (groups,) of the largest restricted likelihood, by a general optimiser on dense matrices."""
    matrix, right = dense(adjustment)
    group = of_rows(adjustment, found)
    free = ~np.isnan(found.logarithm)

    def loss(chosen: FloatArray) -> float:
        logarithm = np.zeros(len(free))
        logarithm[free] = chosen
        scale = np.ones(len(matrix))
        scale[: len(group)] = np.exp(logarithm / 2)[group]
        q, r = np.linalg.qr(matrix / scale[:, None])
        rest = right / scale - q @ (q.T @ (right / scale))
        return float(np.log(scale).sum() + np.log(np.abs(np.diag(r))).sum() + rest @ rest / 2)

    result = minimize(loss, np.zeros(int(free.sum())), method="BFGS", options={"gtol": 1e-7})
    return np.asarray(result.x)


def of_rows(adjustment: Adjustment, found: Estimate) -> IntArray:
    """Group (system rows,) of each row."""
    weighted = Weighted(adjustment)
    group = np.zeros(len(weighted.components), dtype=np.int64)
    for number, each in enumerate(found.groups):
        group[each.rows] = number
    return group[weighted.of_system_row]


PLANTED = {"zenith": 1.8, "slope_distance": 0.7, "horizontal_distance": 0.7, "vector": 2.0, "height_difference": 3.0}


def planted(name: str, seed: int = 1) -> Adjustment:
    plan = NETWORKS[name](np.random.default_rng(seed))
    return adjust(claimed(observe(plan, np.random.default_rng(seed + 1))[0], PLANTED))


@pytest.mark.parametrize("name", ["levelling", "traverses", "total station, plane", "GNSS", "mixed"])
def test_restricted_likelihood_by_a_general_optimiser(name: str) -> None:
    adjustment = planted(name)
    found = estimate(adjustment, robust=False, settled=EXACTLY)
    expected = restricted_likelihood(adjustment, found)
    np.testing.assert_allclose(found.logarithm[~np.isnan(found.logarithm)], expected, rtol=0, atol=2e-5)


def exact_information(adjustment: Adjustment, group: IntArray, groups: int) -> FloatArray:
    """½ tr(M D_k M D_l) from the whole projection."""
    matrix, _ = dense(adjustment)
    q, _ = np.linalg.qr(matrix)
    square = ((np.eye(len(matrix)) - q @ q.T) ** 2)[: len(group), : len(group)]
    member = np.equal.outer(np.arange(groups), group).astype(float)
    return np.asarray(member @ square @ member.T / 2)


@pytest.mark.parametrize(("name", "tolerance"), [("mixed", 1e-6), ("large", 0.02)])
def test_information_is_that_of_the_projection(name: str, tolerance: float) -> None:
    """Of the largest element: a millionth where groups have up to fifty rows, two hundredths where few random vectors
    stand for them all."""
    plan = triangulation_grid(np.random.default_rng(1), 9, 9) if name == "large" else None
    adjustment = planted(name) if plan is None else adjust(observe(plan, np.random.default_rng(2))[0])
    found = estimate(adjustment, robust=False)
    group = of_rows(adjustment, found)
    redundancy = np.concatenate([table.redundancy.ravel() for table in adjustment.residuals])
    sums = np.bincount(group, redundancy, len(found.groups))
    expected = exact_information(adjustment, group, len(found.groups))
    obtained = information(adjustment._factor, group, sums)
    np.testing.assert_allclose(obtained, expected, rtol=0, atol=tolerance * expected.max())


def test_planted_factors_come_back_within_their_sds() -> None:
    """40 jobs: the mean error and the scatter of (ln estimate − ln truth) over its sd, by kind.

    Forty draws of unit scatter have a mean within ± 0.47 and an rms of 0.66 to 1.34 (three standard errors); the sds
    are those of large samples, and in networks of forty redundant observations fall short by up to a tenth.
    """
    truth = {"direction": 1.8, "horizontal_distance": 0.6}
    errors: dict[str, list[float]] = {kind: [] for kind in truth}
    for seed in range(40):
        generator = np.random.default_rng(seed)
        adjustment = adjust(claimed(observe(triangulation_grid(generator), generator)[0], truth))
        for component in variance_components(adjustment):
            relative = component.sd / component.factor
            errors[component.kind].append(float(np.log(component.factor / truth[component.kind])) / relative)
    for kind, found in errors.items():
        assert len(found) == 40, kind
        assert abs(np.mean(found)) < 0.47, kind
        assert 0.66 < np.sqrt(np.mean(np.square(found))) < 1.45, kind


def test_a_free_network_says_the_same_as_one_held_at_a_point_and_an_azimuth() -> None:
    """The datum has no part in the residuals."""
    job = replace(observe(NETWORKS["GNSS"](np.random.default_rng(4)), np.random.default_rng(5))[0])
    vectors = tuple(rows for rows in job.observations if rows.kind == "vector")
    control = job.marks.control.copy()
    control[1:] = 0
    given = np.where(np.isnan(job.marks.given), adjust(job).coordinates, job.marks.given)
    held = replace(job, observations=vectors, marks=replace(job.marks, control=control, given=given))
    free = replace(held, datum=Datum("inner"))
    one, other = (factors(variance_components(adjust(each))) for each in (held, free))
    assert one["vectors"] == pytest.approx(other["vectors"], rel=1e-6)


def test_nothing_is_said_where_nothing_is_checked() -> None:
    job = build_job({"A": (None, None, 1.0), "B": None}, fixed_height=["A"], levels=[("A", "B", 1.0)])
    assert variance_components(adjust(job)) == ()


def test_the_adjustment_stays_as_it_is() -> None:
    adjustment = planted("total station, plane")
    before = adjustment.coordinates.tobytes(), adjustment.mark_covariances.tobytes()
    assert any(component.differs for component in variance_components(adjustment))
    assert (adjustment.coordinates.tobytes(), adjustment.mark_covariances.tobytes()) == before


def test_the_same_job_has_the_same_figures() -> None:
    adjustment = planted("mixed")
    assert repr(variance_components(adjustment)) == repr(variance_components(adjustment))

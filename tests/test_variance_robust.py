"""Blunders in a group do not make its sds look wrong."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.stats import chi2

from adjust import Job, adjust
from adjust.arrays import FloatArray
from adjust.simulate import NETWORKS, gnss_net, levelling_net, observe, total_station_net
from adjust.solver import Factor, RankDefect
from adjust.variance_components import variance_components
from adjust.variance_components.estimation import estimate
from adjust.variance_components.scale import bound, bounded_scales, consistency, inefficiency
from tests.building import exact
from tests.planted_variances import claimed, factors, struck

PLANS = {
    "height_difference": levelling_net,
    "slope_distance": lambda generator: total_station_net(generator, 4, 5),
    "vector": gnss_net,
}


def jobs(kind: str, seed: int, sizes: dict[int, float]) -> tuple[Job, Job]:
    """A job without blunders and the same with some, in sds."""
    generator = np.random.default_rng(seed)
    plan = PLANS[kind](generator)
    job, _ = observe(plan, generator)
    return job, struck(job, plan, kind, sizes)


def factor_of(job: Job, kind: str, without: tuple[str, ...] = (), *, robust: bool = True) -> float:
    found = variance_components(adjust(job), without, robust=robust)
    return next(component.factor for component in found if component.kind == kind)


@pytest.mark.parametrize("kind", PLANS)
@pytest.mark.parametrize("size", [6.0, 20.0, 200.0])
def test_one_blunder_in_a_group_of_a_few_dozen_changes_little(kind: str, size: float) -> None:
    """The mean of |ln ratio| to the factor that somebody finds who knows the blunder and leaves it out, over six jobs:
    a fifth at most; without robustness far more."""
    moved: dict[bool, list[float]] = {True: [], False: []}
    for seed in range(6):
        _, wrong = jobs(kind, seed, {7 + seed: size})
        source = next(rows for rows in wrong.observations if rows.kind == kind).provenance.label(7 + seed)
        informed = factor_of(wrong, kind, (source,))
        for robust, changes in moved.items():
            changes.append(abs(np.log(factor_of(wrong, kind, robust=robust) / informed)))
    assert np.mean(moved[True]) < 0.2
    assert size < 20 or np.mean(moved[False]) > 0.8


def test_two_blunders_do_not_hide_each_other() -> None:
    clean, wrong = jobs("height_difference", 1, {4: 25.0, 19: -25.0})
    found = variance_components(adjust(wrong))
    assert found[0].left_out == ("levels.csv:6", "levels.csv:21")
    assert found[0].factor == pytest.approx(factor_of(clean, "height_difference"), rel=0.15)


def test_a_group_that_is_worse_throughout_is_not_taken_for_blunders() -> None:
    generator = np.random.default_rng(2)
    job, _ = observe(levelling_net(generator, 5, 5), generator)
    found = variance_components(adjust(claimed(job, {"height_difference": 10.0})))
    assert found[0].left_out == ()
    assert found[0].lower < 10.0 < found[0].upper


def test_without_blunders_both_estimates_agree() -> None:
    """Bounded influence costs 4 % of the variance, so that the two differ by about a fifth of their sd."""
    differences = []
    for seed in range(10):
        job, _ = jobs("height_difference", seed, {})
        robust, plain = (estimate(adjust(job), robust=way) for way in (True, False))
        differences.append(float((robust.logarithm - plain.logarithm)[0] / np.sqrt(plain.covariance[0, 0])))
    assert np.sqrt(np.mean(np.square(differences))) < 0.5


def test_sources_named_take_no_part() -> None:
    """Leaving rows out by their sources is adjusting without them."""
    job, _ = jobs("slope_distance", 3, {})
    rows = job.observations[1]
    assert rows.kind == "slope_distance"
    chosen = np.arange(len(rows)) != 5
    fewer = replace(job, observations=(job.observations[0], rows.take(chosen), *job.observations[2:]))
    source = rows.provenance.label(5)
    named = variance_components(adjust(job), without=[source], robust=False)
    dropped = factors(variance_components(adjust(fewer), robust=False))
    assert next(each for each in named if each.kind == "slope_distance").left_out == (source,)
    for name, factor in factors(named).items():
        assert factor == pytest.approx(dropped[name], rel=0.01), name  # both stop within a hundredth


def test_a_mark_that_hangs_on_rows_left_out_stays() -> None:
    """All rows of a mark left out: the network stays determined, and the others are judged without them."""
    job, _ = jobs("height_difference", 2, {})
    rows = job.observations[0]
    here = [rows.provenance.label(row) for row in np.flatnonzero((rows.marks == 5).any(axis=1)).tolist()]
    found = variance_components(adjust(job), here)
    assert found[0].left_out == tuple(here)
    assert found[0].redundancy == pytest.approx(19 - len(here) + 1, abs=1e-6)


def test_a_network_that_other_weights_leave_undetermined_is_not_judged(monkeypatch: pytest.MonkeyPatch) -> None:
    adjustment = adjust(jobs("height_difference", 2, {})[0])

    def refuse(self: Factor, weights: FloatArray) -> Factor:
        raise RankDefect(np.array([0]), np.ones(1))

    monkeypatch.setattr(Factor, "reweighted", refuse)
    assert variance_components(adjustment) == ()


@pytest.mark.parametrize("name", ["levelling", "mixed"])
def test_exact_data_leave_nothing_out(name: str) -> None:
    plan = NETWORKS[name](np.random.default_rng(1))
    for found in variance_components(adjust(exact(plan, plan.marks.given))):
        assert found.left_out == ()
        assert not found.factor > 0.1


@pytest.mark.parametrize("components", [1, 2, 3])
def test_constants_of_the_bounded_scale(components: int) -> None:
    """Against numerical integration over the χ² density."""
    c = bound(components)
    assert chi2.sf(c, components) == pytest.approx(chi2.sf(6.25, 1), rel=1e-9)

    def mean(function: object, upper: float = np.inf) -> float:
        return float(quad(lambda t: function(t) * chi2.pdf(t, components), 0, upper, points=None, limit=200)[0])  # type: ignore[operator]

    tail = chi2.sf(c, components)
    first = mean(lambda t: t, c) + c * tail
    assert consistency(components) == pytest.approx(first / components, rel=1e-6)
    variance = mean(lambda t: t**2, c) + c**2 * tail - first**2
    slope = mean(lambda t: t, c)
    assert inefficiency(components) == pytest.approx(variance / slope**2 * components / 2, rel=1e-6)


def test_bounded_scale_is_right_on_average_and_bounded() -> None:
    generator = np.random.default_rng(5)
    w = 1.7 * generator.standard_normal(100_000)
    redundancy = generator.uniform(0.2, 0.9, len(w))
    ones, one_group = np.ones(len(w), dtype=np.int64), np.zeros(len(w), dtype=np.int64)

    def scale(test: np.ndarray) -> float:
        return float(np.sqrt(bounded_scales(redundancy * test, test, redundancy, ones, one_group, 1)[0]))

    assert scale(w**2) == pytest.approx(1.7, abs=4 * 1.7 / np.sqrt(2 * len(w)) * 1.2)
    spoilt = np.where(np.arange(len(w)) % 20 == 0, 1e6, w)
    assert scale(spoilt**2) < 1.3 * 1.7

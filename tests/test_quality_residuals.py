"""Residual tests and reliability: what they must obey whatever the network."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import chdtrc, ndtr, stdtr

from adjust.quality import (
    checked_information,
    critical_tau,
    critical_w,
    external_reliability,
    global_test,
    minimal_detectable_bias,
    non_centrality,
    normalised_residual,
    studentised_residual,
)


@pytest.fixture(scope="module")
def network():
    """A random linear model with correlated observations: A, covariance, P, C and Q_vv, dense."""
    rng = np.random.default_rng(5)
    design = rng.standard_normal((12, 5))
    root = np.tril(rng.standard_normal((12, 12))) / 4 + np.eye(12)
    covariance = root @ root.T
    weight = np.linalg.inv(covariance)
    unknowns = np.linalg.inv(design.T @ weight @ design)
    return design, covariance, weight, unknowns, covariance - design @ unknowns @ design.T


def observed(network, bias=None):
    """Many simulated sets of errors (trials, n) and the residuals they leave."""
    design, covariance, weight, unknowns, _ = network
    rng = np.random.default_rng(11)
    errors = rng.standard_normal((50_000, 12)) @ np.linalg.cholesky(covariance).T
    if bias is not None:
        errors = errors + bias
    return errors @ (design @ unknowns @ design.T @ weight - np.eye(12)).T


def test_w_is_standard_normal_for_correlated_observations(network):
    weight, information = network[2], np.diag(network[2] @ network[4] @ network[2])
    w = normalised_residual(observed(network) @ weight, information)
    np.testing.assert_allclose(w.mean(axis=0), 0, rtol=0, atol=4 / math.sqrt(50_000))
    np.testing.assert_allclose(w.var(axis=0), 1, rtol=0, atol=4 * math.sqrt(2 / 50_000))
    rejected = np.mean(np.abs(w) > critical_w(0.05))
    assert rejected == pytest.approx(0.05, rel=0, abs=0.003)


def test_tau_keeps_its_significance(network):
    weight, information = network[2], np.diag(network[2] @ network[4] @ network[2])
    residual = observed(network)
    w = normalised_residual(residual @ weight, information)
    factor = np.einsum("ti,ij,tj->t", residual, weight, residual) / 7
    tau = np.array([studentised_residual(w[trial], factor[trial]) for trial in range(5000)])
    assert np.abs(tau).max() <= math.sqrt(7) * (1 + 1e-12)
    rejected = np.mean(np.abs(tau) > critical_tau(0.05, 7))
    assert rejected == pytest.approx(0.05, rel=0, abs=0.004)


def test_a_minimal_bias_is_found_with_the_stated_power(network):
    """Puts the least detectable bias into one component and counts how often |w| passes its bound."""
    weight, information = network[2], np.diag(network[2] @ network[4] @ network[2])
    bias = np.zeros(12)
    bias[3] = minimal_detectable_bias(information, non_centrality(0.01, 0.8))[3]
    w = normalised_residual(observed(network, bias) @ weight, information)[:, 3]
    assert np.mean(np.abs(w) > critical_w(0.01)) == pytest.approx(0.8, rel=0, abs=4 * math.sqrt(0.16 / 50_000))
    assert w.mean() == pytest.approx(-math.sqrt(non_centrality(0.01, 0.8)), rel=0, abs=0.02)  # adjusted − observed


def test_external_reliability_bounds_every_function_of_the_unknowns(network):
    design, _, weight, unknowns, cofactor = network
    information, own = np.diag(weight @ cofactor @ weight), np.diag(weight)
    level = non_centrality(0.001, 0.8)
    bias = minimal_detectable_bias(information, level)
    effect = unknowns @ design.T @ weight * bias  # column j: what the least bias of observation j does
    norm = np.sqrt(np.einsum("uj,uv,vj->j", effect, np.linalg.inv(unknowns), effect))
    np.testing.assert_allclose(norm, external_reliability(information, own, level), rtol=1e-9)
    functions = np.random.default_rng(2).standard_normal((1000, 5))
    sd = np.sqrt(np.einsum("fu,uv,fv->f", functions, unknowns, functions))
    assert np.all(np.abs(functions @ effect) / sd[:, None] <= norm * (1 + 1e-9))


def test_unchecked_observations_have_no_figures():
    information = checked_information(np.array([0.0, 1e-9, 0.5]), np.ones(3))
    np.testing.assert_array_equal(np.isnan(information), [True, True, False])
    np.testing.assert_array_equal(np.isnan(normalised_residual(np.ones(3), information)), [True, True, False])
    np.testing.assert_array_equal(np.isnan(minimal_detectable_bias(information, 17.0)), [True, True, False])
    np.testing.assert_array_equal(np.isnan(external_reliability(information, np.ones(3), 17.0)), [True, True, False])


@pytest.mark.parametrize("variance_factor", [0.0, math.nan])
def test_tau_needs_an_estimated_sigma(variance_factor):
    assert np.isnan(studentised_residual(np.array([1.0]), variance_factor)).all()


@given(st.floats(1e-6, 0.5), st.integers(2, 10_000))
def test_tau_turns_back_into_student_t(significance, freedom):
    """Pope's relation, read the other way: t = τ √(f − 1)/√(f − τ²)."""
    tau = critical_tau(significance, freedom)
    assert tau < math.sqrt(freedom)
    rest = freedom - tau**2
    if rest > 1e-6 * freedom:  # nearer to √f the difference has no digits left
        t = tau * math.sqrt((freedom - 1) / rest)
        assert 2 * stdtr(freedom - 1, -t) == pytest.approx(significance, rel=1e-6)


def test_tau_approaches_w_and_cannot_test_with_one_degree_of_freedom():
    assert critical_tau(0.001, 10**7) == pytest.approx(critical_w(0.001), rel=0, abs=1e-5)
    assert critical_tau(0.001, 1) == math.inf
    assert critical_tau(0.001, 0) == math.inf


@given(st.floats(1e-5, 0.4), st.floats(0.5, 0.999))
def test_non_centrality_gives_the_power_in_one_dimension(significance, power):
    shift, bound = math.sqrt(non_centrality(significance, power)), critical_w(significance)
    assert ndtr(shift - bound) + ndtr(-shift - bound) == pytest.approx(power, rel=1e-9)


@pytest.mark.parametrize(("significance", "power"), [(0.5, 0.4), (0.0, 0.8), (0.05, 1.0), (0.05, 0.05)])
def test_impossible_power_is_refused(significance, power):
    with pytest.raises(ValueError, match="cannot have the power"):
        non_centrality(significance, power)


@given(st.integers(1, 100_000), st.floats(0.5, 0.9999))
def test_global_test_leaves_equal_tails(freedom, confidence):
    bounds = global_test(float(freedom), freedom, confidence)
    tail = (1 - confidence) / 2
    assert chdtrc(freedom, bounds.upper) == pytest.approx(tail, rel=1e-6)
    assert 1 - chdtrc(freedom, bounds.lower) == pytest.approx(tail, rel=1e-6, abs=1e-12)
    assert bounds.passed == (bounds.lower <= freedom <= bounds.upper)


def test_global_test_takes_both_sides_and_says_when_there_is_nothing_to_test():
    assert global_test(10.0, 10, 0.95).passed is True
    assert global_test(100.0, 10, 0.95).passed is False
    assert global_test(0.01, 10, 0.95).passed is False
    empty = global_test(0.0, 0, 0.95)
    assert empty.passed is None
    assert math.isnan(empty.lower)
    assert math.isnan(empty.upper)

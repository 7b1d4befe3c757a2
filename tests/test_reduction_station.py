"""Station adjustment: means where all targets are there, least squares where some are missing."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.angles import FULL_TURN, wrapped
from adjust.reductions.spread import mean_of_repeats, spread_from
from adjust.reductions.station import adjust_station
from adjust.units import ARCSEC

EXACT = 1e-12
"""Radians: rounding."""


def dense(reading, target, turn, variance):
    """The same by a plain least-squares solution of minimal norm, directions from the first target."""
    rows = len(reading)
    matrix = np.zeros((rows, target.max() + turn.max() + 2))
    matrix[np.arange(rows), target] = 1
    matrix[np.arange(rows), target.max() + 1 + turn] = -1
    weight = 1 / np.sqrt(variance)
    solution = np.linalg.lstsq(matrix * weight[:, None], reading * weight, rcond=None)[0]
    return solution[: target.max() + 1] - solution[0], matrix @ solution - reading


def test_complete_rounds_are_means():
    readings = np.array([[0.1, 1.2, 2.5], [1.1, 2.2003, 3.4999], [2.1001, 3.2, 4.5002]])
    turn, target = (grid.ravel() for grid in np.indices(readings.shape))
    result = adjust_station(readings.ravel(), target, turn, np.ones(9))
    reduced = readings - readings[:, :1]
    np.testing.assert_allclose(result.direction, reduced.mean(axis=0), rtol=0, atol=EXACT)
    np.testing.assert_allclose(result.variance, 1 / 3, rtol=0, atol=EXACT)
    assert result.redundancy == 4  # (rounds − 1)(targets − 1), ISO 17123-3


@given(st.integers(2, 7), st.integers(1, 5), st.integers(0, 2**32))
def test_missing_targets_against_a_plain_least_squares_solution(targets, rounds, seed):
    generator = np.random.default_rng(seed)
    turn, target = np.nonzero(generator.random((rounds, targets)) < np.where(np.arange(targets) == 0, 1.0, 0.6))
    target = np.unique(target, return_inverse=True)[1]
    targets = target.max() + 1
    true = np.cumsum(generator.uniform(0.1, 0.5, targets))
    reading = true[target] - 0.3 * turn + generator.normal(0, 1e-4, len(turn))
    variance = generator.choice([1.0, 2.0], len(turn)) * 1e-8
    result = adjust_station(np.remainder(reading, FULL_TURN), target, turn, variance)
    direction, residual = dense(reading, target, turn, variance)
    np.testing.assert_allclose(wrapped(result.direction - direction), 0, rtol=0, atol=1e-10)
    np.testing.assert_allclose(result.residual, residual, rtol=0, atol=1e-10)
    assert result.redundancy == len(turn) - targets - rounds + 1


def test_covariance_is_that_of_many_repetitions():
    """Five targets, the last missing in the second of two rounds; differences of directions, 2,000 simulated setups."""
    target, turn = np.array([0, 1, 2, 3, 4, 0, 1, 2, 3]), np.array([0, 0, 0, 0, 0, 1, 1, 1, 1])
    generator = np.random.default_rng(72)
    noise = generator.standard_normal((2_000, 9)) * ARCSEC
    found = np.array([wrapped(adjust_station(row, target, turn, np.ones(9)).direction) for row in noise]) / ARCSEC
    covariance = adjust_station(noise[0], target, turn, np.ones(9)).covariance
    theory = covariance - covariance[:, :1] - covariance[:1] + covariance[0, 0]
    np.testing.assert_allclose(np.cov(found.T), theory, rtol=0, atol=0.2)  # arcsec²: 3 standard errors


def incomplete():
    target = np.array([0, 1, 2, 3, 4, 0, 1, 2, 0, 3, 4])
    turn = np.array([0, 0, 0, 0, 0, 1, 1, 1, 2, 2, 2])
    variance = np.array([1, 1, 1, 2, 1, 1, 1, 2, 1, 1, 1.0])
    return adjust_station(np.zeros(11), target, turn, variance)


def test_equivalent_variances_keep_every_deviation_and_the_expected_statistic():
    """What the docstring of `equivalent_variances` promises, recomputed from the covariance."""
    result = incomplete()
    weight = 1 / result.variance
    deviation = np.eye(5) - weight / weight.sum()
    true = np.einsum("ij,jk,ik->i", deviation, result.covariance, deviation)
    np.testing.assert_allclose(true, result.variance - 1 / weight.sum(), rtol=0, atol=1e-8)  # as the weights settle
    assert np.sum(weight * true) == pytest.approx(4, rel=0, abs=1e-8)


def test_equivalent_variances_misstate_differences_little():
    """The sd of the angle between two targets, stated over true: 0.957 … 1.08 in these very incomplete rounds."""
    result = incomplete()
    diagonal = np.diag(result.covariance)
    pairs = np.triu_indices(5, 1)
    true = (diagonal[:, None] + diagonal - 2 * result.covariance)[pairs]
    stated = (result.variance[:, None] + result.variance)[pairs]
    ratio = np.sqrt(stated / true)
    assert 0.95 < ratio.min() < ratio.max() < 1.09


def test_rounds_without_a_common_target_stay_apart():
    reading = np.array([0.5, 1.0, 2.0, 3.1])
    result = adjust_station(reading, np.array([0, 1, 2, 3]), np.array([0, 0, 1, 1]), np.ones(4))
    assert result.part.tolist() == [0, 0, 1, 1]
    np.testing.assert_allclose(result.direction, [0, 0.5, 0, 1.1], rtol=0, atol=EXACT)
    np.testing.assert_allclose(result.variance, 1.0, rtol=0, atol=EXACT)
    assert result.redundancy == 0


def test_spread_against_the_stated_sd():
    """Over 2,000 setups of four rounds the χ² test at 95 % fails 5 % of the time (3 standard errors: 1.5 %)."""
    generator = np.random.default_rng(73)
    turn, target = (grid.ravel() for grid in np.indices((4, 5)))
    variance = np.full(20, ARCSEC**2)
    failed = 0
    for _ in range(2000):
        result = adjust_station(generator.standard_normal(20) * ARCSEC, target, turn, variance)
        statistic = np.sum(result.residual**2 / variance)
        spread = spread_from(statistic, result.redundancy, 0.95)
        failed += not spread.test.passed
    assert failed / 2000 == pytest.approx(0.05, rel=0, abs=0.015)


def test_spread_without_redundancy_says_nothing():
    spread = spread_from(0.0, 0, 0.95)
    assert np.isnan(spread.factor)
    assert spread.test.passed is None


def test_means_of_repeats():
    result = mean_of_repeats(np.array([1.0, 5.0, 3.0, 2.0]), np.array([1.0, 2.0, 1.0, 2.0]), np.array([0, 1, 0, 0]), 2)
    np.testing.assert_allclose(result.mean, [2.0, 5.0], rtol=0, atol=EXACT)
    np.testing.assert_allclose(result.variance, [0.4, 2.0], rtol=0, atol=EXACT)
    np.testing.assert_allclose(result.residual, [1.0, 0.0, -1.0, 0.0], rtol=0, atol=EXACT)

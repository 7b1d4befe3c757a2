"""Odds of mistakes against each other and against none, and the test against chance."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import multivariate_normal

from adjust.blunders.mistakes.priors import NO_COMMON_MISTAKE, ORDERS_OF_SIZE
from adjust.blunders.mistakes.weighing import Weighing


def weighing(
    found: list[float],
    covariance: list[list[float]],
    errors: list[list[float]],
    loose: list[list[float]] | None = None,
    circle: bool = False,
) -> Weighing:
    every = np.array(errors)
    open_part = np.zeros_like(every) if loose is None else np.array(loose)
    return Weighing(np.array(found), np.array(covariance), every, open_part, np.full(len(every), 2.0), circle)


def test_likelihoods_are_those_of_the_normal_distribution() -> None:
    covariance = np.array([[4.0, 1.0, 0.5], [1.0, 3.0, -0.2], [0.5, -0.2, 2.0]])
    found, errors = [9.0, -7.0, 3.0], [[8.0, -8.0, 2.0], [0.0, 0.0, 0.0]]
    loose = [[0.0, 0.0, 0.0], [5.0, -4.0, 1.0]]
    ours = weighing(found, covariance.tolist(), errors, loose)
    for place in range(2):
        total = covariance + np.outer(loose[place], loose[place])
        density = multivariate_normal(errors[place], total).logpdf(found)
        whitened = np.log(2.0) + density + 0.5 * np.log(np.linalg.det(covariance))
        assert ours.weights[place] == pytest.approx(whitened, rel=0, abs=1e-12)  # logarithm: rounding


def test_errors_of_no_mistake_have_a_density_that_adds_up() -> None:
    """∫ over one to R standard deviations on either side is the prior itself."""
    sizes = np.geomspace(1.0, ORDERS_OF_SIZE, 20001)
    ours = weighing([1.0], [[0.25]], [[0.0]])
    density = np.exp(ours._none(sizes[:, None] * 0.5))
    assert 2 * np.trapezoid(density, sizes) == pytest.approx(NO_COMMON_MISTAKE, rel=1e-5)


def test_what_stays_open_takes_the_value_that_fits() -> None:
    ours = weighing([1.6], [[1e-6]], [[0.0]], [[1.5]])
    assert ours.stood_for(0) == pytest.approx([1.6], rel=0, abs=2e-6)  # m: (1 mm)² / (1.5 m)² of 1.6 m is 1 µm
    assert ours.misfits[0] == pytest.approx(1.6 / np.hypot(1.5, 1e-3), rel=1e-9)


def test_a_full_turn_is_no_misfit() -> None:
    assert weighing([np.pi - 0.01], [[0.01**2]], [[-np.pi]], circle=True).misfits[0] == pytest.approx(1.0)


@pytest.mark.parametrize("misfit", [0.5, 1.0, 2.0])
def test_chance_is_the_share_of_better_fits(misfit: float) -> None:
    """One possible error e: errors from |∇|/2 to 2|∇| on either side are closer to it in 2 |∇ − e| / 3 |∇| of cases."""
    found, sd = 20.0, 1.0
    ours = weighing([found], [[sd**2]], [[found + misfit * sd]])
    expected = 2 * misfit * sd / (3 * found)
    assert ours.chance == pytest.approx(expected, rel=0, abs=0.02)  # share: three standard errors of 500 samples


def test_many_possible_errors_leave_everything_to_chance() -> None:
    everywhere = np.arange(-60.0, 60.0)[:, None]
    assert weighing([20.3], [[1.0]], everywhere.tolist()).chance > 0.3


def test_chance_of_a_direction_in_space_is_small() -> None:
    vertical = weighing([0.0, 0.0, 30.0], np.eye(3).tolist(), [[0.0, 0.0, 0.0]], [[0.0, 0.0, 100.0]])
    assert vertical.chance <= 0.01

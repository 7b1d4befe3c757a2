"""NIST's certified regressions, scored in matching digits."""

import numpy as np
import pytest

from tests.studies.certified_digits import (
    QUANTITIES,
    by_block_qr,
    by_normal_equations,
    regressions,
    score,
)

REGRESSIONS = {regression.name: regression for regression in regressions()}

LEAST = {
    "Longley": (10.5, 12.0),
    "Norris": (12.0, 13.0),
    "NoInt1": (14.0, 14.0),
    "NoInt2": (14.0, 14.0),
    "Wampler1": (8.5, 9.0),
    "Wampler2": (12.0, 13.0),
    "Wampler3": (8.5, 12.5),
    "Wampler4": (7.0, 12.5),
    "Wampler5": (5.0, 12.5),
    "Filip": (7.0, 7.0),
}
"""Digits of the coefficients and of their sds that orthogonal methods reach in double precision: 16 − log₁₀ κ for the
sds; the coefficients lose with the size of the residuals too (κ² |r|, Golub & Van Loan 2013, section 5.3.7)."""


def test_all_datasets_are_there():
    assert set(REGRESSIONS) == set(LEAST)
    assert [len(r.certified) for r in REGRESSIONS.values()] == [4, *[5] * 9]  # Longley's sum of squares is not given


@pytest.mark.parametrize("name", LEAST)
def test_digits_of_the_solver(name):
    found = score(REGRESSIONS[name], by_block_qr)
    coefficients, sds = LEAST[name]
    assert found["B"] >= coefficients
    assert found["sd_B"] >= sds
    assert found["residual_sd"] >= min(sds, 13.0)
    assert found["R2"] >= 11.0


def test_normal_equations_have_no_digit_of_filip_left():
    lost = score(REGRESSIONS["Filip"], by_normal_equations)
    assert lost["B"] < 1.0
    assert lost["sd_B"] < 1.0


def test_normal_equations_lose_digits_wherever_columns_are_nearly_dependent():
    for name, regression in REGRESSIONS.items():
        if np.linalg.cond(regression.matrix / np.linalg.norm(regression.matrix, axis=0)) > 1e3:
            ours, theirs = score(regression, by_block_qr), score(regression, by_normal_equations)
            assert ours["sd_B"] - theirs["sd_B"] >= 1.5, name
            assert all(ours[quantity] >= theirs[quantity] - 1.0 for quantity in QUANTITIES), name

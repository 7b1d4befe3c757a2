"""A smaller run of the study of planted mistakes: the right explanation first, random errors left unexplained."""

from __future__ import annotations

import numpy as np
import pytest

from tests.studies.mistakes import OTHER, PLANTS, RIGHT, explain, random_errors, scored, verdict, with_other_priors
from tests.studies.planted import BOOKED, Plant

JOBS = 3
HARD = {("target constant", "a row"), ("height of another setup", "a setup")}
"""Where random errors come as near as often: docs/validation-mistakes.md says why."""


@pytest.mark.parametrize("plant", PLANTS, ids=lambda plant: f"{plant.mistake}, {plant.where}")
def test_planted_mistakes_are_seen_through(plant: Plant) -> None:
    counts = scored(plant, JOBS, seed=5).counts
    assert counts[OTHER] == 0
    if (plant.mistake, plant.where) not in HARD:
        assert counts[RIGHT] >= JOBS - 1


def test_most_planted_mistakes_stand_first() -> None:
    found = [verdict(case)[0] == RIGHT for plant in PLANTS for case in plant.cases(2, seed=6)]
    assert np.mean(found) >= 0.85


@pytest.mark.parametrize("most", [10.0, 1000.0])
def test_random_errors_stay_unexplained(most: float) -> None:
    explained = np.mean([bool(explain(context)) for context in random_errors(64, most, seed=7)])
    assert explained <= 0.05 + 3 * np.sqrt(0.05 * 0.95 / 64)  # three standard errors above 5 %


def test_priors_matter_little() -> None:
    with_table, without = with_other_priors(BOOKED[:12], 2, seed=8)
    assert with_table >= 0.85
    assert abs(with_table - without) <= 0.1  # of 24 jobs, two may change places

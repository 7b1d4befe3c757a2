"""Closures of raw readings: half-rounds, pairs of faces and single readings, and the lines of the book that they
name."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import chi2

from adjust import read_job
from adjust.network.closures import Check, check_job
from adjust.network.closures.closures import Judged
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_pointings import Habits
from tests.studies.mutations_raw import MISTAKES, RawMistake, outcome
from tests.studies.raw_readings import invented_plan

CHECKS = ("half_round", "collimation", "vertical_index", "direction_reading", "zenith_reading", "distance_reading")
Amend = Callable[[dict[str, list[str]]], None]


def checked(folder: Path, habits: Habits, seed: int = 3, amend: Amend | None = None) -> Check:
    generator = np.random.default_rng(seed)
    raw = read_by_a_party(invented_plan(generator), generator, habits).folder
    if amend is not None:
        amend(raw.tables["pointings"])
    raw.write(folder)
    return check_job(read_job(folder))


def judged(check: Check, name: str) -> Judged:
    (found,) = (judged for judged in check.closures if judged.closures.check == name)
    return found


def test_every_reading_closes_something(tmp_path: Path) -> None:
    check = checked(tmp_path, Habits(closes_horizon=True))
    names = [judged.closures.check for judged in check.closures]
    assert names[: len(CHECKS)] == [
        "half_round",
        "collimation",
        "direction_reading",
        "vertical_index",
        "zenith_reading",
        "distance_reading",
    ]
    assert check.passed
    for name in CHECKS:
        closures = judged(check, name).closures
        assert len(closures.sources) == len(closures)
        assert all(source.startswith("pointings.csv:") for source in closures.sources)
        # each went into an observation, which names the same line among its own
        for number, source in enumerate(closures.sources):
            (row,) = closures.rows[number].tolist()
            first = source.split(":")[1].split("+")[0]
            assert first in check.observed.source(row).split(":")[1].split("+")


def test_readings_scatter_as_the_sds_promise(tmp_path: Path) -> None:
    """Over ten books without eccentricity: half-rounds have a mean square of 1 within χ² bounds, pairs of faces
    somewhat less, residuals of readings the share that their means leave."""
    squares: dict[str, list[float]] = {}
    for seed in range(10):
        habits = Habits(closes_horizon=True, eccentricity=0.0, missing=0.0)
        check = checked(tmp_path / str(seed), habits, seed)
        for name in CHECKS:
            closures = judged(check, name).closures
            squares.setdefault(name, []).extend(((closures.misclosure / closures.sd) ** 2).ravel().tolist())
    freedom = len(squares["half_round"])
    lowest, highest = chi2.ppf([1e-4, 1 - 1e-4], freedom) / freedom
    assert lowest < np.mean(squares["half_round"]) < highest
    # a target read twice on a face has less than the sd stated, and a spread found too wide by chance is made the sd
    assert 0.6 < np.mean(squares["collimation"]) < 1.0
    assert 0.6 < np.mean(squares["vertical_index"]) < 1.0
    for name in ("direction_reading", "zenith_reading", "distance_reading"):
        assert 0.2 < np.mean(squares[name]) < 1.0, name


def test_an_eccentric_circle_is_no_mistake(tmp_path: Path) -> None:
    check = checked(tmp_path, Habits(eccentricity=20.0 * np.pi / 648_000))
    pairs = judged(check, "collimation")
    assert np.abs(pairs.closures.misclosure).max() > 5 * 1.5 * np.pi / 648_000
    assert check.passed


@pytest.mark.parametrize("unit", ["circle_deg", "zenith_deg"])
def test_a_slip_of_one_face_names_its_lines(unit: str, tmp_path: Path) -> None:
    """Half a minute on one reading: the pair of faces that it belongs to exceeds."""

    def amend(pointings: dict[str, list[str]]) -> None:
        pointings[unit][40] = repr(float(pointings[unit][40]) + 1.0 / 120.0)

    check = checked(tmp_path, Habits(eccentricity=0.0), amend=amend)
    pairs = judged(check, {"circle_deg": "collimation", "zenith_deg": "vertical_index"}[unit])
    worst = int(np.argmax(pairs.severity))
    assert pairs.exceeds[worst]
    assert "42" in pairs.closures.sources[worst].split(":")[1].split("+")
    assert "42" in check.observed.source(check.suspicions[0].rows[0]).split(":")[1].split("+")


WITHIN_NOISE = ("a face left out", "temperature", "pressure")
"""What leaves the observations within their noise, so that nothing can be seen: the study's page says how often it
is."""
SEEN = [mistake for mistake in MISTAKES if not mistake.name.startswith(WITHIN_NOISE)]


@pytest.mark.parametrize("mistake", SEEN, ids=lambda mistake: mistake.name)
def test_gross_errors_in_a_book_are_pointed_at(mistake: RawMistake) -> None:
    """A small run of the study."""
    outcomes = [outcome(mistake, number) for number in range(5)]
    pointed = sum(result.loop for result in outcomes if result.checked)
    assert pointed >= 0.8 * sum(result.checked for result in outcomes)

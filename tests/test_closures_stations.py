"""Angles that close round one station, control directions, reciprocal zenith angles and repeated lengths, by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from adjust.job import Job
from adjust.network.closures import Check, check_job
from adjust.network.closures.closures import Closures
from adjust.observations.zenith import EARTH_RADIUS
from adjust.tolerances import Quantity, Rule, Tolerances
from adjust.units import ARCSEC
from tests.building import ANGLE_SD, LENGTH_SD, build_job, exact, truth_of

TRUTH = {"S": (0.0, 0.0, 10.0), "A": (200.0, 10.0, 20.0), "B": (-90.0, 150.0, 5.0), "C": (-80.0, -170.0, 12.0)}
EXACT = 1e-12
"""Radians or metres: sums of a few numbers."""


def closed(job: Job) -> tuple[Check, dict[str, Closures]]:
    check = check_job(job)
    return check, {judged.closures.check: judged.closures for judged in check.closures}


def sources(check: Check, closures: Closures, number: int = 0) -> list[str]:
    return sorted(check.observed.source(row) for row in closures.rows[number].tolist())


def test_horizon_of_angles() -> None:
    """60° + 100° + 199°59′57″ go round with 3″ too few."""
    degrees = (60.0, 100.0, 200.0 - 3.0 / 3600.0)
    targets = (("A", "B"), ("B", "C"), ("C", "A"))
    angles = [("S", *pair, np.radians(angle)) for pair, angle in zip(targets, degrees, strict=True)]
    check, found = closed(build_job("SABC", angles=angles))
    horizon = found["horizon"]
    assert_allclose(horizon.misclosure, [[-3.0 * ARCSEC]], rtol=0, atol=EXACT)  # rad
    assert_allclose(horizon.sd, [[ANGLE_SD * np.sqrt(3.0)]], rtol=0, atol=EXACT)  # rad
    assert check.job.marks.names[horizon.marks[0][0]] == "S"
    assert sources(check, horizon) == ["angles.csv:2", "angles.csv:3", "angles.csv:4"]


def test_an_angle_and_its_explement_close_the_horizon() -> None:
    angles = [("S", "A", "B", np.radians(100.0)), ("S", "B", "A", np.radians(260.0) + 2 * ARCSEC)]
    _, found = closed(build_job("SAB", angles=angles))
    assert_allclose(found["horizon"].misclosure, [[2 * ARCSEC]], rtol=0, atol=EXACT)  # rad


def test_an_angle_of_two_rounds() -> None:
    """The second round reads the angle A to B 5″ larger; C, sighted in one round only, closes nothing."""
    first = [("r1", "S", "A", 0.0), ("r1", "S", "B", 1.0), ("r1", "S", "C", 2.0)]
    second = [("r2", "S", "A", 3.0), ("r2", "S", "B", 4.0 + 5 * ARCSEC)]
    check, found = closed(build_job("SABC", directions=first + second))
    again = found["repeated_angle"]
    assert len(again) == 1
    assert_allclose(np.abs(again.misclosure), [[5 * ARCSEC]], rtol=0, atol=EXACT)  # rad
    assert len(sources(check, again)) == 4


def test_rounds_without_a_common_target_stay_apart() -> None:
    rounds = [("r1", "S", "A", 0.0), ("r1", "S", "B", 1.0), ("r2", "S", "C", 2.0), ("r2", "S", "D", 1.0)]
    _, found = closed(build_job("SABCD", directions=rounds))
    assert found == {}


def test_an_angle_against_a_round() -> None:
    job = build_job(
        "SAB", directions=[("r", "S", "A", 1.0), ("r", "S", "B", 2.5)], angles=[("S", "A", "B", 1.5 - 4 * ARCSEC)]
    )
    _, found = closed(job)
    assert_allclose(np.abs(found["repeated_angle"].misclosure), [[4 * ARCSEC]], rtol=0, atol=EXACT)  # rad


def control_round(error: float) -> Job:
    """A round from S to three control marks, the last reading off by `error`."""
    job = exact(
        build_job(TRUTH, fixed="SABC", directions=[("r", "S", name) for name in "ABC"]),
        np.array([TRUTH[name] for name in "SABC"]),
    )
    (rows,) = job.observations
    rows.observed[2, 0] += error
    return job


def test_angles_between_control_marks() -> None:
    """Of three control marks one orients the station and two are checked: observed angle minus that of coordinates."""
    check, found = closed(control_round(6 * ARCSEC))
    orientation = found["orientation"]
    names = ["".join(check.job.marks.names[mark] for mark in orientation.marks[number]) for number in range(2)]
    assert names == ["ASB", "ASC"]
    assert_allclose(orientation.misclosure.ravel(), [0.0, 6 * ARCSEC], rtol=0, atol=EXACT)  # rad
    assert sources(check, orientation, 1) == ["directions.csv:2", "directions.csv:4"]


def test_own_figures_judge_angles_round_a_station() -> None:
    job = control_round(6 * ARCSEC)
    for limit, passed in ((5.0, False), (7.0, True)):
        own = {Quantity.STATION: (Rule(f'{limit:g}"', constant=limit * ARCSEC),)}
        assert check_job(_with(job, Tolerances(own=own))).passed is passed


def _with(job: Job, tolerances: Tolerances) -> Job:
    return replace(job, tolerances=tolerances)


def test_reciprocal_zenith_angles_imply_a_refraction_coefficient() -> None:
    """Observed with k = 0.20, reduced with the job's 0.13: s²(0.20 − 0.13)/R is missing, and k comes out as 0.20."""
    truth = {"A": (0.0, 0.0, 100.0), "B": (3000.0, 0.0, 140.0)}
    rows = [("A", "B", None, 1.5, 1.7), ("B", "A", None, 1.6, 1.4)]
    job = build_job(truth, fixed="AB", zeniths=rows, refraction_coefficient=0.20)
    observed = exact(job, truth_of(job, truth))
    _, found = closed(replace(observed, refraction_coefficient=0.13))
    pair = found["reciprocal_zenith"]
    assert_allclose(
        pair.misclosure, [[3000.0**2 * 0.07 / EARTH_RADIUS]], rtol=0, atol=1e-8
    )  # m: second order of bending
    assert_allclose(pair.figures["refraction"], [0.20], rtol=0, atol=1e-6)
    # both angles' sds over s, in units of s²/R
    assert_allclose(pair.figures["refraction_sd"], [np.sqrt(2.0) * ANGLE_SD * EARTH_RADIUS / 3000.0], rtol=1e-3)


def test_a_wrong_target_height_shows_in_the_reciprocal_pair() -> None:
    truth = {"A": (0.0, 0.0, 100.0), "B": (150.0, 0.0, 104.0)}
    job = build_job(truth, fixed="AB", zeniths=[("A", "B", None, 1.5, 1.7), ("B", "A", None, 1.6, 1.4)])
    job = exact(job, truth_of(job, truth))
    (rows,) = (kind for kind in job.observations if kind.kind == "zenith")
    rows.heights[0, 1] += 0.1  # type: ignore[attr-defined]
    check, found = closed(job)
    assert_allclose(found["reciprocal_zenith"].misclosure, [[-0.1]], rtol=0, atol=1e-9)  # m
    assert any("0.1 m" in clue.text for clue in check.clues)


def test_lengths_from_both_ends_and_from_slopes() -> None:
    """A horizontal distance against a slope distance reduced by its own zenith angle: they disagree by 4 mm."""
    truth = {"A": (0.0, 0.0, 100.0), "B": (300.0, 0.0, 140.0)}
    job = build_job(
        truth,
        fixed="AB",
        horizontals=[("A", "B")],
        slopes=[("B", "A", None, 1.5, 1.7)],
        zeniths=[("B", "A", None, 1.5, 1.7)],
    )
    job = exact(job, truth_of(job, truth))
    (level,) = (kind for kind in job.observations if kind.kind == "horizontal_distance")
    level.observed[0, 0] += 0.004
    _, found = closed(job)
    repeats = found["distance_repeats"]
    assert_allclose(np.abs(repeats.misclosure), [[0.004]], rtol=0, atol=1e-9)  # m
    assert_allclose(repeats.sd, [[LENGTH_SD * np.sqrt(2.0)]], rtol=0, atol=EXACT)  # m
    # between control marks: the mean of the two against the coordinates
    assert_allclose(np.abs(found["control_distance"].misclosure), [[0.002]], rtol=0, atol=1e-9)  # m


@pytest.mark.parametrize("with_heights", [True, False])
def test_a_slope_without_zenith_angle_is_levelled_by_heights(with_heights: bool) -> None:
    truth = {"A": (0.0, 0.0, 100.0), "B": (300.0, 0.0, 140.0)}
    given = truth if with_heights else {name: place[:2] for name, place in truth.items()}
    job = build_job(given, fixed_plan="AB", slopes=[("A", "B", None, 1.5, 1.7)])
    slope = float(np.hypot(300.0, 40.2))
    job.observations[0].observed[0, 0] = slope
    _, found = closed(job)
    if with_heights:
        assert_allclose(found["control_distance"].misclosure, [[0.0]], rtol=0, atol=1e-9)  # m
    else:
        # a plan-only job without heights is level by contract, or not reducible at all
        assert "control_distance" not in found or found["control_distance"].misclosure[0, 0] > 2.0

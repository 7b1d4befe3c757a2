"""The adjustment against dense algebra: solution, covariance, reliability, inner constraints."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from adjust import NetworkError, adjust
from adjust.adjusting import REBUILT
from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray
from adjust.datum import motions_of
from adjust.frames import EllipsoidFrame
from adjust.job import Datum, Job
from adjust.model import State, build_model
from adjust.network import datum_parts
from tests.building import ARC_SECOND, LENGTH_SD, build_job, exact, truth_of

TRUTH = {"07": (0.0, 0.0, 10.0), "B": (1000.0, 50.0, 20.0), "C": (900.0, 800.0, 15.0), "D": (-50.0, 700.0, 30.0)}
PAIRS = [(at, to) for at in TRUTH for to in TRUTH if at != to]


def with_noise(job: Job, seed: int = 1) -> Job:
    generator = np.random.default_rng(seed)
    sds = {"m": LENGTH_SD, "rad": ARC_SECOND}
    noisy = [
        rows
        if rows.kind == "control"
        else replace(rows, observed=rows.observed + sds[rows.unit] * generator.normal(size=rows.observed.shape))
        for rows in job.observations
    ]
    return replace(job, observations=tuple(noisy))


def total_station_job(*, inner: bool = False, fixed: tuple[str, ...] = (), weighted: tuple[str, ...] = ()) -> Job:
    job = build_job(
        TRUTH,
        fixed=fixed,
        weighted=weighted,
        directions=[(f"at {at}", at, to) for at, to in PAIRS],
        slopes=PAIRS,
        zeniths=PAIRS,
        levels=[("07", "B"), ("B", "C"), ("C", "D")],
        inner=inner,
    )
    return with_noise(exact(job, truth_of(job, TRUTH)))


def dense_design(result: Adjustment) -> FloatArray:
    model = build_model(result.job, result.unknowns)
    design: FloatArray = model.linearise(State(result.geometry, result.orientations)).matrix.toarray()
    return design


def test_control_solution_is_the_least_squares_one() -> None:
    result = adjust(total_station_job(fixed=("07",), weighted=("B",)))
    design = dense_design(result)
    covariance = np.linalg.inv(design.T @ design)
    model = build_model(result.job, result.unknowns)
    gradient = design.T @ model.linearise(State(result.geometry, result.orientations)).right_side
    step = covariance @ gradient
    assert_allclose(
        step[: result.unknowns.coordinates], 0, rtol=0, atol=1e-7
    )  # m: at the minimum; quadratic convergence
    expected = np.sqrt(np.diag(covariance))[: result.unknowns.coordinates]
    found = result.standard_deviations[result.unknowns.sought]
    assert_allclose(found, expected, rtol=0, atol=1e-9)  # m: the dense inverse itself is good to 1e-12
    names = ["D", "07", "C"]
    columns = result.unknowns.columns[[3, 0, 2]].ravel()
    joint = np.where((columns >= 0)[:, None] & (columns >= 0), covariance[np.ix_(columns, columns)], 0.0)
    assert_allclose(result.covariance(names), joint, rtol=0, atol=1e-14)  # m²: sds of 1e-3 m to nine digits


def test_redundancy_sums_to_the_degrees_of_freedom() -> None:
    result = adjust(total_station_job(fixed=("07", "C")))
    redundancies = np.concatenate([table.redundancy.ravel() for table in result.residuals])
    assert redundancies.min() >= 0
    assert redundancies.max() <= 1 + 1e-12  # rounding
    assert_allclose(redundancies.sum(), result.solution.degrees_of_freedom, rtol=0, atol=1e-9)


def test_inner_constraints_against_the_bordered_normal_equations() -> None:
    result = adjust(total_station_job(inner=True))
    part = datum_parts(result.job, result.unknowns)[0]
    assert part.missing == {"east", "north", "height", "rotation"}
    design = dense_design(result)
    motions = motions_of(part, result.geometry, result.unknowns, range(4))
    assert np.abs(design @ motions).max() < 1e-6 * np.abs(design).max()  # the motions change no observation
    carried = np.where(np.arange(len(motions))[:, None] < result.unknowns.coordinates, motions, 0.0)
    bordered = np.block([[design.T @ design, carried], [carried.T, np.zeros((4, 4))]])
    expected = np.linalg.inv(bordered)[:12, :12]
    assert_allclose(result.covariance(list(TRUTH)), expected, rtol=0, atol=1e-14)  # m²: sds of 4e-4 m to seven digits
    moved = result.coordinates - truth_of(result.job, TRUTH)
    assert_allclose(moved.sum(axis=0), 0, rtol=0, atol=1e-9)  # m: the constraint itself
    assert result.solution.datum_defect == 4
    assert result.solution.degrees_of_freedom == 39 - 16 + 4


def test_inner_constraints_over_chosen_marks() -> None:
    job = total_station_job(inner=True)
    result = adjust(replace(job, datum=Datum("inner", (1, 3))))
    moved = (result.coordinates - truth_of(job, TRUTH))[[1, 3]]
    assert_allclose(moved.sum(axis=0), 0, rtol=0, atol=1e-9)  # m: the two marks carry the datum
    free = adjust(job)
    for one, other in zip(result.residuals, free.residuals, strict=True):
        assert_allclose(one.residual, other.residual, rtol=0, atol=1e-9)  # m, rad: residuals know no datum
        assert_allclose(one.w, other.w, rtol=0, atol=1e-5)


def test_inner_constraints_with_one_given_height_and_no_plan() -> None:
    job = total_station_job(inner=True)
    given = np.full_like(job.marks.given, np.nan)
    given[2, 2] = 12.0
    result = adjust(replace(job, marks=replace(job.marks, given=given)))
    assert_allclose(result.coordinates[2, 2], 12.0, rtol=0, atol=1e-9)  # m: it alone carries the height
    assert_allclose(result.standard_deviations[2, 2], 0, rtol=0, atol=1e-6)  # m
    plan, fitted = (np.hypot(*one.standard_deviations[:, :2].T) for one in (result, adjust(job)))
    assert_allclose(plan, fitted, rtol=0, atol=1e-8)  # m: the plan lies turned as it was drawn, no less certain


def test_inner_constraints_on_the_ellipsoid() -> None:
    frame = EllipsoidFrame("EPSG:25832")
    grid = np.array([[500000.0, 5500000.0], [503000.0, 5501000.0], [501000.0, 5504000.0], [504500.0, 5504000.0]])
    heights = np.array([[120.0], [180.0], [150.0], [90.0]])
    truth = dict(zip("PQRS", np.hstack([frame.from_grid(grid), heights]).tolist(), strict=True))
    lines = [("P", "Q"), ("Q", "R"), ("R", "S"), ("S", "P"), ("P", "R")]
    covariance = 1e-6 * (np.eye(3) + 0.3)
    job = build_job(truth, frame=frame, inner=True, vectors=[(*line, None, covariance) for line in lines])
    result = adjust(with_noise(exact(job, truth_of(job, truth)), seed=5))
    positions = frame.geocentric(result.geometry.spatial) - frame.geocentric(truth_of(job, truth))
    assert_allclose(positions.sum(axis=0), 0, rtol=0, atol=1e-8)  # m: geocentric shifts are the free motions
    assert result.solution.datum_defect == 3
    redundancies = sum(float(table.redundancy.sum()) for table in result.residuals)
    assert_allclose(redundancies, result.solution.degrees_of_freedom, rtol=0, atol=1e-9)


def test_relative_ellipse_of_any_two_marks_matches_the_observed_lines() -> None:
    result = adjust(total_station_job(fixed=("07",), weighted=("B",)))
    for index, (first, second) in enumerate(result.lines.tolist()):
        names = result.job.marks.names
        found = result.relative_ellipse(names[first], names[second])
        assert_allclose(
            found.semi_major, result.line_ellipses.semi_major[index], rtol=0, atol=1e-9
        )  # m: far below print
        assert_allclose(found.semi_minor, result.line_ellipses.semi_minor[index], rtol=0, atol=1e-9)  # m


def test_an_observation_between_fixed_marks_is_wholly_redundant() -> None:
    result = adjust(total_station_job(fixed=("07", "B", "C")))
    table = next(rows for rows in result.residuals if rows.observations.kind == "slope_distance")
    between = ~(table.observations.marks == 3).any(axis=1)
    assert_allclose(table.redundancy[between], 1, rtol=0, atol=1e-12)


def test_everything_fixed_is_said() -> None:
    job = build_job(TRUTH, fixed=list(TRUTH), levels=[("07", "B", 10.0)])
    with pytest.raises(NetworkError, match="nothing to adjust"):
        adjust(job)


def test_posterior_basis_scales_with_the_estimated_sigma() -> None:
    job = total_station_job(fixed=("07",), weighted=("B",))
    prior = adjust(job)
    posterior = adjust(replace(job, statistics=replace(job.statistics, sd_basis="posterior")))
    factor = prior.solution.variance_factor
    assert factor is not None
    assert_allclose(posterior.mark_covariances, prior.mark_covariances * factor, rtol=0, atol=1e-15)  # m²


def test_posterior_basis_without_degrees_of_freedom_knows_only_fixed_marks() -> None:
    marks = {"A": (0.0, 0.0, 10.0), "B": (0.0, 0.0, None)}
    job = build_job(marks, fixed_height=["A"], levels=[("A", "B", 2.0)])
    result = adjust(replace(job, statistics=replace(job.statistics, sd_basis="posterior")))
    assert result.standard_deviations[0, 2] == 0
    assert np.isnan(result.standard_deviations[1, 2])


@pytest.mark.parametrize("wrong", [[-1.0, -1.0, 1.0], [0.0, 0.0, 1.0]], ids=["mirrored", "all in one place"])
def test_start_coordinates_that_lead_nowhere_are_built_anew(wrong: list[float]) -> None:
    job = total_station_job(fixed=("07", "B"))
    given = job.marks.given.copy()
    given[2:] *= wrong
    result = adjust(replace(job, marks=replace(job.marks, given=given)))
    assert REBUILT in result.notes
    assert_allclose(result.coordinates, adjust(job).coordinates, rtol=0, atol=1e-6)  # m: the same minimum

"""Closures of whole networks: none where nothing is wrong, and misclosures of the size that the sds promise."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.stats import binom, chi2

from adjust.job import Job
from adjust.network.closures import Check, check_job
from adjust.network.closures.closures import Closures
from adjust.observations import Directions
from adjust.simulate import NETWORKS, observe, triangulation_grid
from tests.building import build_job, exact, shuffled, truth_of

EVERY_ANGLE = ("triangle", "quadrilateral", "angle_sum", "azimuth_link", "horizon", "repeated_angle", "orientation")
PLANE = 1e-9
"""Metres or radians: double precision at coordinates of hundreds of kilometres."""
ON_ELLIPSOID = {"reciprocal_zenith": 2e-4}
"""Metres: one radius of 6371 km stands for all sections of the ellipsoid, off by 0.4 % of s²/R where they differ
most."""
ELLIPSOID = 5e-5
"""Metres, in all else, lines of a few hundred metres."""


def closures_of(job: Job) -> Iterator[Closures]:
    return (judged.closures for judged in check_job(job).closures)


def named(check: Check, name: str) -> Closures:
    (found,) = (judged.closures for judged in check.closures if judged.closures.check == name)
    return found


@pytest.mark.parametrize("network", list(NETWORKS))
def test_exact_observations_close(network: str) -> None:
    plan = NETWORKS[network](np.random.default_rng(5))
    job = exact(plan, plan.marks.given)
    found = list(closures_of(job))
    assert found
    for closures in found:
        flat = job.frame.kind == "plane" or closures.check in EVERY_ANGLE
        tolerance = PLANE if flat else ON_ELLIPSOID.get(closures.check, ELLIPSOID)
        assert_allclose(closures.misclosure, 0.0, rtol=0, atol=tolerance)


@pytest.mark.parametrize("network", list(NETWORKS))
def test_misclosures_are_of_the_size_that_the_sds_promise(network: str) -> None:
    """(misclosure / sd)² averages to 1. Closures of one job share observations, so that the bounds are those of jobs:
    a job's mean has at least the spread of its number of independent closures, here taken as one in four."""
    ratios: dict[str, list[float]] = {}
    jobs = 12
    for seed in range(jobs):
        generator = np.random.default_rng([7, seed])
        job, _ = observe(NETWORKS[network](generator), generator)
        for closures in closures_of(job):
            squares = (closures.misclosure / closures.sd) ** 2
            ratios.setdefault(closures.check, []).extend(squares.ravel().tolist())
    for check, squares in ratios.items():
        freedom = max(len(squares) / 4, jobs)
        lowest, highest = chi2.ppf([1e-4, 1 - 1e-4], freedom) / freedom
        assert lowest < np.mean(squares) < highest, check


def test_sound_jobs_pass() -> None:
    """One in a hundred does not, by the confidence of the tolerances: of 70 hardly ever more than four (binomial,
    1 in 1000)."""
    failed = 0
    for seed in range(10):
        for network in NETWORKS.values():
            generator = np.random.default_rng([8, seed])
            job, _ = observe(network(generator), generator)
            check = check_job(job)
            assert check.remarks == ()
            failed += not check.passed
    assert failed <= binom.ppf(1 - 1e-3, 70, 0.01)


def test_as_many_angle_sums_as_the_figure_has() -> None:
    """A grid of triangles, sighted from both ends of every line, no two control marks in sight of each other: lines −
    marks + 1 figures, all of them triangles."""
    job, _ = observe(triangulation_grid(np.random.default_rng(1), 5, 6), np.random.default_rng(1))
    check = check_job(job)
    directions = next(rows for rows in job.observations if isinstance(rows, Directions))
    lines = len(directions) // 2
    assert len(named(check, "triangle")) == lines - len(job.marks) + 1
    assert not {judged.closures.check for judged in check.closures} & {"quadrilateral", "angle_sum", "azimuth_link"}


def test_the_order_of_rows_does_not_matter() -> None:
    generator = np.random.default_rng(3)
    job, _ = observe(NETWORKS["mixed"](generator), generator)
    one, other = check_job(job), check_job(shuffled(job, np.random.default_rng(4)))
    assert [(j.closures.check, len(j.closures)) for j in one.closures] == [
        (j.closures.check, len(j.closures)) for j in other.closures
    ]
    for check in ("level_loop", "triangle", "reciprocal_zenith"):
        sizes = [np.sort(np.abs(named(checked, check).misclosure.ravel())) for checked in (one, other)]
        assert_allclose(sizes[0], sizes[1], rtol=0, atol=1e-9)  # m or rad: sums in another order


def test_the_same_job_gives_the_same_check() -> None:
    generator = np.random.default_rng(3)
    job, _ = observe(NETWORKS["total station, plane"](generator), generator)
    one, other = (list(closures_of(job)) for _ in range(2))
    for first, second in zip(one, other, strict=True):
        assert first.marks.values.tolist() == second.marks.values.tolist()
        assert first.misclosure.tolist() == second.misclosure.tolist()


def test_spherical_excess_is_allowed_for() -> None:
    """A triangle of 20 km has an excess of 0.9″, far beyond what remains."""
    plan = NETWORKS["total station, ellipsoid"](np.random.default_rng(2))
    wide = replace(plan, marks=replace(plan.marks, deflection=np.zeros_like(plan.marks.deflection)))
    given = wide.marks.given.copy()
    given[:, :2] = given[:1, :2] + 20.0 * (given[:, :2] - given[:1, :2])
    job = exact(replace(wide, marks=replace(wide.marks, given=given)), given)
    triangles = named(check_job(job), "triangle")
    excess = triangles.figures["sum"] - np.pi
    assert np.degrees(excess.max()) * 3600 > 0.05
    assert_allclose(triangles.misclosure, 0.0, rtol=0, atol=1e-9)  # rad


def test_an_inner_job_has_no_control_to_close_on() -> None:
    plan = NETWORKS["levelling"](np.random.default_rng(1))
    free = replace(plan, datum=replace(plan.datum, mode="inner"))
    job, _ = observe(free, np.random.default_rng(1))
    assert {closures.check for closures in closures_of(job)} == {"level_loop"}


def test_a_job_without_start_coordinates_is_still_checked() -> None:
    """Two parts of which nothing says where they lie: angles and levels close all the same."""
    truth = {"A": (0.0, 0.0, 0.0), "B": (100.0, 0.0, 0.0), "C": (40.0, 80.0, 0.0), "X": (900.0, 900.0, 0.0)}
    sights = [(f"at {at}", at, to) for at in "ABC" for to in "ABC" if at != to]
    job = build_job(dict.fromkeys(truth), directions=sights, levels=[("A", "B"), ("B", "X"), ("X", "A")])
    check = check_job(exact(job, truth_of(job, truth)))
    assert {judged.closures.check for judged in check.closures} == {"triangle", "level_loop"}
    assert len(check.notes) == 1
    assert check.passed


def test_an_empty_job_has_nothing_to_close() -> None:
    check = check_job(build_job({"A": (0.0, 0.0, 1.0), "B": (1.0, 0.0, None)}, fixed="A", levels=[("A", "B", 1.0)]))
    assert check.closures == ()
    assert check.passed

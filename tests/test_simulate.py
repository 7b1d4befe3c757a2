"""The simulator: what it measures has the stated precision, and it forgets what a field party cannot know."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from adjust import Job
from adjust.field_book.builders import positive_definite
from adjust.job import Control, Datum
from adjust.observations import ControlCoordinates, Vectors
from adjust.simulate import (
    NETWORKS,
    WEIGHTED_SD,
    Blunder,
    Truth,
    gnss_net,
    levelling_net,
    mark_names,
    mixed_net,
    observe,
    tied_traverses,
    traverse_net,
    triangulated_grid,
    triangulation_grid,
    true_geometry,
)

RADIANS = 1e-12  # rad: rounding of angles of a few radians
METRES = 1e-9  # m: rounding of distances of kilometres


def measured(name: str, seed: int) -> tuple[Job, Truth, Job]:
    plan = NETWORKS[name](np.random.default_rng(seed))
    return *observe(plan, np.random.default_rng(seed + 1)), plan


@pytest.mark.parametrize("name", NETWORKS)
def test_one_seed_makes_one_job(name: str) -> None:
    first, second = measured(name, 5)[0], measured(name, 5)[0]
    np.testing.assert_array_equal(first.marks.given, second.marks.given)
    for rows, again in zip(first.observations, second.observations, strict=True):
        np.testing.assert_array_equal(rows.observed, again.observed)


@pytest.mark.parametrize("name", NETWORKS)
def test_noise_has_the_stated_precision(name: str) -> None:
    """Errors whitened by their covariance have mean 0 and variance 1: bounds of four of their standard errors."""
    errors = np.concatenate([whitened_errors(name, seed) for seed in range(25)])
    count = len(errors)
    assert abs(errors.mean()) < 4 / np.sqrt(count)
    assert abs(errors.var() - 1) < 4 * np.sqrt(2 / count)


def whitened_errors(name: str, seed: int) -> np.ndarray:
    job, truth, plan = measured(name, seed)
    geometry = true_geometry(plan)
    parts = []
    for rows in job.observations:
        error = rows.observed - rows.predict(geometry)
        if rows.setup is not None:
            error = error + truth.orientations[rows.setup][:, None]
        if rows.unit == "rad":
            error = (error + np.pi) % (2 * np.pi) - np.pi
        factor = np.linalg.cholesky(rows.covariance(geometry))
        parts.append(np.linalg.solve(factor, error[:, :, None]).ravel())
    return np.concatenate(parts)


@pytest.mark.parametrize("name", NETWORKS)
def test_control_is_known_and_the_rest_is_not(name: str) -> None:
    job, truth, plan = measured(name, 8)
    state = plan.marks.control[:, [0, 0, 1]]
    displaced = np.nan_to_num(job.frame.displacement(truth.coordinates, job.marks.given))
    fixed = state == Control.FIXED
    np.testing.assert_allclose(displaced[fixed], 0.0, rtol=0, atol=2e-9)  # m: once from the ellipsoid and back
    weighted = state == Control.WEIGHTED
    assert np.all(np.abs(displaced[weighted]) < 5 * WEIGHTED_SD.max())
    assert np.all(displaced[weighted] != 0)
    assert np.isnan(job.marks.given[state == Control.FREE]).all()


def test_weighted_control_is_off_along_the_grid() -> None:
    """The error of a weighted coordinate, along the grid's axes, is what the control observation sees at the truth."""
    job, _, plan = measured("mixed", 3)
    control = job.observations[-1]
    assert isinstance(control, ControlCoordinates)
    errors = control.predict(true_geometry(plan))[:, 0]
    assert np.all(np.abs(errors) < 5 * control.sd)
    assert np.all(errors != 0)


def test_rough_starts() -> None:
    plan = triangulation_grid(np.random.default_rng(1))
    job, truth = observe(plan, np.random.default_rng(2), start_sd=0.5)
    free = plan.marks.control[:, 0] == Control.FREE
    off = (job.marks.given - truth.coordinates)[free, :2]
    assert 0.3 < off.std() < 0.7
    np.testing.assert_array_equal(job.marks.given[~free], truth.coordinates[~free])


def test_a_free_network_carries_its_datum() -> None:
    plan = replace(levelling_net(np.random.default_rng(1)), datum=Datum("inner"))
    job, truth = observe(plan, np.random.default_rng(2))
    np.testing.assert_array_equal(job.marks.given, truth.coordinates)


def test_blunders_go_where_they_are_told() -> None:
    plan = traverse_net(np.random.default_rng(1))
    blunder = Blunder("distances.csv:5", 0.09)
    clean, _ = observe(plan, np.random.default_rng(2))
    spoilt, truth = observe(plan, np.random.default_rng(2), [blunder])
    difference = spoilt.observations[1].observed - clean.observations[1].observed
    expected = np.zeros_like(difference)
    expected[3] = 0.09
    np.testing.assert_allclose(difference, expected, rtol=0, atol=METRES)
    np.testing.assert_array_equal(spoilt.observations[0].observed, clean.observations[0].observed)
    assert truth.blunders == (blunder,)


def test_blunders_in_vectors_strike_one_component() -> None:
    plan = gnss_net(np.random.default_rng(1))
    clean, _ = observe(plan, np.random.default_rng(2))
    spoilt, _ = observe(plan, np.random.default_rng(2), [Blunder("vectors.csv:2", -0.05, component=2)])
    np.testing.assert_allclose(
        (spoilt.observations[0].observed - clean.observations[0].observed)[0], [0, 0, -0.05], rtol=0, atol=METRES
    )


def test_a_blunder_needs_a_row() -> None:
    with pytest.raises(ValueError, match=r"zeniths\.csv:4"):
        observe(traverse_net(np.random.default_rng(1)), np.random.default_rng(2), [Blunder("zeniths.csv:4", 0.1)])


def test_angles_are_read_on_a_full_circle() -> None:
    job, _, _ = measured("mixed", 2)
    for rows in job.observations:
        if rows.full_circle:
            assert np.all((rows.observed >= 0) & (rows.observed < 2 * np.pi))


def test_mixed_net_has_every_kind() -> None:
    from adjust.observations import KINDS

    plan = mixed_net(np.random.default_rng(1))
    assert [type(rows) for rows in plan.observations] == list(KINDS)


def test_vectors_are_correlated_and_possible() -> None:
    vectors = gnss_net(np.random.default_rng(1)).observations[0]
    assert isinstance(vectors, Vectors)
    sd = np.sqrt(np.einsum("rii->ri", vectors.covariances))
    correlation = vectors.covariances[:, 0, 2] / (sd[:, 0] * sd[:, 2])
    assert np.all(np.abs(correlation) > 0.3)
    assert positive_definite(vectors.covariances).all()


@pytest.mark.parametrize(("rows", "columns"), [(2, 2), (3, 5), (20, 25)])
def test_a_grid_has_the_lines_of_its_squares(rows: int, columns: int) -> None:
    layout = triangulated_grid(rows, columns, np.random.default_rng(1))
    assert len(layout) == rows * columns
    assert len(layout.lines) == rows * (columns - 1) + columns * (rows - 1) + (rows - 1) * (columns - 1)
    length = np.linalg.norm(np.diff(layout.local[layout.lines, :2], axis=1)[:, 0], axis=1)
    assert length.min() > 250
    assert length.max() < 1200


def test_lines_are_seen_from_both_ends() -> None:
    layout = tied_traverses(4, np.random.default_rng(1))
    sights = layout.both_ways()
    assert np.all(np.diff(sights[:, 0]) >= 0)
    assert {tuple(sight) for sight in sights.tolist()} == {
        (a, b) for line in layout.lines.tolist() for a, b in (line, line[::-1])
    }


def test_ten_thousand_marks_have_the_observations_of_the_benchmark() -> None:
    plan = triangulation_grid(np.random.default_rng(1), 100, 100)
    assert sum(len(rows) for rows in plan.observations) == 88_803


def test_names_have_one_length() -> None:
    names = mark_names(120)
    assert len(set(names)) == 120
    assert {len(name) for name in names} == {4}

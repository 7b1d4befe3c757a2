"""Closed forms of errors supposed anywhere, against adjustments with the errors as unknowns or the rows left out."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from adjust import Job, adjust
from adjust.arrays import FloatArray
from adjust.blunders.evidence import Evidence
from adjust.blunders.groups import Group
from adjust.blunders.hypotheses import Hypotheses
from adjust.blunders.system import System, model_of
from adjust.frames import Geometry
from adjust.model import State
from adjust.observations import Observations
from adjust.observations.sighted import HeightedSight
from adjust.simulate import NETWORKS, observe, true_geometry
from adjust.unknowns import find_unknowns

SHAPES = ("levelling", "traverses", "total station, plane", "GNSS", "mixed")


@cache
def hypotheses(shape: str) -> Hypotheses:
    """All hypotheses of a seeded job, linearised at the truth."""
    generator = np.random.default_rng(7)
    plan = NETWORKS[shape](generator)
    job, truth = observe(plan, generator)
    state = State(true_geometry(plan), truth.orientations)
    return Hypotheses.of(System.at(job, model_of(job, find_unknowns(job), state), state))


@cache
def evidence(shape: str) -> Evidence:
    return hypotheses(shape).evidence()


def square_sum(shape: str, columns: FloatArray) -> tuple[float, FloatArray, FloatArray]:
    """vᵀPv of the adjustment with further unknowns in `columns` (rows, s), their values and covariance."""
    system = hypotheses(shape).system
    whole = np.hstack([system.matrix.toarray(), columns])
    right = system.linearisation.right_side[: len(whole)]
    solution = np.linalg.lstsq(whole, right, rcond=None)[0]
    residual = right - whole @ solution
    triangle = np.linalg.qr(whole, mode="r")
    inverse = np.linalg.inv(triangle)
    covariance = inverse @ inverse.T
    first = system.matrix.shape[1]
    return float(residual @ residual), solution[first:], covariance[first:, first:]


def some_sets(shape: str) -> list[tuple[int, ...]]:
    """Sets of one to three testable hypotheses: single rows, whole vectors and groups of several columns."""
    found, generator = evidence(shape), np.random.default_rng(8)
    sizes = [1, 1, 2, 3, 3]
    testable = [number for number in range(found.count) if found.by_itself.testable[found.columns_of(number)].all()]
    sets = [tuple(sorted(generator.choice(testable, size, replace=False).tolist())) for size in sizes]
    joined = [number for number in testable if found.size[number] > 1]
    sets += [(number,) for number in generator.permutation(joined)[:3].tolist()]
    return [chosen for chosen in sets if apart(shape, chosen)]


def apart(shape: str, chosen: tuple[int, ...]) -> bool:
    found = evidence(shape)
    columns = np.concatenate([found.columns_of(number) for number in chosen])
    if len(set(columns.tolist())) < len(columns):
        return False
    scale = np.sqrt(found.information.diagonal[columns])
    return bool(np.linalg.eigvalsh(found.information.block(columns, columns) / np.outer(scale, scale))[0] > 1e-3)


@pytest.mark.parametrize("shape", SHAPES)
def test_errors_and_their_test_are_those_of_an_adjustment_with_further_unknowns(shape: str) -> None:
    columns = hypotheses(shape).columns.toarray()
    nothing = square_sum(shape, columns[:, :0])[0]
    assert evidence(shape).square_sum == pytest.approx(nothing, rel=1e-9)
    sets = some_sets(shape)
    assert len(sets) >= 3
    for chosen in sets:
        allowed = evidence(shape).allowing(chosen)
        left, errors, covariance = square_sum(shape, columns[:, allowed.columns])
        sd = np.sqrt(np.diagonal(covariance))
        # in sds, κ² of the normal equations times ε: 1e-6 is far below anything a test could notice
        np.testing.assert_allclose(allowed.errors / sd, errors / sd, rtol=0, atol=1e-6)
        np.testing.assert_allclose(allowed.covariance / np.outer(sd, sd), covariance / np.outer(sd, sd), atol=1e-6)
        assert allowed.statistic == pytest.approx(nothing - left, rel=1e-6, abs=1e-6)


@pytest.mark.parametrize("shape", SHAPES)
def test_all_further_tests_are_those_of_one_more_unknown(shape: str) -> None:
    columns = hypotheses(shape).columns.toarray()
    found = evidence(shape)
    for chosen in some_sets(shape)[:2]:
        allowed = found.allowing(chosen)
        before = square_sum(shape, columns[:, allowed.columns])[0]
        numbers = [n for n in range(0, found.count, 7) if n not in chosen and apart(shape, (*chosen, n))]
        assert numbers
        for number in numbers:
            more = np.concatenate([allowed.columns, found.columns_of(number)])
            gain = before - square_sum(shape, columns[:, more])[0]
            assert allowed.gains[number] == pytest.approx(gain, rel=1e-5, abs=1e-5)
            assert allowed.joint_gain((number,)) == pytest.approx(gain, rel=1e-5, abs=1e-5)


@pytest.mark.parametrize("shape", SHAPES)
def test_without_one_of_the_chosen_is_as_if_it_had_never_been(shape: str) -> None:
    for chosen in (found for found in some_sets(shape) if len(found) > 1):
        allowed = evidence(shape).allowing(chosen)
        for place, number in enumerate(chosen):
            fewer, fresh = allowed.without(number), evidence(shape).allowing(tuple(n for n in chosen if n != number))
            np.testing.assert_allclose(fewer.w, fresh.w, rtol=0, atol=1e-6)  # sds
            np.testing.assert_allclose(fewer.gains, fresh.gains, rtol=1e-6, atol=1e-6)
            assert allowed.losses[place] == pytest.approx(allowed.statistic - fresh.statistic, rel=1e-6, abs=1e-6)


def test_a_row_left_out_of_a_level_net_is_the_error_by_itself() -> None:
    """Linear, so that the adjustment without the row says the same to the last digits."""
    generator = np.random.default_rng(5)
    job, _ = observe(NETWORKS["levelling"](generator), generator)
    whole = adjust(job)
    found = Hypotheses.of(System.at(job, model_of(job, whole.unknowns, _state(whole)), _state(whole)))
    by_itself = found.evidence()
    (rows,) = job.observations
    for row in (0, 7, 20):
        kept = adjust(replace(job, observations=(rows.take(np.delete(np.arange(len(rows)), row)),)))
        single = rows.take(np.array([row]))
        expected = single.predict(kept.geometry)[0, 0]
        allowed = by_itself.allowing((row,))
        assert allowed.errors[0] == pytest.approx(rows.observed[row, 0] - expected, rel=0, abs=1e-9)  # m
        fallen = _square_sum(whole) - _square_sum(kept)
        assert allowed.statistic == pytest.approx(fallen, rel=0, abs=1e-6)
        variance = single.covariance(kept.geometry)[0, 0, 0]
        ends = kept.covariance([job.marks.names[mark] for mark in rows.marks[row]])
        direction = np.array([0.0, 0.0, -1.0, 0.0, 0.0, 1.0])
        predicted = direction @ np.nan_to_num(ends) @ direction
        assert allowed.covariance[0, 0] == pytest.approx(variance + predicted, rel=1e-9)


def _state(result: object) -> State:
    return State(result.geometry, result.orientations)  # type: ignore[attr-defined]


def _square_sum(result: object) -> float:
    return float(result.solution.global_test.statistic)  # type: ignore[attr-defined]


def test_w_of_nothing_allowed_for_is_that_of_the_residual_tables() -> None:
    generator = np.random.default_rng(9)
    job, _ = observe(NETWORKS["mixed"](generator), generator)
    result = adjust(job)
    found = Hypotheses.of(System.at(job, model_of(job, result.unknowns, _state(result)), _state(result)))
    tables = np.concatenate([rows.w.ravel() for rows in result.residuals])
    ours = found.evidence().by_itself.w[: found.rows]
    known = ~np.isnan(tables)
    # a residual is adjusted minus observed, an error written minus true
    np.testing.assert_allclose(ours[known], -tables[known], rtol=0, atol=1e-4)  # sds: the last step moves 0.01 mm


def groups_of(shape: str, nature: str) -> list[Group]:
    return [group for group in hypotheses(shape).groups if group.hypothesis.nature == nature]


STEP = 1e-3
"""Metres: sights of 100 m and more bend by a hundred thousandth of it."""


def written_change(job: Job, geometry: Geometry, group: Group, changed: Job, moved: Geometry) -> list[FloatArray]:
    """What the group's rows would read otherwise, (rows, components), for each pair of its rows."""
    changes = []
    for place, rows in group.hypothesis.rows:
        before, after = job.observations[place].take(rows), changed.observations[place].take(rows)
        difference = after.predict(moved) - before.predict(geometry)
        if before.unit == "rad":
            difference = (difference + np.pi) % (2 * np.pi) - np.pi
        changes.append(difference)
    return changes


@pytest.mark.parametrize("nature", ["instrument height", "target height"])
def test_a_height_written_too_large_makes_its_sights_look_too_low(nature: str) -> None:
    """Values stay; what is predicted with the wrong height is off, and the error is minus that."""
    found = hypotheses("total station, plane")
    geometry = found.system.state.geometry
    role = int(nature == "target height")
    for group in groups_of("total station, plane", nature)[:3]:
        kinds = list(found.system.job.observations)
        for place, rows in group.hypothesis.rows:
            kind = kinds[place]
            assert isinstance(kind, HeightedSight)
            heights = kind.heights.copy()
            heights[rows, role] += STEP
            kinds[place] = replace(kind, heights=heights)  # type: ignore[type-var]
        changed = replace(found.system.job, observations=tuple(kinds))
        changes = written_change(found.system.job, geometry, group, changed, geometry)
        for effect, change in zip(group.effects, changes, strict=True):
            np.testing.assert_allclose(effect[:, :, 0] * STEP, -change, rtol=0, atol=5e-9)  # m, rad: STEP²/2D


@pytest.mark.parametrize(("nature", "shape"), [("station", "total station, plane"), ("target", "triangulation")])
def test_beside_the_mark_is_where_the_sights_come_from(nature: str, shape: str) -> None:
    found = hypotheses(shape)
    job, geometry = found.system.job, found.system.state.geometry
    for group in groups_of(shape, nature)[:3]:
        assert group.hypothesis.mark is not None
        for component in range(2):
            corrections = np.zeros((len(job.marks), 3))
            corrections[group.hypothesis.mark, component] = STEP
            changes = written_change(job, geometry, group, job, geometry.moved(corrections))
            for effect, change in zip(group.effects, changes, strict=True):
                np.testing.assert_allclose(effect[:, :, component] * STEP, change, rtol=0, atol=1e-8)  # m, rad


def test_scales_and_constants_enter_all_distances_of_a_file() -> None:
    found = hypotheses("traverses")
    geometry = found.system.state.geometry
    ((place, rows),) = groups_of("traverses", "distance scale")[0].hypothesis.rows
    distances: Observations = found.system.job.observations[place]
    assert len(rows) == len(distances)
    (scale,) = groups_of("traverses", "distance scale")[0].effects
    (constant,) = groups_of("traverses", "distance constant")[0].effects
    np.testing.assert_allclose(scale[:, :, 0], distances.predict(geometry), rtol=0, atol=1e-9)  # m
    np.testing.assert_array_equal(constant, np.ones((len(rows), 1, 1)))


def test_control_written_too_large_is_the_mark_moved_the_other_way() -> None:
    found = hypotheses("traverses")
    job, geometry = found.system.job, found.system.state.geometry
    group = next(g for g in groups_of("traverses", "control") if len(g.hypothesis.components) == 2)
    assert group.hypothesis.mark is not None
    for component in range(2):
        corrections = np.zeros((len(job.marks), 3))
        corrections[group.hypothesis.mark, component] = STEP
        changes = written_change(job, geometry, group, job, geometry.moved(corrections))
        for effect, change in zip(group.effects, changes, strict=True):
            np.testing.assert_allclose(effect[:, :, component] * STEP, -change, rtol=0, atol=1e-8)  # m, rad

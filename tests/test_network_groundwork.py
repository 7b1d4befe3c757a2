"""What the network's structure and start rest on: medians, spreading of values, blocks, merged rounds, reductions."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.angles import wrapped
from adjust.errors import NetworkError
from adjust.frames import EllipsoidFrame
from adjust.job import Job
from adjust.network.blocks import find_blocks
from adjust.network.consensus import group_circular_medians, group_medians
from adjust.network.estimate import Estimate, given_estimate
from adjust.network.plan_relations import PlanRelations, plan_relations
from adjust.network.sight_lines import SightLines
from adjust.network.spread import spread
from adjust.network.working_plane import working_plane
from tests.building import build_job, exact, truth_of

ROUNDING = 1e-9  # rad or m: sums of a few double-precision values

seeds = st.integers(0, 2**32 - 1)


def relations_of(job: Job) -> PlanRelations:
    plane = working_plane(job)
    return plan_relations(job, plane, given_estimate(job, plane), SightLines(job))


def test_medians_of_groups_stand_against_one_gross_value() -> None:
    keys = np.array([7, 3, 7, 7, 3])
    groups, medians = group_medians(keys, np.array([1.0, 5.0, 99.0, 1.1, 6.0]))
    assert groups.tolist() == [3, 7]
    np.testing.assert_allclose(medians, [5.5, 1.1], rtol=0, atol=ROUNDING)


def test_circular_medians_across_the_full_turn() -> None:
    groups, medians = group_circular_medians(np.zeros(3, dtype=np.int64), np.array([6.2, 0.1, 0.0]))
    assert groups.tolist() == [0]
    np.testing.assert_allclose(wrapped(medians), [0.0], rtol=0, atol=ROUNDING)


@given(seeds, st.integers(2, 40))
def test_values_spread_along_any_tree(seed: int, count: int) -> None:
    generator = np.random.default_rng(seed)
    truth = generator.normal(size=count)
    second = np.arange(1, count)
    first = np.array([generator.integers(0, mark) for mark in second])
    flipped = generator.random(count - 1) < 0.5
    one, other = np.where(flipped, second, first), np.where(flipped, first, second)
    known = np.full(count, np.nan)
    known[generator.integers(0, count)] = 0.0
    found = spread(known, one, other, truth[other] - truth[one])
    np.testing.assert_allclose(np.diff(found), np.diff(truth), rtol=0, atol=ROUNDING)


def test_nothing_spreads_to_where_nothing_leads() -> None:
    known = np.array([1.0, np.nan, np.nan])
    found = spread(known, np.array([0]), np.array([1]), np.array([2.0]))
    np.testing.assert_array_equal(found, [1.0, 3.0, np.nan])


def test_known_values_stay_where_observations_contradict_them() -> None:
    found = spread(np.array([1.0, 5.0]), np.array([0]), np.array([1]), np.array([2.0]))
    np.testing.assert_array_equal(found, [1.0, 5.0])


@given(seeds, st.integers(1, 24), st.integers(0, 48))
def test_blocks_are_those_of_networkx(seed: int, count: int, lines: int) -> None:
    ends = np.random.default_rng(seed).integers(0, count, (lines, 2))
    ends = ends[ends[:, 0] != ends[:, 1]]
    blocks = find_blocks(count, ends)
    found = {frozenset([*marks.tolist(), int(blocks.parent[top])]) for top, marks in blocks.members().items()}
    graph = nx.Graph(ends.tolist())
    assert found == {frozenset(block) for block in nx.biconnected_components(graph)}
    assert sorted(blocks.tops.tolist()) == sorted(blocks.members())
    for line, top in zip(ends.tolist(), blocks.of_lines(ends).tolist(), strict=True):
        assert set(line) <= {*blocks.members()[top].tolist(), int(blocks.parent[top])}


TRUTH = {"A": (0, 0, 0), "B": (100, 0, 5), "C": (50, 80, 7), "D": (0, 100, 2), "E": (-60, 30, 1)}


def plan_job(**rows: object) -> Job:
    job = build_job(list(TRUTH), **rows)
    return exact(job, truth_of(job, TRUTH))


def azimuth(start: str, end: str) -> float:
    (east, north, _), (e, n, _) = TRUTH[start], TRUTH[end]
    return float(np.arctan2(e - east, n - north))


def test_angles_that_share_an_arm_become_one_round() -> None:
    relations = relations_of(plan_job(angles=[("A", "B", "C"), ("A", "D", "C"), ("A", "D", "E")]))
    assert relations.station.tolist() == [0]
    assert relations.target.tolist() == [1, 2, 3, 4]
    expected = [azimuth("A", mark) - azimuth("A", "B") for mark in "BCDE"]
    turned = relations.reading - relations.reading[0]
    np.testing.assert_allclose(wrapped(turned - expected), 0.0, rtol=0, atol=ROUNDING)


def test_angles_without_a_common_arm_stay_rounds_of_their_own() -> None:
    relations = relations_of(plan_job(angles=[("A", "B", "C"), ("A", "D", "E")]))
    assert relations.station.tolist() == [0, 0]
    assert relations.round.tolist() == [0, 0, 1, 1]


def test_a_round_that_shares_a_target_with_an_azimuth_counts_from_north() -> None:
    relations = relations_of(plan_job(directions=[("s", "A", "B"), ("s", "A", "C")], azimuths=[("A", "C"), ("A", "E")]))
    assert relations.northed.tolist() == [True]
    expected = [azimuth("A", mark) for mark in "BCE"]
    np.testing.assert_allclose(wrapped(relations.reading - expected), 0.0, rtol=0, atol=ROUNDING)


def test_rounds_turned_by_half_a_circle_merge_over_two_shared_targets() -> None:
    rows = [("s", "A", "B"), ("s", "A", "C"), ("t", "A", "B"), ("t", "A", "C"), ("t", "A", "D")]
    job = build_job(list(TRUTH), directions=rows)
    job = exact(job, truth_of(job, TRUTH), np.array([0.2, 0.2 + np.pi]))
    relations = relations_of(job)
    expected = [azimuth("A", mark) - azimuth("A", "B") for mark in "BCD"]
    np.testing.assert_allclose(wrapped(relations.reading - relations.reading[0] - expected), 0.0, rtol=0, atol=ROUNDING)


def test_distances_of_both_ways_become_one_line() -> None:
    relations = relations_of(plan_job(horizontals=[("A", "B", 100.0), ("B", "A", 100.0), ("C", "A")]))
    assert relations.ends.tolist() == [[0, 1], [0, 2]]
    np.testing.assert_allclose(relations.length, [100.0, np.hypot(50, 80)], rtol=0, atol=ROUNDING)


def test_slopes_are_reduced_by_zeniths_either_way_or_by_heights() -> None:
    slopes = [("A", "C", None, 1.6, 1.3), ("B", "C", None, 1.5, 1.5), ("D", "E")]
    zeniths = [("A", "C", None, 1.6, 1.3), ("C", "B", None, 1.5, 1.5)]
    marks = dict.fromkeys(TRUTH) | {"D": (None, None, 2.0), "E": (None, None, 1.0)}
    job = build_job(marks, slopes=slopes, zeniths=zeniths)
    relations = relations_of(exact(job, truth_of(job, TRUTH)))
    expected = [np.hypot(50, 80), np.hypot(50, 80), np.hypot(60, 70)]
    # m: the reverse zenith angle is taken as the forward one's supplement, a few seconds off over a hundred metres
    np.testing.assert_allclose(relations.length, expected, rtol=0, atol=1e-3)


@pytest.mark.parametrize("with_slope", [True, False])
def test_trigonometric_rises_allow_for_instruments_curvature_and_refraction(with_slope: bool) -> None:
    marks = {"A": (0.0, 0.0, 100.0), "B": (3000.0, 0.0, 250.0)}
    slopes = [("A", "B", None, 1.6, 2.1)] if with_slope else []
    job = build_job(marks, slopes=slopes, zeniths=[("A", "B", None, 1.6, 2.1)])
    job = exact(job, truth_of(job, marks))
    estimate = given_estimate(job, working_plane(job))
    rises = SightLines(job).rises(estimate)
    assert rises.marks.tolist() == [[0, 1]]
    # m: curvature and refraction make 0.6 m here; with the slope for the horizontal they are a thousandth off
    np.testing.assert_allclose(rises.rise, [150.0], rtol=0, atol=2e-3)


UTM = EllipsoidFrame("EPSG:25833")
ORIGIN = np.array([np.radians(16.3), np.radians(47.2), 400.0])


def test_the_working_plane_keeps_angles_and_distances_over_tens_of_kilometres() -> None:
    local = np.array([[0.0, 0.0, 0.0], [20000.0, 5000.0, 0.0], [-8000.0, 15000.0, 0.0]])
    truth = UTM.moved(np.tile(ORIGIN, (3, 1)), local)
    truth[:, 2] = ORIGIN[2]
    job = build_job(
        dict(zip("ABC", truth, strict=True)), azimuths=[("A", "B"), ("B", "C")], horizontals=[("B", "C")], frame=UTM
    )
    job = exact(job, truth)
    plane = working_plane(job)
    points = plane.points(truth)
    relations = plan_relations(job, plane, given_estimate(job, plane), SightLines(job))
    line = points[[1, 2]] - points[[0, 1]]
    # rad: the arc-to-chord correction of a conformal map, some seconds of arc
    np.testing.assert_allclose(wrapped(relations.reading - np.angle(line)), 0.0, rtol=0, atol=3e-5)
    np.testing.assert_allclose(relations.length, [abs(points[2] - points[1])], rtol=0, atol=0.3)  # m in 29 km
    np.testing.assert_allclose(plane.plan(points), truth[:, :2], rtol=0, atol=1e-11)


def test_vectors_are_reduced_at_the_place_where_they_are_thought_to_lie() -> None:
    local = np.array([[0.0, 0.0, 0.0], [60000.0, 40000.0, 0.0], [64000.0, 43000.0, 0.0]])
    truth = UTM.moved(np.tile(ORIGIN, (3, 1)), local)
    truth[:, 2] = [400.0, 520.0, 610.0]
    job = build_job(dict(zip("ABC", truth, strict=True)), vectors=[("B", "C"), ("C", "B")], frame=UTM)
    job = exact(job, truth)
    plane = working_plane(job)
    points, heights = plane.points(truth), truth[:, 2]
    rows = job.observations[0]
    for missing in ([], [1], [2]):
        thought, known = points.copy(), heights.copy()
        thought[missing], known[missing] = np.nan, np.nan
        step, rise = plane.reduced_vectors(rows.observed, rows.marks, thought, known)
        there = points[2] - points[1]
        np.testing.assert_allclose(step, [there, -there], rtol=0, atol=1e-3)  # m: exact but for the map's inverse
        np.testing.assert_allclose(rise, [90.0, -90.0], rtol=0, atol=1e-3)


def test_vectors_in_a_plane_frame_are_refused() -> None:
    job = build_job({"A": (0, 0, 0), "B": None}, vectors=[("A", "B", (1.0, 2.0, 3.0))])
    with pytest.raises(NetworkError, match="GNSS vectors need an ellipsoid frame"):
        relations_of(job)


def test_relations_differ_where_a_distance_or_an_azimuth_changed_and_not_for_trifles() -> None:
    relations = relations_of(plan_job(azimuths=[("A", "B")], horizontals=[("A", "C")]))
    for moved, expected in ((1e-6, False), (1e-2, True)):
        longer = plan_relations_with(relations, length=relations.length * (1 + moved))
        turned = plan_relations_with(relations, reading=relations.reading + moved)
        assert longer.differs(relations) is expected
        assert turned.differs(relations) is expected


def plan_relations_with(relations: PlanRelations, **columns: object) -> PlanRelations:
    from dataclasses import replace

    return replace(relations, **columns)  # type: ignore[arg-type]


def test_orthometric_heights_gain_the_geoid() -> None:
    estimate = Estimate(np.array([0j]), np.array([100.0]), np.array([45.0]), orthometric=True)
    assert estimate.spatial_heights.tolist() == [145.0]

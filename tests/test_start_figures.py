"""Whole networks without coordinates between their control, and free networks: figures laid over each other."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, event, given, settings
from hypothesis import strategies as st

from adjust.arrays import FloatArray
from adjust.errors import NetworkError
from adjust.frames import Frame
from adjust.job import Job
from adjust.network import Start, check_solvable, find_start
from adjust.unknowns import find_unknowns
from tests.building import ELLIPSOID, PLANE, build_job, exact, laid_out, shuffled, truth_of
from tests.studies.sparse_starts import has_full_rank, outcome, sparse_network

METRES = {"plane": 1e-4, "ellipsoid": 1.0}
"""Rounding, grown over the network, in the plane; what the working plane leaves over a few kilometres."""


@pytest.fixture(params=["plane", "ellipsoid"])
def frame(request: pytest.FixtureRequest) -> Frame:
    return PLANE if request.param == "plane" else ELLIPSOID


def ground(columns: int, rows: int, seed: int = 1, spacing: float = 300.0) -> dict[str, tuple[float, float]]:
    """Marks `G00`, `G01` … (column, row) near the knots of a grid."""
    shake = np.random.default_rng(seed).uniform(-0.2, 0.2, (columns, rows, 2)) * spacing
    return {
        f"G{column}{row}": (column * spacing + shake[column, row, 0], row * spacing + shake[column, row, 1])
        for column in range(columns)
        for row in range(rows)
    }


def grid_lines(columns: int, rows: int) -> list[tuple[str, str]]:
    """Sides and one diagonal of each square."""
    steps = ((1, 0), (0, 1), (1, 1))
    return [
        (f"G{c}{r}", f"G{c + dc}{r + dr}")
        for c in range(columns)
        for r in range(rows)
        for dc, dr in steps
        if c + dc < columns and r + dr < rows
    ]


def both_ways(lines: Iterable[tuple[str, str]]) -> list[tuple[str, str, str]]:
    """A round at every mark to all its neighbours."""
    return [(start, start, end) for one, other in lines for start, end in ((one, other), (other, one))]


def network(
    marks: dict[str, tuple[float, float]], control: Iterable[str], frame: Frame, **rows: Any
) -> tuple[Job, FloatArray]:
    truth = laid_out(marks, frame)
    held = set(control)
    job = build_job({n: truth[n] if n in held else None for n in truth}, fixed_plan=held, frame=frame, **rows)
    coordinates = truth_of(job, truth)
    return exact(job, coordinates), coordinates


def started(job: Job) -> Start:
    unknowns = find_unknowns(job)
    check_solvable(job, unknowns)
    return find_start(job, unknowns)


def assert_found(job: Job, truth: FloatArray) -> Start:
    mixed = shuffled(job, np.random.default_rng(5))
    start = started(mixed)
    off = job.frame.displacement(truth, start.geometry.coordinates)
    np.testing.assert_allclose(off[:, :2], 0.0, rtol=0, atol=METRES[job.frame.kind])
    return start


def test_control_far_apart_and_rounds_with_distances_between(frame: Frame) -> None:
    lines = grid_lines(5, 4)
    assert_found(*network(ground(5, 4), ["G00", "G43"], frame, directions=both_ways(lines), horizontals=lines))


def test_triangulation_takes_its_scale_from_control_far_apart(frame: Frame) -> None:
    assert_found(*network(ground(5, 4), ["G00", "G43"], frame, directions=both_ways(grid_lines(5, 4))))


def test_triangulation_with_one_base_and_one_azimuth_far_apart(frame: Frame) -> None:
    rows = {"horizontals": [("G03", "G04")], "azimuths": [("G30", "G40")]}
    assert_found(*network(ground(5, 5), ["G22"], frame, directions=both_ways(grid_lines(5, 5)), **rows))


def test_trilateration_of_triangles_unfolds_around_inner_marks(frame: Frame) -> None:
    assert_found(*network(ground(5, 4), ["G00", "G43", "G03", "G40"], frame, horizontals=grid_lines(5, 4)))


def test_trilateration_of_braced_quadrilaterals(frame: Frame) -> None:
    crossing = [(f"G{c + 1}{r}", f"G{c}{r + 1}") for c in range(3) for r in range(3)]
    lines = [*grid_lines(4, 4), *crossing]
    assert_found(*network(ground(4, 4), ["G00", "G11", "G31"], frame, horizontals=lines))


def test_a_trilateration_is_turned_over_by_one_angle(frame: Frame) -> None:
    crossing = [(f"G{c + 1}{r}", f"G{c}{r + 1}") for c in range(2) for r in range(2)]
    lines = [*grid_lines(3, 3), *crossing]
    angle = {"angles": [("G11", "G01", "G22")]}
    for seed in range(4):
        assert_found(*network(ground(3, 3, seed), ["G00", "G22"], frame, horizontals=lines, **angle))


def test_two_braced_quadrilaterals_on_a_common_side_could_be_folded() -> None:
    crossing = [(f"G{c + 1}{r}", f"G{c}{r + 1}") for c in range(2) for r in range(1)]
    job, _ = network(ground(3, 2), ["G00", "G01"], PLANE, horizontals=[*grid_lines(3, 2), *crossing])
    with pytest.raises(NetworkError, match=r"two positions fit|mirror image"):
        started(job)


def test_figures_that_share_two_marks_are_joined(frame: Frame) -> None:
    """Two traverses with a mark each in common at either end, neither of which touches the control twice."""
    marks = {
        "A": (0.0, 0.0),
        "P": (200.0, 80.0),
        "Q": (390.0, 150.0),
        "R": (560.0, 40.0),
        "S": (300.0, -120.0),
        "B": (760.0, 130.0),
    }
    rounds = [("p", "P", "A"), ("p", "P", "Q"), ("q", "Q", "P"), ("q", "Q", "R")]
    rounds += [("s", "S", "P"), ("s", "S", "R"), ("s", "S", "B")]
    distances = [("P", "A"), ("P", "Q"), ("Q", "R"), ("S", "P"), ("S", "R"), ("S", "B")]
    assert_found(*network(marks, "AB", frame, directions=rounds, horizontals=distances))


def test_a_figure_on_a_hinge_is_turned_by_a_ray_from_elsewhere(frame: Frame) -> None:
    marks = {"A": (0.0, 0.0), "B": (500.0, -40.0), "C": (480.0, 300.0), "P": (120.0, 210.0), "Q": (300.0, 330.0)}
    rounds = [("p", "P", "A"), ("p", "P", "Q"), ("b", "B", "C"), ("b", "B", "Q")]
    job, truth = network(marks, "ABC", frame, directions=rounds, horizontals=[("A", "P"), ("P", "Q"), ("C", "Q")])
    assert_found(job, truth)


def test_vectors_carry_a_figure_from_one_control_mark() -> None:
    marks = ground(4, 4, spacing=6000.0)
    lines = grid_lines(4, 4)
    truth = laid_out(marks, ELLIPSOID)
    job = build_job({n: truth[n] if n == "G00" else None for n in truth}, fixed=["G00"], frame=ELLIPSOID, vectors=lines)
    coordinates = truth_of(job, truth)
    job = exact(job, coordinates)
    start = started(shuffled(job, np.random.default_rng(2)))
    off = job.frame.displacement(coordinates, start.geometry.coordinates)
    np.testing.assert_allclose(off, 0.0, rtol=0, atol=1.0)  # m in 25 km, heights included


def test_vectors_reach_across_a_continent() -> None:
    places = {"A": (-9.0, 38.5), "B": (2.0, 49.0), "C": (13.0, 52.5), "D": (25.0, 60.2), "E": (37.6, 55.7)}
    truth = {name: (*np.radians(place), 150.0) for name, place in places.items()}
    lines = [("B", "A"), ("B", "C"), ("D", "C"), ("E", "D"), ("E", "B")]
    job = build_job({n: truth[n] if n == "A" else None for n in truth}, fixed="A", frame=ELLIPSOID, vectors=lines)
    coordinates = truth_of(job, truth)
    start = started(exact(job, coordinates))
    off = ELLIPSOID.displacement(coordinates, start.geometry.coordinates)
    np.testing.assert_allclose(off, 0.0, rtol=0, atol=0.01)  # m: the inverse of a map four thousand kilometres wide


def test_convergence_is_allowed_for_where_azimuths_orient_a_wide_network() -> None:
    """Thirty kilometres at 47°: the meridians converge by a third of a degree, 90 m at the far end."""
    marks = ground(5, 3, spacing=7500.0)
    lines = grid_lines(5, 3)
    rows = {"directions": both_ways(lines), "horizontals": lines, "azimuths": [("G42", "G41")]}
    truth = laid_out(marks, ELLIPSOID)
    job = build_job({n: truth[n] if n == "G00" else None for n in truth}, fixed_plan=["G00"], frame=ELLIPSOID, **rows)
    coordinates = truth_of(job, truth)
    start = started(exact(job, coordinates))
    off = ELLIPSOID.displacement(coordinates, start.geometry.coordinates)
    np.testing.assert_allclose(off[:, :2], 0.0, rtol=0, atol=5.0)  # m


def test_stations_that_hold_only_each_other_are_searched_for() -> None:
    """Every unknown mark has too little to the known ones alone: no construction begins anywhere."""
    generator = np.random.default_rng(3)
    names = ["A", "B", "C", "P", "Q", "R"]
    marks = {name: (float(x), float(y)) for name, (x, y) in zip(names, generator.uniform(0, 900, (6, 2)), strict=True)}
    angles = [("P", "A", "Q"), ("Q", "B", "R"), ("R", "C", "P")]
    distances = [("P", "Q"), ("P", "B"), ("Q", "C"), ("R", "A"), ("Q", "R")]
    job, truth = network(marks, "ABC", PLANE, angles=angles, horizontals=distances)
    start = started(job)
    np.testing.assert_allclose(start.geometry.coordinates[:, :2], truth[:, :2], rtol=0, atol=0.5)  # m
    assert any("search" in note for note in start.notes)


def free(marks: dict[str, tuple[float, float]], frame: Frame = PLANE, **rows: Any) -> tuple[Job, FloatArray]:
    truth = laid_out(marks, frame)
    job = build_job(list(truth), inner=True, frame=frame, **rows)
    coordinates = truth_of(job, truth)
    return exact(job, coordinates), coordinates


def shape_of(coordinates: FloatArray) -> FloatArray:
    """Distances between all marks: what a free network keeps."""
    plan = coordinates[:, 0] + 1j * coordinates[:, 1]
    shape: FloatArray = np.abs(plan[:, None] - plan[None, :])
    return shape


def test_a_free_network_is_drawn_from_its_first_sight() -> None:
    lines = grid_lines(3, 3)
    job, truth = free(ground(3, 3), directions=both_ways(lines), horizontals=lines)
    start = started(job)
    np.testing.assert_allclose(shape_of(start.geometry.coordinates), shape_of(truth), rtol=0, atol=1e-6)  # m
    assert start.notes == ("free network: origin and north of the first sight drawn",)


def test_a_free_network_with_an_azimuth_keeps_north() -> None:
    lines = grid_lines(3, 3)
    job, truth = free(ground(3, 3), directions=both_ways(lines), horizontals=lines, azimuths=[("G22", "G11")])
    start = started(job)
    moved = start.geometry.coordinates[:, :2] - truth[:, :2]
    np.testing.assert_allclose(moved - moved[0], 0.0, rtol=0, atol=1e-6)  # m
    assert start.notes == ("free network: origin of the first sight drawn",)


def test_a_free_network_without_distances_is_drawn_at_a_stated_scale() -> None:
    job, truth = free(ground(3, 3), directions=both_ways(grid_lines(3, 3)))
    start = started(job)
    ratio = shape_of(start.geometry.coordinates)[0, 1:] / shape_of(truth)[0, 1:]
    np.testing.assert_allclose(ratio, ratio[0], rtol=0, atol=1e-9)
    assert any("first side is drawn 100 m long" in note for note in start.notes)


def test_a_free_network_of_distances_may_be_a_mirror_image_and_says_so() -> None:
    crossing = [(f"G{c + 1}{r}", f"G{c}{r + 1}") for c in range(2) for r in range(2)]
    job, truth = free(ground(3, 3), horizontals=[*grid_lines(3, 3), *crossing])
    start = started(job)
    np.testing.assert_allclose(shape_of(start.geometry.coordinates), shape_of(truth), rtol=0, atol=1e-6)  # m
    assert any("mirror image" in note for note in start.notes)


def test_a_free_network_starts_from_the_coordinates_it_is_given() -> None:
    lines = grid_lines(3, 3)
    truth = laid_out(ground(3, 3), PLANE)
    marks = {name: truth[name] if name in ("G00", "G22") else None for name in truth}
    job = build_job(marks, inner=True, directions=both_ways(lines), horizontals=lines)
    coordinates = truth_of(job, truth)
    start = started(exact(job, coordinates))
    np.testing.assert_allclose(start.geometry.coordinates[:, :2], coordinates[:, :2], rtol=0, atol=1e-6)  # m
    assert start.notes == ()


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_a_start_lies_at_the_truth_and_nothing_solvable_is_refused(seed: int) -> None:
    """Random sparse networks of every plan kind; docs/methods-network.md has the figures of thousands of them."""
    job, truth = sparse_network(seed)
    assume(find_unknowns(job).coordinates > 0)
    result = outcome(job, truth)
    event(result)
    assert result != "elsewhere"
    assert result != "refused" or not has_full_rank(job, truth)

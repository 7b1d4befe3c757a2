"""Start heights: levels, zenith angles, vectors, the geoid, plan-only jobs; notes and errors."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from adjust.arrays import FloatArray
from adjust.errors import NetworkError
from adjust.frames import Frame, PlaneFrame
from adjust.job import Job
from adjust.network import Start, check_solvable, find_start
from adjust.unknowns import find_unknowns
from tests.building import ELLIPSOID, PLANE, build_job, exact, laid_out, shuffled, truth_of

GROUND = {
    "A": (0.0, 0.0, 0.0),
    "B": (600.0, 50.0, 42.0),
    "P": (350.0, 270.0, 85.0),
    "Q": (830.0, 260.0, 21.0),
    "R": (540.0, 430.0, -17.0),
}
HEIGHT = 0.02  # m: reverse zenith angles and the geoid's slope are taken roughly, over less than a kilometre


@pytest.fixture(params=["plane", "ellipsoid"])
def frame(request: pytest.FixtureRequest) -> Frame:
    return PLANE if request.param == "plane" else ELLIPSOID


def started(job: Job) -> Start:
    unknowns = find_unknowns(job)
    check_solvable(job, unknowns)
    return find_start(job, unknowns)


def job_on_ground(frame: Frame, control: str, marks: str = "ABPQR", **rows: Any) -> tuple[Job, FloatArray]:
    truth = laid_out({name: GROUND[name] for name in marks}, frame)
    job = build_job({n: truth[n] if n in control else None for n in marks}, fixed=control, frame=frame, **rows)
    coordinates = truth_of(job, truth)
    return exact(job, coordinates), coordinates


def test_levels_alone_need_no_plan() -> None:
    marks = {"A": (None, None, 100.0), "B": None, "C": None, "D": (None, None, 103.0)}
    rises = [("A", "B", 1.5), ("C", "B", -0.25), ("C", "D", 1.25)]
    start = started(build_job(marks, fixed_height="AD", levels=rises))
    np.testing.assert_allclose(start.geometry.coordinates[:, 2], [100.0, 101.5, 101.75, 103.0], rtol=0, atol=1e-9)
    assert np.isnan(start.geometry.coordinates[:, :2]).all()
    assert start.notes == ()


def test_total_station_rounds_carry_heights_along(frame: Frame) -> None:
    sights = [("A", "B"), ("A", "P"), ("P", "A"), ("P", "Q"), ("Q", "P"), ("Q", "R"), ("R", "Q"), ("R", "B")]
    heighted = [(at, to, None, 1.5 + 0.1 * k, 1.3) for k, (at, to) in enumerate(sights)]
    rounds = [(at, at, to) for at, to in sights]
    job, truth = job_on_ground(frame, "AB", directions=rounds, slopes=heighted, zeniths=heighted)
    start = started(shuffled(job, np.random.default_rng(1)))
    off = frame.displacement(truth, start.geometry.coordinates)
    np.testing.assert_allclose(off[:, 2], 0.0, rtol=0, atol=HEIGHT)
    np.testing.assert_allclose(off[:, :2], 0.0, rtol=0, atol=0.1)  # m


def test_zenith_angles_without_distances_wait_for_the_plan(frame: Frame) -> None:
    rounds = [("a", "A", "B"), ("a", "A", "P"), ("b", "B", "A"), ("b", "B", "P")]
    job, truth = job_on_ground(frame, "AB", "ABP", directions=rounds, zeniths=[("A", "P"), ("P", "B")])
    start = started(job)
    np.testing.assert_allclose(start.geometry.coordinates[2, 2], truth[2, 2], rtol=0, atol=HEIGHT)


def test_slopes_without_zeniths_are_reduced_by_levelled_heights(frame: Frame) -> None:
    """A slope of 1 in 4: unreduced, the distance would be 15 m too long."""
    rows = {"slopes": [("A", "P"), ("B", "P")], "directions": [("a", "A", "B"), ("a", "A", "P")]}
    job, truth = job_on_ground(frame, "AB", "ABP", levels=[("A", "P"), ("B", "P")], **rows)
    off = frame.displacement(truth, started(job).geometry.coordinates)
    np.testing.assert_allclose(off, 0.0, rtol=0, atol=0.05)  # m


def test_slopes_are_reduced_again_once_the_plan_gave_the_heights() -> None:
    marks = {"A": (0.0, 0.0, 0.0), "B": (500.0, 0.0, 0.0), "P": (250.0, 300.0, 200.0), "Q": (600.0, 350.0, 60.0)}
    rounds = [("a", "A", "B"), ("a", "A", "P"), ("b", "B", "A"), ("b", "B", "P"), ("p", "P", "A"), ("p", "P", "Q")]
    job = build_job(
        {n: marks[n] if n in "AB" else None for n in marks},
        fixed="AB",
        directions=rounds,
        slopes=[("P", "Q")],
        zeniths=[("A", "P"), ("B", "Q")],
    )
    truth = truth_of(job, marks)
    start = started(exact(job, truth))
    np.testing.assert_allclose(start.geometry.coordinates, truth, rtol=0, atol=0.1)  # m


def test_zenith_angles_without_curvature_in_a_flat_frame() -> None:
    flat = PlaneFrame(earth_curvature=False)
    marks = {"A": (0.0, 0.0, 100.0), "P": (9000.0, 0.0, 150.0)}
    job = build_job({"A": marks["A"], "P": None}, fixed="A", frame=flat, azimuths=[("A", "P")], slopes=[("A", "P")],
                    zeniths=[("A", "P")])  # fmt: skip
    start = started(exact(job, truth_of(job, marks)))
    np.testing.assert_allclose(start.geometry.coordinates[1], marks["P"], rtol=0, atol=1e-6)  # m


@pytest.mark.parametrize("orthometric", [True, False])
def test_the_geoid_stands_between_vectors_and_levels(orthometric: bool) -> None:
    truth = laid_out({name: GROUND[name] for name in "ABPQ"}, ELLIPSOID)
    rows = {"vectors": [("A", "P"), ("B", "P"), ("A", "B")], "levels": [("P", "Q")]}
    job = build_job(
        {n: truth[n] if n in "A" else None for n in truth}, fixed="A", frame=ELLIPSOID, orthometric=orthometric, **rows
    )
    job = replace(job, marks=replace(job.marks, geoid=np.array([45.0, 45.8, 46.1, 46.9])))
    coordinates = truth_of(job, truth)
    start = started(exact(job, coordinates))
    np.testing.assert_allclose(start.geometry.coordinates[:, 2], coordinates[:, 2], rtol=0, atol=HEIGHT)
    assert np.isnan(start.geometry.coordinates[3, :2]).all()


class SlantedGrid:
    """A geoid that rises to the north, in place of a grid file."""

    def heights(self, longitude_latitude: FloatArray) -> FloatArray:
        return 45.0 + 500.0 * (longitude_latitude[:, 1] - np.radians(47.2))


def test_a_geoid_grid_is_asked_at_the_marks_start_positions() -> None:
    truth = laid_out({name: GROUND[name] for name in "ABP"}, ELLIPSOID)
    job = build_job(
        {n: truth[n] if n in "A" else None for n in truth},
        fixed="A",
        frame=ELLIPSOID,
        orthometric=True,
        vectors=[("A", "P"), ("B", "P")],
        geoid_grid=SlantedGrid(),
    )
    coordinates = truth_of(job, truth)
    grid = SlantedGrid().heights(coordinates)
    measured = exact(replace(job, marks=replace(job.marks, geoid=grid)), coordinates)
    start = started(replace(measured, marks=job.marks))
    np.testing.assert_allclose(start.geometry.geoid, grid, rtol=0, atol=1e-3)
    np.testing.assert_allclose(start.geometry.coordinates[:, 2], coordinates[:, 2], rtol=0, atol=HEIGHT)


class EmptyGrid:
    """A geoid grid that covers none of the marks."""

    def heights(self, longitude_latitude: FloatArray) -> FloatArray:
        return np.full(len(longitude_latitude), np.nan)


def test_marks_off_the_geoid_grid_are_named() -> None:
    job, _ = job_on_ground(ELLIPSOID, "A", "AP", vectors=[("A", "P")])
    with pytest.raises(NetworkError, match="mark A: outside the geoid grid"):
        started(replace(job, geoid_grid=EmptyGrid()))  # type: ignore[arg-type]


def plan_only(frame: Frame, heights: dict[str, float | None], **rows: Any) -> tuple[Job, FloatArray]:
    truth = laid_out(GROUND, frame)
    marks = {n: (*truth[n][:2], heights.get(n)) if n in "AB" else (None, None, heights.get(n)) for n in GROUND}
    job = build_job(marks, fixed_plan="AB", frame=frame, **rows)
    coordinates = truth_of(job, truth)
    return exact(job, coordinates), coordinates


ROUNDS = [(at, at, to) for at, to in (("A", "B"), ("A", "P"), ("P", "A"), ("P", "Q"), ("Q", "P"), ("Q", "R"))]
LEGS = [("A", "P"), ("P", "Q"), ("Q", "R")]


def test_a_plan_only_job_reduces_slopes_by_the_heights_it_is_given(frame: Frame) -> None:
    truth = laid_out(GROUND, frame)
    heights = {name: float(truth[name][2]) for name in GROUND}
    job, coordinates = plan_only(frame, heights, directions=ROUNDS, slopes=LEGS)
    start = started(job)
    off = frame.displacement(coordinates, start.geometry.coordinates)
    np.testing.assert_allclose(off, 0.0, rtol=0, atol=0.1)  # m
    assert start.notes == ()


def test_marks_without_a_height_sit_at_the_mean_height_and_a_note_says_so(frame: Frame) -> None:
    job, _ = plan_only(frame, {"A": 320.0, "B": 340.0}, directions=ROUNDS, slopes=LEGS)
    start = started(job)
    np.testing.assert_array_equal(start.geometry.coordinates[2:, 2], [330.0] * 3)
    assert start.notes == ("marks P, Q and R: no height; taken at the job's mean height, 330.000 m",)


def test_heights_do_not_matter_to_horizontal_distances_in_the_plane() -> None:
    job, _ = plan_only(PLANE, {}, directions=ROUNDS, horizontals=LEGS)
    start = started(job)
    assert start.notes == ()
    assert not np.isnan(start.geometry.coordinates).any()


def test_a_plan_only_job_without_heights_reduces_slopes_by_zenith_angles(frame: Frame) -> None:
    job, coordinates = plan_only(frame, {}, directions=ROUNDS, slopes=LEGS, zeniths=LEGS)
    start = started(job)
    off = frame.displacement(coordinates, start.geometry.coordinates)
    np.testing.assert_allclose(off[:, :2], 0.0, rtol=0, atol=0.1)  # m
    rise = np.diff(start.geometry.coordinates[[0, 2, 3, 4], 2])
    np.testing.assert_allclose(rise, np.diff(coordinates[[0, 2, 3, 4], 2]), rtol=0, atol=HEIGHT)
    assert any("no heights are given" in note for note in start.notes)


def test_heights_of_a_free_network_count_from_its_first_mark() -> None:
    sights = [("A", "P"), ("P", "Q"), ("Q", "R")]
    job = build_job(list("APQR"), inner=True, levels=[("P", "A"), *sights[1:]])
    truth = np.array([[*GROUND[name][:2], GROUND[name][2]] for name in "APQR"])
    start = started(exact(job, truth))
    np.testing.assert_allclose(start.geometry.coordinates[:, 2], truth[:, 2] - truth[0, 2], rtol=0, atol=1e-9)
    assert start.notes == ("free network without given heights: they count from mark A, put at 0 m",)


def test_a_height_that_nothing_leads_to_is_an_error() -> None:
    marks = {"A": (0.0, 0.0, 10.0), "B": (100.0, 0.0, None), "C": (0.0, 100.0, 12.0)}
    job = build_job(marks, fixed_plan="ABC", fixed_height="A", levels=[("A", "C", 2.0)])
    stranded = replace(find_unknowns(job), sought=np.array([[False] * 3, [False, False, True], [False, False, True]]))
    with pytest.raises(NetworkError, match="no start height could be found for mark B") as error:
        find_start(job, stranded)
    assert error.value.marks == ("B",)

"""Constructions of single points and figures: rays, circles, arcs, resection, similarity, free station."""

from __future__ import annotations

import cmath
import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from adjust.network.constructions.loci import Arc, Circle, Locus, Ray, meetings
from adjust.network.constructions.point import Pencil, find_point
from adjust.network.constructions.resection import ahead, resect
from adjust.network.constructions.similarity import Similarity, fit, free_station, worst_gap

EXACT = 1e-6  # m: rounding of double precision over kilometres, magnified by a flat crossing

coordinate = st.floats(-1000.0, 1000.0)
points = st.builds(complex, coordinate, coordinate)
angles = st.floats(0.0, 2.0 * math.pi)


def azimuth(start: complex, end: complex) -> float:
    return cmath.phase(end - start)


def ray(start: complex, end: complex) -> Ray:
    return Ray(start, (end - start) / abs(end - start))


def arc(point: complex, first: complex, second: complex) -> Arc:
    return Arc(first, second, azimuth(point, second) - azimuth(point, first))


def spread_out(*marks: complex) -> bool:
    return all(abs(a - b) > 50.0 for k, a in enumerate(marks) for b in marks[:k])


def crossing_sine(one: complex, other: complex) -> float:
    return abs((other * one.conjugate()).imag) / abs(one) / abs(other)


def test_points_are_northing_and_easting_so_that_azimuths_run_clockwise_from_north() -> None:
    east = 0 + 1j
    assert azimuth(0j, east) == pytest.approx(math.pi / 2)


@given(points, points, points)
def test_two_rays_meet_in_their_common_target(first: complex, second: complex, target: complex) -> None:
    assume(spread_out(first, second, target))
    assume(crossing_sine(target - first, target - second) > 0.05)
    (found,) = meetings(ray(first, target), ray(second, target))
    assert abs(found - target) < EXACT


@given(points, points, points)
def test_a_ray_and_a_distance_meet_in_their_common_target(first: complex, second: complex, target: complex) -> None:
    assume(spread_out(first, second, target))
    found = meetings(ray(first, target), Circle(second, abs(target - second)))
    # a chord that is nearly a tangent loses half its digits
    assert min(abs(point - target) for point in found) < 1e-2


@given(points, points, points)
def test_two_distances_meet_on_either_side(first: complex, second: complex, target: complex) -> None:
    assume(spread_out(first, second, target))
    assume(crossing_sine(target - first, target - second) > 0.05)
    found = meetings(Circle(first, abs(target - first)), Circle(second, abs(target - second)))
    assert min(abs(point - target) for point in found) < EXACT
    assert len(found) == 2
    assert abs(abs(found[0] - first) - abs(found[1] - first)) < EXACT


@given(points, points, points)
def test_an_arc_passes_through_the_mark_that_saw_its_angle(point: complex, first: complex, second: complex) -> None:
    assume(spread_out(point, first, second))
    assert arc(point, first, second).misfit(point) < 1e-9


@given(points, points, points)
def test_an_angle_and_a_distance_meet_in_the_station(point: complex, first: complex, second: complex) -> None:
    assume(spread_out(point, first, second))
    assume(crossing_sine(first - point, second - point) > 0.1)
    found = meetings(arc(point, first, second), Circle(first, abs(point - first)))
    assert min(abs(place - point) for place in found) < 1e-2  # m: a circle that nearly touches the arc


def test_an_arc_under_180_degrees_is_the_line_between_its_marks() -> None:
    line = Arc(0j, 100 + 0j, math.pi).curve()
    assert isinstance(line, Ray)
    assert Arc(0j, 100 + 0j, math.pi).misfit(40 + 0j) < 1e-12
    assert Arc(0j, 100 + 0j, math.pi).misfit(140 + 0j) == pytest.approx(2.0)


def test_parallel_rays_and_concentric_circles_do_not_meet() -> None:
    assert meetings(Ray(0j, 1 + 0j), Ray(1j, 1 + 0j)) == []
    assert meetings(Circle(0j, 5.0), Circle(0j, 6.0)) == []


def test_circles_that_just_miss_each_other_touch_midway() -> None:
    assert meetings(Circle(0j, 50.0), Circle(100.5 + 0j, 50.0)) == [50.25 + 0j]
    assert meetings(Circle(0j, 50.0), Circle(10 + 0j, 39.5)) == [pytest.approx(49.75)]
    assert meetings(Circle(0j, 50.0), Circle(150 + 0j, 50.0)) == []


def test_a_ray_that_just_misses_a_circle_touches_it_at_the_foot() -> None:
    assert meetings(Ray(0j, 1 + 0j), Circle(100 + 10.1j, 10.0)) == [100 + 0j]
    assert meetings(Ray(0j, 1 + 0j), Circle(100 + 20j, 10.0)) == []


@given(points, st.lists(points, min_size=3, max_size=6), angles)
def test_resection_finds_the_station(station: complex, targets: list[complex], orientation: float) -> None:
    assume(spread_out(station, *targets))
    readings = [azimuth(station, target) - orientation for target in targets]
    resected = resect(readings, targets)
    assume(not resected.on_danger_circle)
    assert resected.station is not None
    # m: a thousandth of a millimetre, magnified by nearness to the danger circle up to 1 / DANGER
    assert abs(resected.station - station) < 1e-2
    assert ahead(readings, targets, resected.station)


def test_resection_from_marks_on_one_line_and_under_180_degrees() -> None:
    targets = [0j, 100 + 0j, 250 + 0j]
    for station in (60 + 80j, 130 + 0j):
        readings = [azimuth(station, target) for target in targets]
        resected = resect(readings, targets)
        if station.imag:
            assert resected.station == pytest.approx(station, abs=EXACT)
        else:
            assert resected.on_danger_circle, "on the line of the marks every point sees the same angles"


@given(st.lists(angles, min_size=4, max_size=4, unique=True), st.floats(10.0, 1000.0))
def test_resection_on_the_circle_through_its_marks_is_refused(places: list[float], radius: float) -> None:
    on_circle = [cmath.rect(radius, place) for place in places]
    assume(all(abs(a - b) > 0.1 * radius for k, a in enumerate(on_circle) for b in on_circle[:k]))
    station, targets = on_circle[0], on_circle[1:]
    resected = resect([azimuth(station, target) for target in targets], targets)
    assert resected.on_danger_circle
    assert resected.station is None


@given(points, angles, st.floats(0.1, 10.0), st.booleans(), st.lists(points, min_size=2, max_size=6))
def test_a_similarity_is_recovered_from_its_images(
    shift: complex, turn: float, scale: float, mirrored: bool, source: list[complex]
) -> None:
    assume(spread_out(*source))
    applied = Similarity(cmath.rect(scale, turn), shift, mirrored)
    target = [applied(point) for point in source]
    found = fit(source, target, keep_scale=False, mirrored=mirrored)
    assert found is not None
    assert worst_gap(found, source, target) < EXACT


def test_a_kept_scale_turns_without_stretching() -> None:
    found = fit([0j, 100 + 0j], [0j, 101j], keep_scale=True)
    assert found is not None
    assert abs(found.turn) == pytest.approx(1.0)
    assert found(50 + 0j) == pytest.approx(50.5j)


def test_coinciding_points_give_no_similarity() -> None:
    assert fit([5j, 5j], [0j, 1j], keep_scale=False) is None


@given(points, st.lists(points, min_size=2, max_size=5), angles)
def test_a_free_station_stands_where_it_measured_from(
    station: complex, targets: list[complex], orientation: float
) -> None:
    assume(spread_out(station, *targets))
    readings = [(azimuth(station, t) - orientation, abs(t - station)) for t in targets]
    found = free_station(readings, targets)
    assert found is not None
    assert abs(found - station) < EXACT


def test_a_free_station_needs_targets_apart_from_each_other() -> None:
    assert free_station([(0.0, 1000.0), (0.0005, 1000.0)], [1000 + 0j, 1000 + 0.5j]) is None


def loci_to(target: complex, *, rays: list[complex] = [], circles: list[complex] = []) -> list[Locus]:  # noqa: B006
    return [*(ray(origin, target) for origin in rays), *(Circle(c, abs(target - c)) for c in circles)]


def test_two_distances_leave_two_points_and_a_third_decides() -> None:
    target = 30 + 40j
    two = find_point(loci_to(target, circles=[0j, 100 + 0j]), [])
    assert sorted(point.imag for point in two.points) == [pytest.approx(-40.0), pytest.approx(40.0)]
    three = find_point(loci_to(target, circles=[0j, 100 + 0j, 50 + 70j]), [])
    assert three.points == (pytest.approx(target),)


def test_a_third_distance_from_the_same_line_decides_nothing() -> None:
    assert len(find_point(loci_to(30 + 40j, circles=[0j, 100 + 0j, 300 + 0j]), []).points) == 2


def test_a_ray_decides_between_two_distances_and_knows_ahead_from_behind() -> None:
    target = 30 + 40j
    assert find_point(loci_to(target, circles=[0j, 100 + 0j], rays=[50 - 20j]), []).points == (pytest.approx(target),)
    # the circle meets the ray's line ahead and behind of its origin
    assert find_point(loci_to(target, rays=[0j], circles=[10 + 0j]), []).points == (pytest.approx(target),)


def test_one_wrong_distance_among_five_is_outvoted() -> None:
    target = 30 + 40j
    loci = loci_to(target, circles=[0j, 100 + 0j, 50 + 70j, -40 + 10j])
    found = find_point([Circle(20 - 60j, 55.0), *loci], [])
    assert found.points == (pytest.approx(target, abs=1e-6),)


def test_a_resection_on_the_danger_circle_is_rescued_by_a_distance() -> None:
    on_circle = [cmath.rect(100.0, place) for place in (0.4, 2.0, 4.0)]
    station = cmath.rect(100.0, 5.3)
    pencil = Pencil(tuple(azimuth(station, t) for t in on_circle), tuple(on_circle))
    arcs: list[Locus] = [arc(station, on_circle[0], on_circle[1]), arc(station, on_circle[1], on_circle[2])]
    assert find_point(arcs, [pencil]).on_danger_circle
    assert find_point(arcs, [pencil]).points == ()
    with_distance = [*arcs, Circle(on_circle[0], abs(station - on_circle[0]))]
    assert find_point(with_distance, [pencil]).points == (pytest.approx(station, abs=1e-6),)

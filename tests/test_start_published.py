"""Starts of published plane networks, and of networks as large as they come.

The published examples and their sources stand in tests/data/plane_networks.json; a start that comes within centimetres
of the printed adjusted coordinates is all that is asked here.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
import pytest

from adjust.frames import PlaneFrame
from adjust.job import Job
from adjust.network import check_solvable, find_start
from adjust.simulate.networks import levelling_net, total_station_net, traverse_net, triangulation_grid
from adjust.simulate.observing import observe
from adjust.units import DEGREE, parse_dms
from adjust.unknowns import find_unknowns
from tests.building import PLANE_ORIGIN, build_job
from tests.published import published

NETWORKS = published("plane_networks.json")


def plan_of(job: Job) -> dict[str, np.ndarray[Any, Any]]:
    """Start eastings and northings by mark."""
    unknowns = find_unknowns(job)
    check_solvable(job, unknowns)
    start = find_start(job, unknowns)
    return dict(zip(job.marks.names, start.geometry.coordinates[:, :2], strict=True))


def swapped(places: Mapping[str, Iterable[float]]) -> dict[str, list[float]]:
    """Easting and northing of coordinates printed in the order north, east."""
    return {name: list(place)[::-1] for name, place in places.items()}


def test_link_traverse_starts_from_its_control_alone() -> None:
    entry = NETWORKS["P01-W554"]["inputs"]["equivalent_coordinate_network"]
    fixed = swapped(entry["fixed"])
    job = build_job(
        {**fixed, "T2": None, "T3": None, "T4": None},
        fixed_plan=fixed,
        angles=[(row["at"], row["from"], row["to"], parse_dms(row["value"]) * DEGREE) for row in entry["angles_dms"]],
        horizontals=[(row["from"], row["to"], row["value"]) for row in entry["distances_m"]],
    )
    found = plan_of(job)
    for name, place in swapped(NETWORKS["P01-W554"]["recomputed_outputs"]["coordinates"]).items():
        # m: the traverse's misclosure of 2 cm is left in the start, whichever end it was computed from
        np.testing.assert_allclose(found[name], place, rtol=0, atol=0.05)


def test_trilateration_of_one_point_starts_between_its_pairwise_intersections() -> None:
    entry = NETWORKS["P02-KF"]
    fixed = entry["inputs"]["fixed"]
    distances = [(name, "N", value) for name, value in entry["inputs"]["distances_to_N"].items()]
    found = plan_of(build_job({**fixed, "N": None}, fixed_plan=fixed, horizontals=distances))
    # m: the published pairwise intersections differ by 0.08 m
    expected = entry["published_outputs"]["pairwise_intersections"]["P1-P2"]
    np.testing.assert_allclose(found["N"], expected, rtol=0, atol=0.1)


def test_braced_quadrilateral_of_directions_starts_on_its_base() -> None:
    entry = NETWORKS["Q01-MA75"]
    rounds = [
        (group["at"], group["at"], target, parse_dms(reading) * DEGREE)
        for group in entry["inputs"]["direction_sets"]
        for target, reading in zip(group["targets"], group["dms"], strict=True)
    ]
    base = {"S1": (0.0, 0.0), "S2": (1000.0, 0.0)}
    found = plan_of(build_job({**base, "S3": None, "S4": None}, fixed_plan=base, directions=rounds))
    for name, place in entry["recomputed_outputs"]["coordinates_on_1000m_base"].items():
        # m: directions contradict each other by a few seconds of arc over a kilometre
        np.testing.assert_allclose(found[name], place[::-1], rtol=0, atol=0.1)


LARGE = {
    "a grid of rounds and distances": (lambda generator: triangulation_grid(generator, 100, 100), 5.0),
    "rounds, zenith angles and slopes": (lambda generator: total_station_net(generator, 40, 40), 5.0),
    "a traverse of two thousand legs": (lambda generator: traverse_net(generator, 2000), 400.0),
    "levels": (lambda generator: levelling_net(generator, 100, 100), 0.2),
}
"""Network, and metres that errors of observation grow to across it when nothing is adjusted."""


@pytest.mark.parametrize("name", LARGE)
def test_large_networks_start_from_a_handful_of_control_marks(name: str) -> None:
    plan, metres = LARGE[name]
    generator = np.random.default_rng(20)
    job, truth = observe(plan(generator), generator)
    unknowns = find_unknowns(job)
    check_solvable(job, unknowns)
    start = find_start(job, unknowns)
    off = np.where(unknowns.sought, start.geometry.coordinates - truth.coordinates, 0.0)
    assert np.abs(off).max() < metres


def test_a_large_trilateration_is_unfolded() -> None:
    side = 25
    generator = np.random.default_rng(4)
    knots = np.array([(column, row) for column in range(side) for row in range(side)]) * 300.0
    truth = knots + generator.uniform(-60.0, 60.0, knots.shape) + PLANE_ORIGIN[:2]
    names = [f"T{mark:03d}" for mark in range(side * side)]
    number = np.arange(side * side).reshape(side, side)
    pairs = np.vstack(
        [
            np.column_stack([number[:-1].ravel(), number[1:].ravel()]),
            np.column_stack([number[:, :-1].ravel(), number[:, 1:].ravel()]),
            np.column_stack([number[:-1, :-1].ravel(), number[1:, 1:].ravel()]),
        ]
    )
    length = np.hypot(*(truth[pairs[:, 1]] - truth[pairs[:, 0]]).T) + generator.normal(0.0, 0.002, len(pairs))
    corners = [names[number[place]] for place in ((0, 0), (0, -1), (-1, 0), (-1, -1))]
    marks = {name: truth[mark] if name in corners else None for mark, name in enumerate(names)}
    rows = [(names[one], names[other], d) for (one, other), d in zip(pairs, length.tolist(), strict=True)]
    found = plan_of(build_job(marks, fixed_plan=corners, horizontals=rows, frame=PlaneFrame()))
    off = np.array([found[name] for name in names]) - truth
    assert np.abs(off).max() < 1.0  # m: 2 mm of each distance, grown across 24 triangles

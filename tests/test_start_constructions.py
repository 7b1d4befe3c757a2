"""Start coordinates of one unknown mark or a short chain, by every construction, in both frames."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from adjust.arrays import FloatArray
from adjust.errors import NetworkError
from adjust.frames import Frame
from adjust.job import Job
from adjust.network import Start, check_solvable, find_start
from adjust.unknowns import find_unknowns
from tests.building import ELLIPSOID, PLANE, build_job, exact, laid_out, shuffled, truth_of

GROUND = {
    "A": (0.0, 0.0, 0.0),
    "B": (400.0, 50.0, 12.0),
    "C": (180.0, 420.0, 30.0),
    "D": (-250.0, 300.0, -8.0),
    "P": (150.0, 170.0, 5.0),
    "Q": (330.0, 260.0, 21.0),
    "R": (40.0, 330.0, 17.0),
}
TOLERANCE = {"plane": 1e-5, "ellipsoid": 0.05}
"""Metres: rounding in the plane; on the ellipsoid what the working plane leaves over half a kilometre."""


@pytest.fixture(params=["plane", "ellipsoid"])
def frame(request: pytest.FixtureRequest) -> Frame:
    return PLANE if request.param == "plane" else ELLIPSOID


def job_on_ground(frame: Frame, control: str, marks: str, **rows: Any) -> tuple[Job, FloatArray]:
    """A job over marks of GROUND of which only control has coordinates, and the truth."""
    truth = laid_out({name: GROUND[name] for name in marks}, frame)
    given = {name: truth[name] if name in control else None for name in marks}
    job = build_job(given, fixed_plan=control, fixed_height=rows.pop("fixed_height", ()), frame=frame, **rows)
    coordinates = truth_of(job, truth)
    return exact(job, coordinates), coordinates


def started(job: Job) -> Start:
    unknowns = find_unknowns(job)
    check_solvable(job, unknowns)
    return find_start(job, unknowns)


def assert_found(job: Job, truth: FloatArray) -> None:
    """Whatever the order of the rows, the start lies at the truth and every round is oriented."""
    tolerance = TOLERANCE[job.frame.kind]
    for order in range(3):
        mixed = shuffled(job, np.random.default_rng(order))
        start = started(mixed)
        off = job.frame.displacement(truth, start.geometry.coordinates)
        np.testing.assert_allclose(off[:, :2], 0.0, rtol=0, atol=tolerance)
        for rows in mixed.observations:
            if rows.setup is not None:
                turned = rows.predict(start.geometry) - start.orientations[rows.setup][:, None] - rows.observed
                # rad: the tolerance over the shortest side
                np.testing.assert_allclose(np.sin(turned), 0.0, rtol=0, atol=tolerance / 100.0)
                np.testing.assert_array_less(0.0, np.cos(turned))


def star(station: str, targets: str) -> list[tuple[str, str, str]]:
    return [(f"setup {station}", station, target) for target in targets]


def lines(*pairs: str) -> list[tuple[str, str]]:
    return [(pair[0], pair[1]) for pair in pairs]


def triples(*names: str) -> list[tuple[str, str, str]]:
    return [(name[0], name[1], name[2]) for name in names]


CONSTRUCTIONS: dict[str, tuple[str, str, dict[str, Any]]] = {
    "polar point by a round": ("AB", "ABP", {"directions": star("A", "BP"), "horizontals": lines("AP")}),
    "polar point by an angle": ("AB", "PBA", {"angles": triples("ABP"), "horizontals": lines("PA")}),
    "polar point by an azimuth": ("A", "PA", {"azimuths": lines("AP"), "horizontals": lines("AP")}),
    "azimuth from the new mark": ("A", "PA", {"azimuths": lines("PA"), "horizontals": lines("AP")}),
    "two azimuths": ("AB", "PAB", {"azimuths": lines("AP", "BP")}),
    "forward intersection by rounds": ("AB", "PBA", {"directions": [*star("A", "BP"), *star("B", "AP")]}),
    "forward intersection by angles": ("AB", "PBA", {"angles": triples("ABP", "BPA")}),
    "intersection from one known and the new mark": ("AB", "PBA", {"directions": [*star("A", "BP"), *star("P", "AB")]}),
    "resection by a round": ("ABCD", "PABCD", {"directions": star("P", "ABCD")}),
    "resection from three marks": ("ABC", "CPAB", {"directions": star("P", "CAB")}),
    "resection by angles with a common arm": ("ABC", "PABC", {"angles": triples("PAB", "PBC")}),
    "resection by angles without a common arm, and a distance": (
        "ABCD",
        "PABCD",
        {"angles": triples("PAB", "PCD"), "horizontals": lines("PA")},
    ),
    "three distances": ("ABC", "PABC", {"horizontals": lines("AP", "PB", "CP")}),
    "two distances and a direction": ("AB", "PAB", {"horizontals": lines("AP", "BP"), "directions": star("A", "BP")}),
    "two distances and an angle at the mark": (
        "AB",
        "PAB",
        {"horizontals": lines("AP", "BP"), "angles": triples("PAB")},
    ),
    "free station": ("AB", "PAB", {"directions": star("P", "AB"), "horizontals": lines("PA", "PB")}),
    "free station, a third mark without distance": (
        "ABC",
        "PABC",
        {"directions": star("P", "CAB"), "horizontals": lines("PA", "PB")},
    ),
    "one distance, resection angles": ("ABC", "PABC", {"directions": star("P", "ABC"), "horizontals": lines("PC")}),
    "azimuth at the mark, two directions": ("AB", "PAB", {"azimuths": lines("PA", "PB")}),
    "two unknown marks that see each other and two known ones": (
        "AC",
        "PQAC",
        {"directions": [*star("P", "ACQ"), *star("Q", "ACP")]},
    ),
    "double polar chain": (
        "AB",
        "PQRAB",
        {"directions": [*star("A", "BP"), *star("P", "AQ"), *star("Q", "PR")], "horizontals": lines("AP", "PQ", "QR")},
    ),
    "traverse without orientation between two known marks": (
        "AC",
        "PQAC",
        {"directions": [*star("P", "AQ"), *star("Q", "PC")], "horizontals": lines("AP", "PQ", "QC")},
    ),
    "link traverse by angles": (
        "ABCD",
        "PQABCD",
        {"angles": triples("ABP", "PAQ", "QPC", "CQD"), "horizontals": lines("AP", "PQ", "QC")},
    ),
    "intersected mark serves a resection": (
        "ABC",
        "PQABC",
        {"directions": [*star("A", "BP"), *star("B", "AP"), *star("Q", "PCB")]},
    ),
    "triangulation with its scale from control": (
        "AC",
        "PQRAC",
        {"directions": [*star("P", "QRA"), *star("Q", "PRCA"), *star("R", "PQC")]},
    ),
    "triangulation with one base and an azimuth": (
        "P",
        "PQRA",
        {
            "directions": [*star("P", "QR"), *star("Q", "PRA"), *star("R", "PQA")],
            "horizontals": lines("QA"),
            "azimuths": lines("RA"),
        },
    ),
}


@pytest.mark.parametrize("name", CONSTRUCTIONS)
def test_construction(name: str, frame: Frame) -> None:
    control, marks, rows = CONSTRUCTIONS[name]
    assert_found(*job_on_ground(frame, control, marks, **rows))


@pytest.mark.parametrize("mark", ["P", "Q", "R"])
def test_the_start_keeps_given_coordinates_to_the_last_digit(mark: str, frame: Frame) -> None:
    job, truth = job_on_ground(frame, "ABC", "ABC" + mark, horizontals=lines("A" + mark, "B" + mark, "C" + mark))
    start = started(job)
    np.testing.assert_array_equal(start.geometry.coordinates[:3, :2], job.marks.given[:3, :2])
    assert not np.isnan(start.geometry.coordinates).any()
    assert start.notes == () or frame.kind == "ellipsoid"
    assert truth.shape == (4, 3)


def test_free_coordinates_that_are_given_are_the_start() -> None:
    marks = {"A": (0.0, 0.0), "B": (400.0, 0.0), "P": (110.0, 190.0)}
    truth = {"A": (0.0, 0.0, 0.0), "B": (400.0, 0.0, 0.0), "P": (100.0, 200.0, 0.0)}
    job = build_job(marks, fixed_plan="AB", directions=[*star("A", "BP"), *star("B", "AP")])
    start = started(exact(job, truth_of(job, truth)))
    np.testing.assert_array_equal(start.geometry.coordinates[2, :2], [110.0, 190.0])


def test_given_coordinates_decide_between_two_intersections() -> None:
    truth = {"A": (0.0, 0.0, 0.0), "B": (400.0, 0.0, 0.0), "P": (100.0, 200.0, 0.0), "Q": (250.0, 150.0, 0.0)}
    rows = {"horizontals": lines("AP", "BP", "PQ", "BQ", "AQ")}
    job = build_job({name: truth[name] if name in "AB" else None for name in truth}, fixed_plan="AB", **rows)
    with pytest.raises(NetworkError, match="two positions fit") as error:
        started(exact(job, truth_of(job, truth)))
    assert set(error.value.marks) == {"P", "Q"}
    marks = {name: truth[name] if name in "AB" else None for name in truth} | {"P": (90.0, 190.0)}
    job = build_job(marks, fixed_plan="AB", **rows)
    start = started(exact(job, truth_of(job, truth)))
    assert np.hypot(*(start.geometry.coordinates[3, :2] - truth["Q"][:2])) < 50.0  # m: as rough as what was given


def test_a_wrong_distance_among_several_polar_points_is_outvoted() -> None:
    control = {"A": (0.0, 0.0, 0.0), "B": (400.0, 50.0, 0.0), "C": (180.0, 420.0, 0.0), "D": (-250.0, 300.0, 0.0)}
    truth = control | {"P": (150.0, 170.0, 0.0)}
    rounds = [row for station, backsight in ("AB", "BA", "CA", "DA") for row in star(station, backsight + "P")]
    wrong = float(np.hypot(150.0, 170.0)) + 100.0
    rows = [("A", "P", wrong), *lines("BP", "CP", "DP")]
    job = build_job(control | {"P": None}, fixed_plan="ABCD", directions=rounds, horizontals=rows)
    measured = exact(job, truth_of(job, truth))
    struck = [kind for kind in measured.observations if kind.kind != "horizontal_distance"]
    distances = next(kind for kind in measured.observations if kind.kind == "horizontal_distance")
    observed = distances.observed.copy()
    observed[0] = wrong
    blundered = replace(measured, observations=(*struck, replace(distances, observed=observed)))
    start = started(blundered)
    off = start.geometry.coordinates[4, :2] - truth["P"][:2]
    assert np.hypot(*off) < 1e-6  # m: the median of four polar points, three of them exact

"""Networks that cannot be solved as given: each names its marks, what is missing and what would cure it."""

from __future__ import annotations

import re
from itertools import pairwise
from typing import Any

import numpy as np
import pytest

from adjust.errors import NetworkError
from adjust.job import Job
from adjust.network import Part, check_solvable, datum_parts, find_start
from adjust.unknowns import find_unknowns
from tests.building import ELLIPSOID, build_job, exact, laid_out, truth_of

TRUTH = {
    "A": (0.0, 0.0, 10.0),
    "B": (400.0, 50.0, 12.0),
    "C": (180.0, 420.0, 30.0),
    "D": (-250.0, 300.0, 8.0),
    "P": (150.0, 170.0, 5.0),
    "Q": (330.0, 260.0, 21.0),
    "R": (40.0, 330.0, 17.0),
}


def star(station: str, targets: str) -> list[tuple[str, str, str]]:
    return [(f"setup {station}", station, target) for target in targets]


def lines(*pairs: str) -> list[tuple[str, str]]:
    return [(pair[0], pair[1]) for pair in pairs]


def job_of(marks: str, plan: str = "", height: str = "", **rows: Any) -> Job:
    """Exact observations of TRUTH; marks in `plan` and `height` are fixed there, the others have no coordinates."""

    def given(name: str) -> tuple[float | None, ...]:
        east, north, up = TRUTH[name]
        in_plan = name in plan
        return east if in_plan else None, north if in_plan else None, up if name in height else None

    job = build_job({name: given(name) for name in marks}, fixed_plan=plan, fixed_height=height, **rows)
    return exact(job, truth_of(job, TRUTH))


def complaint_of(job: Job) -> NetworkError:
    with pytest.raises(NetworkError) as error:
        check_solvable(job, find_unknowns(job))
    return error.value


def start_error(job: Job) -> NetworkError:
    unknowns = find_unknowns(job)
    check_solvable(job, unknowns)
    with pytest.raises(NetworkError) as error:
        find_start(job, unknowns)
    return error.value


TRIANGLE = {"directions": [*star("A", "BC"), *star("B", "AC"), *star("C", "AB")]}
CHECKED: dict[str, tuple[Job, str, str]] = {
    "no control at all": (
        job_of("ABC", **TRIANGLE, horizontals=lines("AB")),
        "ABC",
        r"position \(east and north\) and rotation; fix or weight the plan coordinates of one of its marks.*"
        r'or set \[datum\] mode = "inner"',
    ),
    "directions alone on one control mark": (
        job_of("ABC", "A", **TRIANGLE),
        "ABC",
        r"fixes the rotation and scale; .* or observe an azimuth; .* or observe a distance",
    ),
    "distance but no azimuth": (
        job_of("ABC", "A", **TRIANGLE, horizontals=lines("BC")),
        "ABC",
        r"fixes the rotation; fix or weight the plan coordinates of one more mark, or observe an azimuth$",
    ),
    "azimuth but no distance": (
        job_of("ABC", "A", **TRIANGLE, azimuths=lines("BC")),
        "ABC",
        r"fixes the scale; fix or weight the plan coordinates of one more mark, or observe a distance$",
    ),
    "a part of its own": (
        job_of("ABCPQR", "AB", **TRIANGLE, horizontals=lines("PQ", "QR", "RP")),
        "PQR",
        r"marks P, Q and R: nothing here fixes the position \(east and north\) and rotation; .*azimuth$",
    ),
    "no height control in a levelled part": (
        job_of("ABPQR", "", "A", levels=[("A", "B"), ("P", "Q"), ("Q", "R")]),
        "PQR",
        "no height here is fixed; fix or weight the height of one of its marks",
    ),
    "one direction only": (
        job_of("ABP", "AB", directions=star("A", "BP")),
        "P",
        "mark P: seen by one direction only: needs a second direction or a distance",
    ),
    "one azimuth observed from both ends": (
        job_of("ABP", "AB", azimuths=lines("AP", "PA")),
        "P",
        "mark P: seen by one direction only",
    ),
    "one distance only": (
        job_of("ABP", "AB", horizontals=lines("AP", "PA")),
        "P",
        "mark P: one distance only: needs a second one, or a direction",
    ),
    "a resection from two marks": (
        job_of("ABP", "AB", directions=star("P", "AB")),
        "P",
        "mark P: sees only two marks that can be determined",
    ),
    "a round with a single target": (
        job_of("ABP", "AB", directions=star("A", "P")),
        "P",
        "mark P: nothing that observes it helps to determine it",
    ),
    "what hangs on an undetermined mark": (
        job_of("ABPQ", "AB", horizontals=lines("AP", "PQ")),
        "PQ",
        "one distance only",
    ),
    "a figure that turns about one mark": (
        job_of("ABCPQ", "AB", **TRIANGLE, horizontals=lines("CP", "PQ", "QC")),
        "PQ",
        "marks P and Q: can turn about mark C, the only tie to control; .* or observe an azimuth$",
    ),
    "a figure that turns and grows": (
        job_of("ABCPQ", "AB", directions=[*TRIANGLE["directions"], ("c2", "C", "P"), ("c2", "C", "Q"),
                                          *star("P", "CQ"), *star("Q", "CP")]),
        "PQ",
        "can turn about and grow or shrink from mark C",
    ),
    "a free network in two pieces": (
        job_of("ABCPQR", inner=True, horizontals=lines("AB", "BC", "CA", "PQ", "QR", "RP")),
        "ABCPQR",
        "not joined in plan to the rest of this free network",
    ),
    "a free network with a hinge": (
        job_of("ABCPQ", inner=True, horizontals=lines("AB", "BC", "CA", "CP", "PQ", "QC")),
        "PQ",
        "can turn about mark C",
    ),
    "a free levelling net in two pieces": (
        job_of("ABCD", inner=True, levels=lines("AB", "CD")),
        "ABCD",
        "not joined in height",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CHECKED)
def test_what_is_missing_is_said_with_its_cure(name: str) -> None:
    job, marks, message = CHECKED[name]
    error = complaint_of(job)
    assert re.search(message, str(error)), str(error)
    assert set(marks) <= set(error.marks)
    if name not in ("no control at all", "directions alone on one control mark"):
        assert set(error.marks) <= set(marks)


STARTLESS: dict[str, tuple[Job, str, str]] = {
    "two distances and nothing to choose": (
        job_of("ABP", "AB", horizontals=lines("AP", "BP")),
        "P",
        "two positions fit the observations equally well.*or give rough coordinates",
    ),
    "distances of a figure that could be turned over": (
        job_of("ABPQR", "AB", horizontals=lines("AP", "AQ", "PQ", "AR", "PR", "QR", "BR")),
        "PQR",
        "two positions fit|mirror image",
    ),
}


@pytest.mark.parametrize("name", STARTLESS)
def test_where_nothing_decides_there_is_no_start(name: str) -> None:
    job, marks, message = STARTLESS[name]
    error = start_error(job)
    assert re.search(message, str(error)), str(error)
    assert set(error.marks) == set(marks)


def test_a_resection_on_the_danger_circle_is_refused() -> None:
    places = {"A": 0.3, "B": 2.0, "C": 4.1, "P": 5.4}
    truth = {n: (500.0 + 200.0 * np.sin(a), 500.0 + 200.0 * np.cos(a), 0.0) for n, a in places.items()}
    marks = {name: truth[name] if name != "P" else None for name in truth}
    job = build_job(marks, fixed_plan="ABC", directions=star("P", "ABC"))
    error = start_error(exact(job, truth_of(job, truth)))
    assert "mark P: lies on the danger circle" in str(error)


def test_a_collinear_intersection_is_refused() -> None:
    truth = {"A": (0.0, 0.0, 0.0), "B": (100.0, 0.0, 0.0), "C": (50.0, 80.0, 0.0), "P": (300.0, 0.0, 0.0)}
    marks = {name: truth[name] if name != "P" else None for name in truth}
    job = build_job(marks, fixed_plan="ABC", directions=[*star("A", "CP"), *star("B", "CP")])
    error = start_error(exact(job, truth_of(job, truth)))
    assert "mark P: the sights that lead there lie on one line" in str(error)


def test_an_ellipsoid_job_without_any_position_says_so() -> None:
    job = build_job(list("PQ"), inner=True, frame=ELLIPSOID, vectors=[("P", "Q", (1.0, 2.0, 3.0))])
    with pytest.raises(NetworkError, match="nothing says where on the ellipsoid the network lies"):
        check_solvable(job, find_unknowns(job))


def test_many_marks_are_not_all_listed() -> None:
    names = [f"M{number}" for number in range(30)]
    job = build_job([*names, "Z"], levels=[(a, b, 1.0) for a, b in pairwise(names)])
    message = str(complaint_of(job))
    assert "… and 22 more" in message
    assert len(complaint_of(job).marks) == 30


SOLVABLE: dict[str, Job] = {
    "two control marks": job_of("ABC", "AB", **TRIANGLE),
    "one control mark, azimuth and distance": job_of(
        "ABC", "A", **TRIANGLE, azimuths=lines("CB"), horizontals=lines("CA")
    ),
    "weighted control": build_job({"A": TRUTH["A"], "B": TRUTH["B"], "C": None}, weighted="AB", **TRIANGLE),
    "free network": job_of("ABC", inner=True, **TRIANGLE),
    "hinge with an azimuth": job_of(
        "ABCPQ", "AB", **TRIANGLE, horizontals=lines("CP", "PQ", "QC"), azimuths=lines("CP")
    ),
    "two bodies between control": job_of("ABPQR", "AB", horizontals=lines("AP", "AQ", "PQ", "QB", "QR", "BR")),
    "scale from height differences": job_of(
        "ABC", "A", "AB", **TRIANGLE, azimuths=lines("AB"), zeniths=lines("AB", "BC")
    ),
    "part of fixed marks alone": job_of("ABCD", "ABCD", **TRIANGLE, levels=[]),
}  # fmt: skip


@pytest.mark.parametrize("name", SOLVABLE)
def test_solvable_networks_pass(name: str) -> None:
    check_solvable(SOLVABLE[name], find_unknowns(SOLVABLE[name]))


def parts_of(job: Job) -> list[tuple[str, set[str]]]:
    def named(part: Part) -> tuple[str, set[str]]:
        return "".join(job.marks.names[mark] for mark in part.marks), set(part.missing)

    return [named(part) for part in datum_parts(job, find_unknowns(job))]


ROUNDS = {**TRIANGLE, "horizontals": lines("AB")}
PARTS: dict[str, tuple[Job, list[tuple[str, set[str]]]]] = {
    "free plan network": (job_of("ABC", inner=True, **ROUNDS), [("ABC", {"east", "north", "rotation"})]),
    "without distances": (job_of("ABC", inner=True, **TRIANGLE), [("ABC", {"east", "north", "rotation", "scale"})]),
    "with an azimuth": (job_of("ABC", inner=True, **ROUNDS, azimuths=lines("AB")), [("ABC", {"east", "north"})]),
    "free levels": (job_of("ABC", inner=True, levels=lines("AB", "BC")), [("ABC", {"height"})]),
    "plan and heights over different marks": (
        job_of("ABCD", inner=True, **ROUNDS, levels=lines("AB", "BD")),
        [("ABCD", {"east", "north", "rotation", "height"})],
    ),
    "control is not held in a free network": (
        job_of("ABC", "AB", inner=True, **ROUNDS),
        [("ABC", {"east", "north", "rotation"})],
    ),
    "control": (job_of("ABC", "AB", **ROUNDS), [("ABC", set())]),
    "two pieces": (
        job_of("ABCPQR", inner=True, horizontals=lines("AB", "BC", "CA", "PQ", "QR", "RP")),
        [("ABC", {"east", "north", "rotation"}), ("PQR", {"east", "north", "rotation"})],
    ),
}


@pytest.mark.parametrize("name", PARTS)
def test_parts_and_what_datum_they_lack(name: str) -> None:
    job, expected = PARTS[name]
    assert parts_of(job) == expected


def test_vectors_leave_three_shifts_open() -> None:
    truth = laid_out({name: TRUTH[name] for name in "ABC"}, ELLIPSOID)
    job = build_job(truth, inner=True, frame=ELLIPSOID, vectors=lines("AB", "BC"))
    job = exact(job, truth_of(job, truth))
    assert parts_of(job) == [("ABC", {"east", "north", "height"})]

"""Marks and rows that cannot be right: two names, two places, exchanged coordinates, heights, rows entered twice."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import pytest

from adjust.frames import EllipsoidFrame
from adjust.job import Job
from adjust.network.closures import check_job
from adjust.network.closures.remarks import Remark
from adjust.observations import HorizontalDistances
from adjust.simulate import observe, triangulation_grid
from adjust.tolerances import Tolerances
from tests.building import build_job

SQUARE = {
    "A": (4000.0, 700.0, 10.0),
    "B": (4500.0, 700.0, 11.0),
    "C": (4500.0, 1200.0, 12.0),
    "D": (4000.0, 1200.0, 13.0),
    "E": (4250.0, 950.0, 13.0),
}


def remarks(job: Job, check: str) -> list[Remark]:
    return [remark for remark in check_job(job).remarks if remark.check == check]


def names(job: Job, remark: Remark) -> list[str]:
    return [job.marks.names[mark] for mark in remark.marks]


def levelled(marks: dict[str, Sequence[float | None]]) -> Job:
    """Something to observe, a pair of heights, with the marks as control."""
    first, second = list(marks)[:2]
    return build_job(marks, fixed=list(marks), levels=[(first, second, 1.0)])


def test_nothing_odd() -> None:
    assert check_job(levelled(SQUARE)).remarks == ()


def test_one_mark_under_two_names() -> None:
    job = levelled({**SQUARE, "C1": (4500.02, 1200.01, 12.01)})
    (remark,) = remarks(job, "two_names")
    assert names(job, remark) == ["C", "C1"]
    assert remark.exceeds
    assert "0.022 m" in remark.text


@pytest.mark.parametrize(
    "beside", [(4500.0, 1200.2, 12.0), (4500.0, 1200.0, 12.9)], ids=["further than the tolerance", "another height"]
)
def test_neighbours_are_two_marks(beside: tuple[float, float, float]) -> None:
    assert remarks(levelled({**SQUARE, "C1": beside}), "two_names") == []


def test_marks_with_an_observation_between_them_are_two() -> None:
    marks = {**SQUARE, "C1": (4500.02, 1200.01, 12.01)}
    job = build_job(marks, fixed=list(marks), levels=[("C", "C1", 0.01)])
    assert remarks(job, "two_names") == []


def test_the_tolerance_of_the_same_mark_is_the_jobs() -> None:
    job = levelled({**SQUARE, "C1": (4500.02, 1200.01, 12.01)})
    assert remarks(replace(job, tolerances=Tolerances(same_mark=0.01)), "two_names") == []


def test_a_second_name_is_found_by_observations_alone() -> None:
    """A free mark observed under two names from different stations: its start coordinates fall together."""
    generator = np.random.default_rng(11)
    job, _ = observe(triangulation_grid(generator, 4, 4), generator)
    doubled = job.marks.names.index("H06")
    marks = job.marks
    widened = replace(
        marks,
        names=(*marks.names, "H06bis"),
        descriptions=(*marks.descriptions, ""),
        **{
            column: np.concatenate([getattr(marks, column), getattr(marks, column)[[doubled]]])
            for column in ("given", "control", "sd", "geoid", "deflection")
        },
        provenance=marks.provenance.take(np.append(np.arange(len(marks)), doubled)),
    )
    seen_from = {doubled - 1, doubled - 4}
    kinds = []
    for rows in job.observations:
        ends = rows.marks.copy()
        second = (ends[:, 1] == doubled) & np.isin(ends[:, 0], list(seen_from))
        ends[second, 1] = len(marks)
        kinds.append(replace(rows, marks=ends))
    renamed = replace(job, marks=widened, observations=tuple(kinds))
    (remark,) = remarks(renamed, "two_names")
    assert names(renamed, remark) == ["H06", "H06bis"]


def test_easting_and_northing_exchanged() -> None:
    job = levelled({**SQUARE, "F": (4100.0, 800.0, 12.0), "G": (900.0, 4300.0, 12.0)})
    far = levelled({name: (east + 495_000.0, north, height) for name, (east, north, height) in SQUARE.items()})
    east, north, height = 499_100.0, 800.0, 12.0
    swapped = levelled(
        {**dict(zip(far.marks.names, far.marks.given.tolist(), strict=True)), "G": (north, east, height)}
    )
    (remark,) = remarks(swapped, "exchanged")
    assert names(swapped, remark) == ["G"]
    assert remark.exceeds
    assert "easting and northing" in remark.text
    # near the diagonal of the axes nothing tells an exchange from a distant mark
    assert remarks(job, "exchanged") == []


def test_latitude_and_longitude_exchanged() -> None:
    places = {name: np.radians([9.0 + 1e-6 * e, 52.0 + 1e-6 * n]) for name, (e, n, _) in SQUARE.items()}
    marks = {name: (*place, 10.0) for name, place in places.items()}
    longitude, latitude, height = marks["E"]
    job = build_job(
        {**marks, "E": (latitude, longitude, height)},
        fixed=list(marks),
        levels=[("A", "B", 1.0)],
        frame=EllipsoidFrame("EPSG:4326"),
    )
    (remark,) = remarks(job, "exchanged")
    assert names(job, remark) == ["E"]
    assert "latitude and longitude" in remark.text


def test_a_mark_off_the_extent() -> None:
    job = levelled({**SQUARE, "F": (40_250.0, 950.0, 13.0)})
    (remark,) = remarks(job, "off_extent")
    assert names(job, remark) == ["F"]
    assert not remark.exceeds


def test_a_height_unlike_all_others() -> None:
    job = levelled({**SQUARE, "F": (4250.0, 950.0, 10_013.0)})
    (remark,) = remarks(job, "off_extent")
    assert names(job, remark) == ["F"]


def test_one_name_for_two_places() -> None:
    """Two stations of a grid observe H19 and call it H08."""
    generator = np.random.default_rng(12)
    job, truth = observe(triangulation_grid(generator, 5, 5), generator)
    number = {name: place for place, name in enumerate(job.marks.names)}
    stations = [number["H18"], number["H24"]]
    kinds = []
    for rows in job.observations:
        ends = rows.marks.copy()
        for end, other in ((0, 1), (1, 0)):
            theirs = np.isin(rows.marks[:, other], stations) & (rows.marks[:, end] == number["H19"])
            if end == 1 or isinstance(rows, HorizontalDistances):
                ends[theirs, end] = number["H08"]
        kinds.append(replace(rows, marks=ends))
    found = remarks(replace(job, observations=tuple(kinds)), "two_places")
    apart = float(np.hypot(*(truth.coordinates[number["H19"], :2] - truth.coordinates[number["H08"], :2])))
    assert [job.marks.names[remark.marks[0]] for remark in found] == ["H08"]
    assert f"{apart:.0f}" in found[0].text
    assert found[0].exceeds


def test_heights_out_of_range() -> None:
    truth = {"A": (0.0, 0.0, 1.0), "B": (100.0, 0.0, 2.0)}
    rows = [("A", "B", np.pi / 2, 15.1, 1.7), ("B", "A", np.pi / 2, 1.5, -0.1), ("A", "B", np.pi / 2, 1.5, 1.7)]
    job = build_job(truth, fixed="AB", zeniths=rows)
    found = remarks(job, "height_range")
    assert [remark.text.split(",")[0] for remark in found] == [
        "zeniths.csv:2: instrument height 15.100 m",
        "zeniths.csv:3: target height -0.100 m",
    ]
    assert all(remark.exceeds for remark in found)
    wide = replace(job, tolerances=Tolerances(instrument_heights=(0.0, 20.0), target_heights=(-1.0, 5.0)))
    assert remarks(wide, "height_range") == []


def test_heights_that_differ_within_one_sight() -> None:
    truth = {"A": (0.0, 0.0, 1.0), "B": (100.0, 0.0, 2.0)}
    job = build_job(truth, fixed="AB", zeniths=[("A", "B", np.pi / 2, 1.5, 1.7)], slopes=[("A", "B", 100.0, 1.5, 1.3)])
    (remark,) = remarks(job, "heights_differ")
    assert "distances.csv:2 and zeniths.csv:2" in remark.text


def test_a_row_entered_twice() -> None:
    levels = [("A", "B", 1.0), ("B", "A", -1.0), ("A", "B", 1.0), ("A", "B", 1.001)]
    job = build_job("AB", levels=levels)
    (remark,) = remarks(job, "duplicate_rows")
    assert "levels.csv:2, levels.csv:4" in remark.text
    assert not remark.exceeds


def test_the_zero_of_two_rounds_is_not_entered_twice() -> None:
    rounds = [("r1", "S", "A", 0.0), ("r1", "S", "B", 1.0), ("r2", "S", "A", 0.0), ("r2", "S", "B", 1.000001)]
    assert remarks(build_job("SAB", directions=rounds), "duplicate_rows") == []


def test_rough_coordinates_that_are_wrong() -> None:
    job = build_job(SQUARE, fixed="A", horizontals=[("A", "B", 500.4), ("A", "E", 553.6)])
    (remark,) = remarks(job, "rough_coordinates")
    assert "A – E: measured 553.600 m (distances.csv:3), 353.553 m" in remark.text
    assert not remark.exceeds

"""Any job that can be read can be checked: arbitrary networks with arbitrary values never end in an error."""

from __future__ import annotations

import warnings
from typing import Any
from unittest.mock import patch

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from adjust.errors import NetworkError
from adjust.frames import EllipsoidFrame, PlaneFrame
from adjust.job import Job
from adjust.network.closures import check_job
from adjust.reports.check_listing import check_listing
from adjust.reports.check_records import closure_records, remark_records, traverse_records
from tests.building import build_job

NAMES = "ABCDEF"
ANGLE = st.sampled_from([0.0, 1.0, np.pi / 2, np.pi, 2 * np.pi]) | st.floats(0.0, 2 * np.pi)
ZENITH = st.sampled_from([0.0, np.pi / 2, np.pi]) | st.floats(0.0, np.pi)
LENGTH = st.sampled_from([1e-6, 1.0, 100.0, 1e6]) | st.floats(1e-3, 1e4)
RISE = st.floats(-1e4, 1e4)
PLACE = st.sampled_from([0.0, 100.0, 5e5]) | st.floats(-1e6, 1e6)


def marks_of(draw: st.DrawFn, count: int, roles: int) -> list[tuple[str, ...]]:
    names = st.permutations(NAMES).map(lambda order: tuple(order[:roles]))
    return [draw(names) for _ in range(count)]


@st.composite
def jobs(draw: st.DrawFn) -> Job:
    """Six marks, some of them control, with a few rows of every kind between any of them."""
    ellipsoid = draw(st.booleans())
    places: dict[str, Any] = {}
    for name in NAMES:
        plan = (draw(PLACE), draw(PLACE)) if draw(st.booleans()) else (None, None)
        if ellipsoid and plan[0] is not None:
            plan = (0.1 + plan[0] * 1e-9, 0.9 + plan[1] * 1e-9)
        places[name] = (*plan, draw(RISE) if draw(st.booleans()) else None)

    def rows(roles: int, value: st.SearchStrategy[Any], *further: Any) -> list[tuple[Any, ...]]:
        count = draw(st.integers(0, 6))
        return [(*marks, draw(value), *further) for marks in marks_of(draw, count, roles)]

    directions = [(f"at {row[0]}", *row) for row in rows(2, ANGLE)]
    control = draw(st.sets(st.sampled_from(NAMES)))
    weighted = draw(st.sets(st.sampled_from(NAMES))) - control
    vector = st.tuples(RISE, RISE, RISE)
    return build_job(
        places,
        fixed=control,
        weighted=weighted,
        directions=directions,
        angles=rows(3, ANGLE),
        azimuths=rows(2, ANGLE),
        slopes=rows(2, LENGTH, draw(st.floats(-1, 20)), 1.5),
        horizontals=rows(2, LENGTH),
        zeniths=rows(2, ZENITH, 1.5, draw(st.floats(-1, 20))),
        levels=rows(2, RISE),
        vectors=rows(2, vector) if ellipsoid else (),
        frame=EllipsoidFrame("EPSG:25832") if ellipsoid else PlaneFrame(earth_curvature=draw(st.booleans())),
        inner=draw(st.booleans()),
    )


def check_and_report(job: Job) -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("error", RuntimeWarning)
        check = check_job(job)
        lines = check_listing(check)
        records = [*closure_records(check), *remark_records(check), *traverse_records(check)]
    assert lines
    for judged in check.closures:
        assert np.isfinite(judged.closures.misclosure).all(), judged.closures.check
        assert (judged.closures.sd >= 0).all(), judged.closures.check
        assert not np.isnan(judged.allowed).any(), judged.closures.check
    assert len(records) >= sum(len(judged.closures) for judged in check.closures)


@settings(max_examples=10, deadline=None)
@given(jobs())
def test_any_job_can_be_checked_and_reported(job: Job) -> None:
    check_and_report(job)


@settings(max_examples=100, deadline=None)
@given(jobs())
def test_any_job_without_start_coordinates_can_be_checked(job: Job) -> None:
    """Many of these take long to find no start: here none is sought."""
    with patch("adjust.network.closures.check.find_start", side_effect=NetworkError("no start")):
        check_and_report(job)

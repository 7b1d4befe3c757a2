"""What must not change an adjustment: order, units, names, files, place and turn of the axes, the choice of datum.

Each property runs the whole adjustment on invented networks that hypothesis draws.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from adjust import Adjustment, Job, adjust, read_job
from adjust.arrays import FloatArray
from adjust.field_book.cells import Table
from adjust.field_book.writing import JobFolder, describe_job
from adjust.job import Control, Datum
from adjust.observations import ControlCoordinates
from adjust.simulate import NETWORKS, Equipment, assemble, observe
from adjust.units import ANGLE_ENDINGS, DEGREE, LENGTH_ENDINGS
from tests.building import shuffled
from tests.studies.monte_carlo import with_sds_multiplied

METRES = 1e-8
"""Coordinates of the same network solved in another order: rounding of six million metres, times the condition."""
SDS = 1e-4
"""w: geocentric coordinates round at 1e-9 m, 1e-6 of the sd of a direction over 200 m, and a small redundancy divides
that by its root."""
RELATIVE = 1e-7
"""Covariances and redundancies of the same network."""

few = settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
names = st.sampled_from(sorted(NETWORKS))
plane_names = st.sampled_from(["traverses", "triangulation", "total station, plane"])
seeds = st.integers(0, 10**6)


def invented(name: str, seed: int) -> Job:
    generator = np.random.default_rng(seed)
    return observe(NETWORKS[name](generator), generator)[0]


def through_files(written: JobFolder) -> Job:
    with TemporaryDirectory() as folder:
        written.write(Path(folder))
        return read_job(folder)


def largest_move(first: Adjustment, second: Adjustment) -> float:
    moved = first.job.frame.displacement(first.coordinates, second.coordinates)
    return float(np.nanmax(np.abs(moved)))


def assert_same_marks(first: Adjustment, second: Adjustment) -> None:
    """Marks in the same order: coordinates and covariances."""
    assert largest_move(first, second) < METRES
    sd = np.sqrt(np.nanmax(first.mark_covariances))
    np.testing.assert_allclose(
        first.mark_covariances / sd**2, second.mark_covariances / sd**2, rtol=0, atol=RELATIVE, equal_nan=True
    )


def by_source(adjustment: Adjustment, name: str) -> dict[tuple[str, ...], float]:
    """A column of the residuals by kind, marks, observed value and component: whatever the order of rows."""
    found = {}
    for rows in adjustment.residuals:
        values = getattr(rows, name)
        for row in range(len(rows.observations)):
            marks = [adjustment.job.marks.names[mark] for mark in rows.observations.marks[row]]
            for component, value in enumerate(values[row].tolist()):
                part = (
                    rows.observations.component[row] if isinstance(rows.observations, ControlCoordinates) else component
                )
                found[(rows.observations.kind, *marks, str(part))] = value
    return found


def assert_same_rows(first: Adjustment, second: Adjustment) -> None:
    for name, tolerance in (("redundancy", RELATIVE), ("w", SDS)):
        ours, theirs = by_source(first, name), by_source(second, name)
        assert ours.keys() == theirs.keys()
        np.testing.assert_allclose(
            [ours[key] for key in ours], [theirs[key] for key in ours], rtol=0, atol=tolerance, equal_nan=True
        )


@few
@given(names, seeds)
def test_order_of_rows_and_tables(name: str, seed: int) -> None:
    job = invented(name, seed)
    first, second = adjust(job), adjust(shuffled(job, np.random.default_rng(seed)))
    assert_same_marks(first, second)
    assert_same_rows(first, second)


@few
@given(names, seeds)
def test_order_of_marks(name: str, seed: int) -> None:
    job = invented(name, seed)
    order = np.random.default_rng(seed).permutation(len(job.marks))
    written = describe_job(job)
    written.tables["marks"] = {title: [cells[row] for row in order] for title, cells in written.tables["marks"].items()}
    first, second = adjust(job), adjust(through_files(written))
    found = second.coordinates[[second.job.marks.index[mark] for mark in job.marks.names]]
    moved = job.frame.displacement(first.coordinates, found)
    assert np.nanmax(np.abs(moved)) < METRES
    assert_same_rows(first, second)


@few
@given(names, seeds, st.sampled_from(["ft", "usft", "mm", "km"]), st.sampled_from(["gon", "rad", "mgon", "arcsec"]))
def test_units(name: str, seed: int, length: str, angle: str) -> None:
    job = invented(name, seed)
    written = describe_job(job)
    tables = {table: in_other_units(columns, length, angle) for table, columns in written.tables.items()}
    first, second = adjust(job), adjust(through_files(replace(written, tables=tables)))
    assert_same_marks(first, second)
    assert_same_rows(first, second)


def in_other_units(table: Table, length: str, angle: str) -> Table:
    """Every metre, millimetre and degree of a table in other units; covariances stay, they have but one."""
    changed: Table = {}
    for title, cells in table.items():
        name, _, ending = title.rpartition("_")
        if ending in ("m", "mm"):
            title, factor = f"{name}_{length}", LENGTH_ENDINGS[ending] / LENGTH_ENDINGS[length]
        elif ending in ("deg", "arcsec"):
            title, factor = f"{name}_{angle}", ANGLE_ENDINGS[ending] / ANGLE_ENDINGS[angle]
        else:
            changed[title] = cells
            continue
        changed[title] = [repr(float(cell) * factor) if cell else "" for cell in cells]
    return changed


@few
@given(names, seeds, st.data())
def test_names(name: str, seed: int, data: st.DataObject) -> None:
    job = invented(name, seed)
    count = len(job.marks)
    word = st.text(st.characters(categories=("L", "N")), min_size=1, max_size=6)
    words = data.draw(st.lists(word, min_size=count, max_size=count, unique=True))
    renamed = through_files(describe_job(replace(job, marks=replace(job.marks, names=tuple(words)))))
    assert renamed.marks.names == tuple(words)
    first, second = adjust(job), adjust(renamed)
    assert_same_marks(first, second)
    np.testing.assert_allclose(
        second.solution.global_test.statistic,
        first.solution.global_test.statistic,
        rtol=1e-7,  # of the ellipsoid's rounding
    )


@few
@given(names, seeds, st.integers(1, 10))
def test_a_table_split_into_files(name: str, seed: int, cut: int) -> None:
    job = invented(name, seed)
    written = describe_job(job)
    whole = {table: columns for table, columns in written.tables.items() if table == "marks"}
    written.job_file["tables"] = {}
    for table, columns in written.tables.items():
        if table == "marks":
            continue
        rows = len(next(iter(columns.values())))
        parts = [slice(0, min(cut, rows)), slice(min(cut, rows), rows)]
        files = {f"{table}_{number}": pick(columns, part) for number, part in enumerate(parts)}
        whole |= {file: part for file, part in files.items() if next(iter(part.values()))}
        written.job_file["tables"][table] = [f"{file}.csv" for file, part in files.items() if next(iter(part.values()))]
    first, second = adjust(job), adjust(through_files(replace(written, tables=whole)))
    assert_same_marks(first, second)
    assert_same_rows(first, second)


def pick(table: Table, rows: slice) -> Table:
    return {title: cells[rows] for title, cells in table.items()}


@few
@given(plane_names, seeds, st.floats(-180, 180), st.floats(-1e5, 1e5), st.floats(-1e5, 1e5))
def test_place_and_turn_of_a_plane_network(name: str, seed: int, degrees: float, east: float, north: float) -> None:
    job = invented(name, seed)
    sine, cosine = np.sin(degrees * DEGREE), np.cos(degrees * DEGREE)
    turn = np.array([[cosine, sine, 0.0], [-sine, cosine, 0.0], [0.0, 0.0, 1.0]])
    shift = np.array([east, north, 0.0])
    moved = replace(job, marks=replace(job.marks, given=turned(job.marks.given, turn) + shift))
    first, second = adjust(job), adjust(moved)
    apart = turned(first.coordinates, turn) + shift - second.coordinates
    assert np.nanmax(np.abs(apart)) < METRES
    expected = turn @ np.nan_to_num(first.mark_covariances) @ turn.T
    sd = np.sqrt(np.nanmax(first.mark_covariances))
    np.testing.assert_allclose(np.nan_to_num(second.mark_covariances) / sd**2, expected / sd**2, rtol=0, atol=RELATIVE)
    assert_same_rows(first, second)


def turned(coordinates: FloatArray, turn: FloatArray) -> FloatArray:
    """Easting and northing turned; heights, if any, stay."""
    plan: FloatArray = coordinates[:, :2] @ turn[:2, :2].T
    return np.column_stack([plan, coordinates[:, 2]])


@few
@given(names, seeds, st.floats(0.1, 10.0))
def test_all_sds_multiplied(name: str, seed: int, factor: float) -> None:
    """The coordinates stay, their sds follow, and w and vᵀPv go the other way."""
    job = invented(name, seed)
    first, second = adjust(job), adjust(with_sds_multiplied(job, factor))
    assert largest_move(first, second) < METRES
    ours, theirs = np.nan_to_num(first.standard_deviations), np.nan_to_num(second.standard_deviations)
    np.testing.assert_allclose(theirs / factor, ours, rtol=0, atol=RELATIVE * ours.max())
    statistic = second.solution.global_test.statistic * factor**2
    np.testing.assert_allclose(statistic, first.solution.global_test.statistic, rtol=1e-6)


@few
@given(names, seeds)
def test_inner_and_minimal_constraints(name: str, seed: int) -> None:
    """The same residuals, redundancies and vᵀPv, whatever carries the datum."""
    minimal = minimally_held(invented(name, seed))
    inner = adjust(as_free_network(minimal))
    held = adjust(minimal)
    assert held.solution.degrees_of_freedom == inner.solution.degrees_of_freedom
    np.testing.assert_allclose(
        held.solution.global_test.statistic, inner.solution.global_test.statistic, rtol=1e-6, atol=1e-6
    )
    assert_same_rows(held, inner)
    assert trace(inner) <= trace(held) * (1 + RELATIVE)


def minimally_held(job: Job) -> Job:
    """The first mark alone held, and an azimuth that leaves the network as it lies, lest it turn about that mark."""
    control = np.zeros_like(job.marks.control)
    control[0] = np.where(np.isnan(job.marks.given[0, [0, 2]]), Control.FREE, Control.FIXED)
    kinds = [rows for rows in job.observations if rows.kind != "control"]
    known = np.where(control[:, [0, 0, 1]] == Control.FIXED, job.marks.given, np.nan)
    held = replace(job, marks=replace(job.marks, given=known, control=control, sd=np.full_like(known, np.nan)))
    held = replace(held, observations=tuple(kinds))
    directions = [rows for rows in kinds if rows.kind == "direction"]
    if not directions:
        return held
    (azimuth,) = assemble("", job.frame, held.marks, [Equipment().azimuths(directions[0].marks[:1])]).observations
    lying = replace(azimuth, observed=azimuth.predict(adjust(job).geometry) % (2 * np.pi))
    return replace(held, observations=(lying, *kinds))


def as_free_network(job: Job) -> Job:
    """All marks given near their adjusted places, and all of them carrying the datum."""
    adjusted = adjust(job)
    known = np.where(adjusted.unknowns.sought, adjusted.coordinates, job.marks.given)
    return replace(job, marks=replace(job.marks, given=known), datum=Datum("inner"))


def trace(adjustment: Adjustment) -> float:
    return float(np.nansum(np.einsum("nii->ni", adjustment.mark_covariances)))


@few
@given(names, seeds)
def test_redundancies_add_up(name: str, seed: int) -> None:
    """0 ≤ r ≤ 1 for every uncorrelated observation, and all of them together are the degrees of freedom."""
    result = adjust(invented(name, seed))
    total = sum(float(rows.redundancy.sum()) for rows in result.residuals)
    assert abs(total - result.solution.degrees_of_freedom) < 1e-6
    for rows in result.residuals:
        shares = rows.redundancy.sum(axis=1)
        assert np.all((shares >= -1e-9) & (shares <= rows.redundancy.shape[1] + 1e-9))


@few
@given(names, seeds)
def test_covariances_are_positive_semidefinite(name: str, seed: int) -> None:
    result = adjust(invented(name, seed))
    for covariances in (np.nan_to_num(result.mark_covariances), np.nan_to_num(result.line_covariances)):
        np.testing.assert_allclose(covariances, covariances.transpose(0, 2, 1), rtol=0, atol=1e-18)  # m²
        assert np.linalg.eigvalsh(covariances).min() > -1e-18  # m²: variances of a square millimetre are 1e-6
    joint = result.covariance(result.job.marks.names)
    assert np.linalg.eigvalsh(joint).min() > -1e-16  # m²: of all marks together


@few
@given(names, seeds)
def test_same_input_same_digits(name: str, seed: int) -> None:
    first, second = adjust(invented(name, seed)), adjust(invented(name, seed))
    np.testing.assert_array_equal(first.coordinates, second.coordinates)
    np.testing.assert_array_equal(first.mark_covariances, second.mark_covariances)

"""Planted errors of every nature found the whole way, and what is said where the data can not decide."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from adjust import Adjustment, Job, adjust
from adjust.arrays import FloatArray
from adjust.blunders import Blunder, Findings, find_blunders, find_blunders_of
from adjust.blunders.deciding import separations
from adjust.blunders.hypotheses import Hypotheses
from adjust.blunders.system import System, model_of
from adjust.job import Control
from adjust.model import State
from adjust.observations import HeightDifferences, Observations, Vectors
from adjust.observations.sighted import HeightedSight
from adjust.quality import critical_tau
from adjust.simulate import NETWORKS, observe, triangulation_grid
from adjust.simulate import Blunder as Planted
from tests.building import build_job, shuffled

WITHIN = 4.0
"""Sds between an estimated and a planted error: beyond once in 16,000."""


def measured(shape: str, seed: int = 1, blunders: tuple[Planted, ...] = ()) -> Job:
    plan = NETWORKS[shape](np.random.default_rng(seed))
    return observe(plan, np.random.default_rng([seed, 1]), blunders)[0]


def only(job: Job) -> Blunder:
    """The one blunder that is found."""
    (found,) = find_blunders(adjust(job)).blunders
    return found


def is_about(found: Blunder, size: FloatArray | float) -> bool:
    return bool(np.all(np.abs(found.estimated_error - size) < WITHIN * found.sd))


@pytest.mark.parametrize(
    ("shape", "source", "size"),
    [
        ("levelling", "levels.csv:9", 0.008),
        ("traverses", "directions.csv:15", -6e-4),
        ("triangulation", "directions.csv:40", 3e-4),
        ("total station, ellipsoid", "zeniths.csv:12", 4e-4),
        ("total station, plane", "distances.csv:9", 1.0),
    ],
)
def test_an_observation_is_named_with_its_error(shape: str, source: str, size: float) -> None:
    found = only(measured(shape, blunders=(Planted(source, size),)))
    assert found.hypothesis.nature == "observation"
    assert found.sources == (source,)
    assert is_about(found, size)


def test_what_should_have_been_written_is_told() -> None:
    job = measured("traverses", blunders=(Planted("distances.csv:7", 0.5),))
    found = only(job)
    (distances,) = [rows for rows in job.observations if rows.table == "distances"]
    assert found.expected_value is not None
    np.testing.assert_allclose(found.expected_value, distances.observed[5] - found.estimated_error, atol=1e-12)  # m
    sound = [rows for rows in measured("traverses").observations if rows.table == "distances"]
    assert abs(found.expected_value[0] - sound[0].observed[5, 0]) < WITHIN * found.sd[0]


def test_one_component_of_a_vector_and_the_whole_of_it() -> None:
    found = only(measured("GNSS", blunders=(Planted("vectors.csv:6", 0.2, component=2),)))
    assert (found.hypothesis.components, found.sources) == (("z",), ("vectors.csv:6",))
    assert is_about(found, 0.2)

    job, error = measured("GNSS"), np.array([0.1, -0.15, 0.12])
    place = next(number for number, rows in enumerate(job.observations) if isinstance(rows, Vectors))
    found = only(changed(job, place, np.array([4]), error))
    assert (found.hypothesis.nature, found.sources) == ("vector", ("vectors.csv:6",))
    assert is_about(found, error)


def changed(job: Job, place: int, rows: FloatArray, error: FloatArray | float) -> Job:
    """Some rows of a kind with an error on top."""
    kinds = list(job.observations)
    observed = kinds[place].observed.copy()
    observed[rows] += error
    kinds[place] = replace(kinds[place], observed=observed)
    return replace(job, observations=tuple(kinds))


def with_heights(job: Job, role: int, mark: int, error: float) -> Job:
    """The height of one setup or target written too large, in all its sights."""
    kinds: list[Observations] = []
    for rows in job.observations:
        if isinstance(rows, HeightedSight):
            heights = rows.heights.copy()
            heights[rows.marks[:, role] == mark, role] += error
            rows = replace(rows, heights=heights)  # type: ignore[assignment]
        kinds.append(rows)
    return replace(job, observations=tuple(kinds))


def one_of_these(found: Blunder) -> dict[tuple[str, int | None], int]:
    """Nature and mark of what is named and of all that may stand in its place."""
    return {(one.nature, one.mark): number for number, one in enumerate((found.hypothesis, *found.alternatives))}


@pytest.mark.parametrize(("nature", "role"), [("instrument height", 0), ("target height", 1)])
def test_a_height_that_many_sights_share(nature: str, role: int) -> None:
    """All sights from a mark too low, or all sights to it too high: only the height of the mark says which."""
    found = only(with_heights(measured("total station, plane"), role, 5, 0.1))
    assert set(one_of_these(found)) == {("instrument height", 5), ("target height", 5)}
    sign = 1.0 if found.hypothesis.nature == nature else -1.0
    assert is_about(found, 0.1 * sign)
    assert found.expected_value is not None


def displaced(job: Job, mark: int, role: int, away: FloatArray) -> Job:
    """Everything measured with the instrument, or to a target, beside its mark."""
    truth = adjust(job).geometry
    corrections = np.zeros((len(job.marks), 3))
    corrections[mark, :2] = away
    beside = truth.moved(corrections)
    kinds = []
    for rows in job.observations:
        here = (rows.marks[:, role] == mark) & (rows.kind != "control")
        change = rows.predict(beside) - rows.predict(truth)
        change = (change + np.pi) % (2 * np.pi) - np.pi if rows.unit == "rad" else change
        kinds.append(replace(rows, observed=rows.observed + np.where(here[:, None], change, 0.0)))
    return replace(job, observations=tuple(kinds))


@pytest.mark.parametrize(("nature", "role"), [("station", 0), ("target", 1)])
def test_an_instrument_or_target_beside_its_mark(nature: str, role: int) -> None:
    away = np.array([0.05, -0.04])
    found = only(displaced(measured("triangulation"), 7, role, away))
    assert (nature, 7) in one_of_these(found)
    assert {mark for _, mark in one_of_these(found)} == {7}
    assert is_about(found, away if found.hypothesis.nature == nature else -away)


@pytest.mark.parametrize(
    ("nature", "change"),
    [
        ("distance constant", lambda observed: 0.034 + 0.0 * observed),
        ("distance scale", lambda observed: 2e-4 * observed),
    ],
)
def test_what_all_distances_share(nature: str, change: Callable[[FloatArray], FloatArray]) -> None:
    job = observe(triangulation_grid(np.random.default_rng(1), 3, 3), np.random.default_rng(2))[0]
    kinds = tuple(
        replace(rows, observed=rows.observed + change(rows.observed)) if rows.table == "distances" else rows
        for rows in job.observations
    )
    found = only(replace(job, observations=kinds))
    assert found.hypothesis.nature == nature
    assert is_about(found, 0.034 if nature == "distance constant" else 2e-4)


def level_tower(scale: float) -> Job:
    """Two benchmarks 40 m apart in height, joined by three lines of levels read with staves of a wrong scale."""
    generator = np.random.default_rng(3)
    heights = {"A": 0.0, "B": 40.0, **{f"{line}{step}": 10.0 * step for line in "PQR" for step in (1, 2, 3)}}
    rows = []
    for line in "PQR":
        names = ["A", *(f"{line}{step}" for step in (1, 2, 3)), "B"]
        rises = pairwise(names)
        rows += [(a, b, (heights[b] - heights[a]) * (1 + scale) + generator.normal(0, 0.001)) for a, b in rises]
    held = {name: (None, None, height if name in "AB" else None) for name, height in heights.items()}
    return build_job(held, fixed_height=("A", "B"), levels=rows)


def test_a_scale_of_the_staves_is_among_what_explains_the_misclosure() -> None:
    """It looks like a wrong height of a benchmark: both are said, and neither line of the book is."""
    found = only(level_tower(5e-4))
    natures = {found.hypothesis.nature, *(other.nature for other in found.alternatives)}
    assert natures == {"staff scale", "control"}
    size = 40.0 * 5e-4 if found.hypothesis.nature == "control" else 5e-4
    assert abs(abs(found.estimated_error[0]) - size) < WITHIN * found.sd[0]


def test_blunders_are_not_explained_by_a_scale() -> None:
    """Scales of 100 % would explain any set of rises, if they were scales of what is written."""
    sources = ("levels.csv:5", "levels.csv:14", "levels.csv:28")
    planted = tuple(map(Planted, sources, (20.0, -7.0, 11.0)))
    job = measured("levelling", blunders=planted)
    assert {blunder.name for blunder in find_blunders(adjust(job)).blunders} == set(sources)


def test_a_control_coordinate() -> None:
    job = measured("triangulation")
    fixed = int(np.flatnonzero(job.marks.control[:, 0] == Control.FIXED)[1])
    given = job.marks.given.copy()
    given[fixed, 0] += 0.2
    found = only(replace(job, marks=replace(job.marks, given=given)))
    assert (found.hypothesis.nature, found.hypothesis.mark) == ("control", fixed)
    assert found.hypothesis.components == ("east",)
    assert is_about(found, 0.2)
    assert found.expected_value == pytest.approx(given[fixed, 0] - found.estimated_error)


def seen(findings: Findings) -> list[tuple[str, float, float, tuple[str, ...]]]:
    return [
        (one.name, float(one.estimated_error[0]), one.test, tuple(other.name for other in one.alternatives))
        for one in findings.blunders
    ]


THREE = (Planted("directions.csv:30", 3e-4), Planted("distances.csv:11", 0.05), Planted("directions.csv:70", -2e-4))


def test_the_same_job_has_the_same_findings() -> None:
    result = adjust(measured("triangulation", blunders=THREE))
    assert seen(find_blunders(result)) == seen(find_blunders(result))


def test_the_order_of_rows_and_kinds_does_not_matter() -> None:
    job = measured("triangulation", blunders=THREE)
    ours, theirs = (find_blunders(adjust(one)) for one in (job, shuffled(job, np.random.default_rng(2))))
    assert [one.name for one in ours.blunders] == [one.name for one in theirs.blunders]
    assert {one.name for one in ours.blunders} == {planted.source for planted in THREE}
    for one, other in zip(ours.blunders, theirs.blunders, strict=True):
        assert one.test == pytest.approx(other.test, rel=1e-6)
        assert {x.name for x in one.alternatives} == {x.name for x in other.alternatives}


def test_the_plainest_comes_first() -> None:
    found = find_blunders(adjust(measured("triangulation", blunders=THREE))).blunders
    margins = [one.test / one.critical for one in found]
    assert margins == sorted(margins, reverse=True)


@pytest.mark.parametrize("shape", ["levelling", "triangulation", "total station, ellipsoid", "GNSS", "mixed"])
def test_gross_and_small_errors_side_by_side(shape: str) -> None:
    """A whole reading wrong beside an error a hundred thousandth of it: both are found, the small one to its sd."""
    job = measured(shape, seed=2)
    place = next(number for number, rows in enumerate(job.observations) if rows.table != "marks")
    rows = job.observations[place]
    detectable = 4.13 * float(np.sqrt(rows.covariance(adjust(job).geometry)[3, 0, 0]))
    small = Planted(rows.provenance.label(3), 6 * detectable)
    gross = Planted(rows.provenance.label(len(rows) - 4), 1.5 if rows.unit == "rad" else 150.0)
    wrong = measured(shape, 2, (small, gross))
    findings = find_blunders(adjust(wrong))
    names = {name for one in findings.blunders for name in (one.name, *(other.name for other in one.alternatives))}
    assert {small.source, gross.source} <= names


def test_a_job_that_does_not_settle_is_searched_from_where_most_observations_agree() -> None:
    job = measured("total station, plane", seed=3)
    rows = next(rows for rows in job.observations if rows.kind == "direction")
    blunders = tuple(Planted(rows.provenance.label(row), 3.0) for row in (2, 14, 29))
    findings = find_blunders_of(measured("total station, plane", 3, blunders))
    assert {one.name for one in findings.blunders} >= {planted.source for planted in blunders}
    sound = adjust(job).geometry
    away = sound.frame.displacement(sound.coordinates, findings.state.geometry.coordinates)
    assert np.nanmax(np.abs(away)) < 0.01  # m


def test_rows_without_a_check_are_listed() -> None:
    """A spur to a mark that nothing else sees."""
    job = build_job(
        {"A": (None, None, 0.0), "B": None, "C": None, "S": None},
        fixed_height=("A",),
        levels=[("A", "B", 1.0), ("B", "C", 1.0), ("C", "A", -2.0), ("A", "B", 1.0005), ("C", "S", 3.0)],
    )
    findings = find_blunders(adjust(job))
    assert findings.unchecked == ("levels.csv:6",)
    assert findings.blunders == ()
    wrong = replace(job, observations=(replace(job.observations[0], observed=job.observations[0].observed + SPUR),))
    assert find_blunders(adjust(wrong)).blunders == ()


SPUR = np.array([[0.0], [0.0], [0.0], [0.0], [50.0]])
"""An error that only the row without a check has."""


def line_and_loop(error: float) -> Job:
    """Two lines in a row between benchmarks, and a mark beside them that three lines reach."""
    rows = [("A", "P", 1.0), ("P", "B", 1.0 + error), ("A", "Q", 0.5), ("Q", "B", 1.5), ("A", "Q", 0.5003)]
    held = {"A": (None, None, 0.0), "B": (None, None, 2.0), "P": None, "Q": None}
    return build_job(held, fixed_height=("A", "B"), levels=rows)


def test_lines_in_a_row_can_not_be_told_apart_and_one_more_reading_decides() -> None:
    found = only(line_and_loop(0.05))
    one_of_these = {found.name, *(other.name for other in found.alternatives)}
    assert one_of_these == {"levels.csv:2", "levels.csv:3"}
    assert found.deciding is not None
    source, sds = found.deciding
    assert source in one_of_these
    # Repeated, P B reads 1.00 if it was wrong, 1.05 if A P was; sd 1 mm of the reading and of what the net expects.
    assert sds == pytest.approx(0.05 / np.hypot(0.001, np.sqrt(0.5) * 0.001), rel=1e-6)


def test_where_one_can_be_told_nothing_has_to_be_decided() -> None:
    found = only(measured("triangulation", blunders=(Planted("directions.csv:40", 3e-4),)))
    assert found.alternatives == ()
    assert found.deciding is None


def test_an_error_of_held_coordinates_is_in_every_repetition() -> None:
    """Two lines from A are both 50 mm off, or the height of A is: repeated they read right, or 50 mm off again."""
    rows = [("A", "P", 1.05), ("A", "Q", 1.05), ("B", "P", -1.0), ("B", "Q", -1.0)]
    marks = {"A": (None, None, 0.0), "B": (None, None, 2.0), "P": None, "Q": None}
    job = build_job(marks, fixed_height=("A", "B"), levels=rows)
    adjustment = adjust(job)
    state = State(adjustment.geometry, adjustment.orientations)
    hypotheses = Hypotheses.of(System.at(job, model_of(job, adjustment.unknowns, state), state))
    evidence = hypotheses.evidence()
    lines = evidence.allowing((0, 1))
    height = evidence.allowing((numbers_of(hypotheses)["height of control mark A"],))
    apart = separations(hypotheses.system, hypotheses.columns, hypotheses.lasting, lines, height)
    sd = np.hypot(0.001, np.sqrt(0.5) * 0.001)  # of the reading and of what the net expects
    np.testing.assert_allclose(apart, [0.05 / sd, 0.05 / sd, 0.0, 0.0], rtol=0, atol=1e-6)  # sds: rounding


def numbers_of(hypotheses: Hypotheses) -> dict[str, int]:
    return {group.hypothesis.name: number for number, group in enumerate(hypotheses.groups, hypotheses.first_group)}


def test_shared_errors_stay_within_what_can_be() -> None:
    """Distances written ten times too long are no scale of minus 107 % of all of them, and no constant of 700 m."""
    job = measured("traverses", blunders=tuple(Planted(f"distances.csv:{line}", 1500.0) for line in (4, 9, 12)))
    adjustment = adjust(job)
    state = State(adjustment.geometry, adjustment.orientations)
    hypotheses = Hypotheses.of(System.at(job, model_of(job, adjustment.unknowns, state), state))
    allowed = hypotheses.evidence().by_itself
    for number, group in enumerate(hypotheses.groups, hypotheses.first_group):
        if group.width == 1 and allowed.gains[number] > 0.0:
            (column,) = allowed.evidence.columns_of(number)
            error = allowed.score[column] / allowed.diagonal[column]
            assert group.limits[0] <= error <= group.limits[1], group.hypothesis.name
    constant = numbers_of(hypotheses)["constant of the distances of distances.csv"]
    assert allowed.testable[allowed.evidence.columns_of(constant)].all()
    assert allowed.gains[constant] == 0.0


def on_estimated_sigma(job: Job) -> Job:
    return replace(job, statistics=replace(job.statistics, sd_basis="posterior"))


def test_tau_is_tested_where_sigma_is_estimated() -> None:
    """Pope's τ (1976): the residual over its sd with σ̂₀ of the network that still has the error in it."""
    job = on_estimated_sigma(measured("levelling", blunders=(Planted("levels.csv:9", 0.008),)))
    result = adjust(job)
    findings = find_blunders(result)
    (found,) = findings.blunders
    assert findings.estimated
    (table,) = result.residuals
    row = [table.observations.provenance.label(i) for i in range(len(table.observations))].index(found.name)
    assert found.test == pytest.approx(abs(float(table.tau[row, 0])), rel=1e-6)
    assert found.critical == pytest.approx(critical_tau(0.001, result.solution.degrees_of_freedom), rel=1e-9)


def test_sds_of_errors_are_on_the_jobs_basis() -> None:
    """Variances ten times as large as claimed: with σ₀ estimated nothing is wrong but the claim."""
    job = measured("levelling", blunders=(Planted("levels.csv:9", 0.03),))
    (lines,) = job.observations
    assert isinstance(lines, HeightDifferences)
    (known,) = find_blunders(adjust(job)).blunders
    claim = replace(lines, precision=replace(lines.precision, stated=lines.precision.stated / np.sqrt(10.0)))
    bold = replace(job, observations=(claim,))
    (estimated,) = find_blunders(adjust(on_estimated_sigma(bold))).blunders
    (honest,) = find_blunders(adjust(on_estimated_sigma(job))).blunders
    assert estimated.sd == pytest.approx(honest.sd, rel=1e-6)
    assert known.name == estimated.name == honest.name


def accepted(result: Adjustment) -> bool:
    return result.accepted


def test_nothing_is_found_where_nothing_is_wrong() -> None:
    quiet = [adjust(measured(shape, seed)) for shape in ("levelling", "traverses", "GNSS") for seed in range(20, 24)]
    for result in filter(accepted, quiet):
        assert find_blunders(result).blunders == ()
    assert sum(map(accepted, quiet)) >= 8

"""How often do closures alone point at a mistake? One is planted in each of many invented jobs.

    python -m tests.studies.mutations    # rewrites the tables of docs/validation-closures.md

A job is observed with the noise that it claims, so that its closures are those of careful work; then one figure of one
row is made wrong and the job is checked. `found`: something exceeds its tolerance. `loop`: a closure that exceeds
rests on the wrong row, or a remark names it or its mark. `line or setup`: what the check names to look at first has
the wrong row's two marks, or its station. `row`: the wrong row itself is among what is named first; `named`: how many
rows (or marks of control) that are, on average. Rows that no closure rests on are counted as `unchecked` and left out
of the shares.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from adjust import Job
from adjust.network.closures import Check, check_job
from adjust.observations import (
    Directions,
    HeightDifferences,
    HorizontalDistances,
    Observations,
    SlopeDistances,
    Vectors,
    ZenithAngles,
)
from adjust.observations.sighted import HeightedSight
from adjust.simulate import NETWORKS, observe
from tests.studies.pages import rewrite

JOBS = 200
SEED = 20260204
PAGE = "validation-closures.md"
HEAD = ("mistake", "network", "jobs", "unchecked", "found", "loop", "line or setup", "row", "named")
GRADES = (1.0, 2.0, 5.0, 10.0)
"""Sizes of graded errors, in tolerances of the tightest closure that rests on the row."""


@dataclass(frozen=True)
class Planted:
    """A job with one mistake in it: the row's `source` in the field book ("" for a mark), and the marks concerned."""

    job: Job
    source: str
    marks: tuple[int, ...]


Plant = Callable[[Job, np.random.Generator], Planted]


@dataclass(frozen=True)
class Mistake:
    """One kind of mistake, in one shape of network."""

    name: str
    network: str
    plant: Plant


@dataclass(frozen=True)
class Outcome:
    """What the check of one job with a mistake said; `checked` where some closure rests on the row at all; `named`
    counts the rows and marks of control that it tells to look at first."""

    checked: bool
    found: bool
    loop: bool
    line: bool
    row: bool
    named: int


def rows_of(job: Job, kind: type[Observations]) -> tuple[int, Observations]:
    """Place of a kind in the job, and its rows."""
    return next((place, rows) for place, rows in enumerate(job.observations) if isinstance(rows, kind))


def with_rows(job: Job, place: int, rows: Observations, row: int) -> Planted:
    """The job with a kind's rows replaced, `row` being the one with the mistake."""
    kinds = (*job.observations[:place], rows, *job.observations[place + 1 :])
    marks = tuple(job.observations[place].marks[row].tolist())
    return Planted(replace(job, observations=kinds), rows.provenance.label(row), marks)


def wrong_value(kind: type[Observations], sizes: Sequence[float]) -> Plant:
    """A value off by one of the sizes, metres or radians, up or down."""

    def plant(job: Job, generator: np.random.Generator) -> Planted:
        place, rows = rows_of(job, kind)
        row = int(generator.integers(len(rows)))
        error = float(generator.choice(sizes)) * float(generator.choice([-1.0, 1.0]))
        return changed(job, place, row, error, int(generator.integers(len(rows.components))))

    return plant


def changed(job: Job, place: int, row: int, error: float, component: int = 0) -> Planted:
    """The job with one value changed."""
    rows = job.observations[place]
    observed = rows.observed.copy()
    observed[row, component] += error
    return with_rows(job, place, replace(rows, observed=observed), row)


def graded(kind: type[Observations], checks: Sequence[str], grade: float) -> Plant:
    """A value off by `grade` tolerances of the tightest of `checks` that rests on its row; a row without any is
    left."""

    def plant(job: Job, generator: np.random.Generator) -> Planted:
        place, rows = rows_of(job, kind)
        row = int(generator.integers(len(rows)))
        component = int(generator.integers(len(rows.components)))
        tolerance = tightest(check_job(job), rows.provenance.label(row), checks)
        if not np.isfinite(tolerance):
            return with_rows(job, place, rows, row)
        if isinstance(rows, ZenithAngles):
            tolerance /= float(length_of(job, rows, row))
        return changed(job, place, row, grade * tolerance * float(generator.choice([-1.0, 1.0])), component)

    return plant


def tightest(check: Check, source: str, checks: Sequence[str]) -> float:
    """The smallest allowance of the closures of some checks that rest on a row; infinite where there is none."""
    allowed = [
        float(judged.allowed[closure].max())
        for judged in check.closures
        if judged.closures.check in checks
        for closure in range(len(judged.closures))
        if source in map(check.observed.source, judged.closures.rows[closure].tolist())
    ]
    return min(allowed, default=np.inf)


def length_of(job: Job, rows: Observations, row: int) -> float:
    """Horizontal length of a sight between start coordinates, metres."""
    at, to = rows.marks[row, :1], rows.marks[row, 1:2]
    return float(check_job(job).observed.geometry.level_distance(at, to)[0][0])


def exchanged_ends(kind: type[Observations]) -> Plant:
    """From and to exchanged."""

    def plant(job: Job, generator: np.random.Generator) -> Planted:
        place, rows = rows_of(job, kind)
        row = int(generator.integers(len(rows)))
        marks = rows.marks.copy()
        marks[row] = marks[row, ::-1]
        return with_rows(job, place, replace(rows, marks=marks), row)

    return plant


def wrong_mark(kind: type[Observations]) -> Plant:
    """The name of another mark in the column `to`."""

    def plant(job: Job, generator: np.random.Generator) -> Planted:
        place, rows = rows_of(job, kind)
        row = int(generator.integers(len(rows)))
        marks = rows.marks.copy()
        others = np.setdiff1d(np.arange(len(job.marks)), marks[row])
        marks[row, -1] = int(generator.choice(others))
        return with_rows(job, place, replace(rows, marks=marks), row)

    return plant


def exchanged_targets(job: Job, generator: np.random.Generator) -> Planted:
    """Two targets of one round booked under each other's name."""
    place, rows = rows_of(job, Directions)
    setup = int(generator.integers(len(job.setups)))
    seen = np.flatnonzero(rows.setup == setup)
    one, other = (int(row) for row in generator.choice(seen, 2, replace=False))
    marks = rows.marks.copy()
    marks[[one, other], 1] = marks[[other, one], 1]
    return with_rows(job, place, replace(rows, marks=marks), one)


def wrong_target_height(job: Job, generator: np.random.Generator) -> Planted:
    """A target height off by one or more decimetres, in the zenith angle and in the distance of one sight."""
    place, zeniths = rows_of(job, ZenithAngles)
    row = int(generator.integers(len(zeniths)))
    error = float(generator.integers(1, 10)) / 10.0
    kinds = tuple(_with_target_height(rows, zeniths.marks[row], error) for rows in job.observations)
    planted = with_rows(job, place, kinds[place], row)
    return replace(planted, job=replace(job, observations=kinds))


def _with_target_height(rows: Observations, sight: np.ndarray, error: float) -> Observations:
    if not isinstance(rows, HeightedSight):
        return rows
    heights = rows.heights.copy()
    heights[(rows.marks == sight).all(axis=1), 1] += error
    return replace(rows, heights=heights)


def mistyped_control(job: Job, generator: np.random.Generator) -> Planted:
    """A digit of a control coordinate: from a decimetre to a hundred metres."""
    error = np.zeros(3)
    held = np.flatnonzero(job.marks.control.any(axis=1))
    mark = int(generator.choice(held))
    columns = [2] if not job.marks.control[mark, 0] else [0, 1]
    error[int(generator.choice(columns))] = 10.0 ** int(generator.integers(-1, 3)) * int(generator.integers(1, 10))
    given = job.marks.given.copy()
    given[mark] += error
    return Planted(replace(job, marks=replace(job.marks, given=given)), "", (mark,))


def exchanged_coordinates(job: Job, generator: np.random.Generator) -> Planted:
    """Easting and northing of a control mark exchanged, all marks having start coordinates."""
    mark = int(generator.choice(np.flatnonzero(job.marks.control[:, 0])))
    given = job.marks.given.copy()
    given[mark, :2] = given[mark, 1::-1]
    return Planted(replace(job, marks=replace(job.marks, given=given)), "", (mark,))


def slips(unit: float, *sizes: float) -> tuple[float, ...]:
    """Sizes in a unit."""
    return tuple(unit * size for size in sizes)


DEGREE = np.pi / 180.0
STAFF = (0.01, 0.1, 1.0)
"""Metres: a digit of a staff reading."""

GROSS = (
    Mistake("staff digit: 0.01, 0.1 or 1 m", "levelling", wrong_value(HeightDifferences, STAFF)),
    Mistake("from and to exchanged", "levelling", exchanged_ends(HeightDifferences)),
    Mistake("another mark's name in `to`", "levelling", wrong_mark(HeightDifferences)),
    Mistake("benchmark height mistyped", "levelling", mistyped_control),
    Mistake("circle slip: 10°, 1° or 10′", "triangulation", wrong_value(Directions, slips(DEGREE, 10, 1, 1 / 6))),
    Mistake("two targets exchanged", "triangulation", exchanged_targets),
    Mistake("distance: 0.1, 1 or 10 m", "triangulation", wrong_value(HorizontalDistances, (0.1, 1.0, 10.0))),
    Mistake("control coordinate mistyped", "triangulation", mistyped_control),
    Mistake("easting and northing exchanged", "triangulation", exchanged_coordinates),
    Mistake("circle slip: 10°, 1° or 10′", "traverses", wrong_value(Directions, slips(DEGREE, 10, 1, 1 / 6))),
    Mistake("distance: 0.1, 1 or 10 m", "traverses", wrong_value(HorizontalDistances, (0.1, 1.0, 10.0))),
    Mistake("zenith: 10°, 1° or 10′", "total station, plane", wrong_value(ZenithAngles, slips(DEGREE, 10, 1, 1 / 6))),
    Mistake("target height: 0.1 … 0.9 m", "total station, plane", wrong_target_height),
    Mistake("slope distance: 0.1, 1 or 10 m", "total station, plane", wrong_value(SlopeDistances, (0.1, 1.0, 10.0))),
    Mistake("vector component: 0.1, 1 or 10 m", "GNSS", wrong_value(Vectors, (0.1, 1.0, 10.0))),
    Mistake("vector from and to exchanged", "GNSS", exchanged_ends(Vectors)),
    Mistake("another mark's name in `to`", "GNSS", wrong_mark(Vectors)),
)

LEVEL_CHECKS = ("level_loop", "level_line")
ANGLE_CHECKS = ("triangle", "quadrilateral", "angle_sum", "azimuth_link")
LENGTH_CHECKS = ("traverse_loop", "traverse_link", "control_distance", "distance_repeats")
HEIGHT_CHECKS = ("reciprocal_zenith", "height_loop")
VECTOR_CHECKS = ("vector_loop", "vector_line")
GRADED_KINDS = (
    ("rise", "levelling", HeightDifferences, LEVEL_CHECKS),
    ("direction", "triangulation", Directions, ANGLE_CHECKS),
    ("direction", "traverses", Directions, ANGLE_CHECKS),
    ("horizontal distance", "triangulation", HorizontalDistances, LENGTH_CHECKS),
    ("zenith angle", "total station, plane", ZenithAngles, HEIGHT_CHECKS),
    ("vector", "GNSS", Vectors, VECTOR_CHECKS),
)


def graded_mistakes(grade: float) -> Iterator[Mistake]:
    """An error of so many tolerances in every kind of observation."""
    for name, network, kind, checks in GRADED_KINDS:
        yield Mistake(f"{name}, {grade:g} × its tolerance", network, graded(kind, checks, grade))


def outcome(mistake: Mistake, number: int) -> Outcome:
    """One job with the mistake, checked."""
    generator = np.random.default_rng([SEED, number])
    # start coordinates, as a job that was planned on a map has them, let coordinates be judged too
    start = 0.3 if mistake.plant is exchanged_coordinates else None
    job, _ = observe(NETWORKS[mistake.network](generator), generator, start_sd=start)
    planted = mistake.plant(job, generator)
    return judge(check_job(planted.job), planted)


def judge(check: Check, planted: Planted) -> Outcome:
    """How near a check points to the mistake."""
    return Outcome(
        checked=not planted.source or any(rests_on(check, planted, failing=False)),
        found=not check.passed,
        loop=any(rests_on(check, planted, failing=True)) or remarked(check, planted),
        line=any(beside(check, row, planted) for row in named_first(check)) or exactly_named(check, planted),
        row=exactly_named(check, planted),
        named=sum(len(first.rows) + len(first.marks) for first in check.suspicions[:1]),
    )


def lines_in(label: str) -> set[str]:
    """The sources that a label names: `pointings.csv:3+7` is `pointings.csv:3` and `pointings.csv:7`."""
    file, _, lines = label.rpartition(":")
    return {f"{file}:{line}" for line in lines.split("+")}


def is_wrong(check: Check, row: int, planted: Planted) -> bool:
    """Whether an observation is the wrong row, or made of it."""
    return planted.source in lines_in(check.observed.source(row))


def rests_on(check: Check, planted: Planted, *, failing: bool) -> Iterator[bool]:
    """Whether each closure rests on the wrong row, or begins or ends at the wrong mark of control."""
    for judged in check.closures:
        for closure in np.flatnonzero(judged.exceeds) if failing else range(len(judged.closures)):
            if planted.source:
                sources = judged.closures.sources
                rows = judged.closures.rows[int(closure)].tolist()
                about = bool(sources) and planted.source in lines_in(sources[int(closure)])
                yield about or any(is_wrong(check, row, planted) for row in rows)
            else:
                marks = judged.closures.marks[int(closure)].tolist()
                yield bool({marks[0], marks[-1]} & set(planted.marks))


def remarked(check: Check, planted: Planted) -> bool:
    """Whether a remark that exceeds names the wrong row or the wrong mark."""
    remarks = [remark for remark in check.remarks if remark.exceeds]
    if planted.source:
        return any(is_wrong(check, row, planted) for remark in remarks for row in remark.rows)
    return bool({mark for remark in remarks for mark in remark.marks} & set(planted.marks))


def named_first(check: Check) -> list[int]:
    """The rows that a check tells to look at first."""
    rows = [row for suspicion in check.suspicions[:1] for row in suspicion.rows]
    rows += [row for shared in check.shared[:1] for row in shared.rows]
    return rows


def exactly_named(check: Check, planted: Planted) -> bool:
    """Whether the wrong row, or the wrong mark of control, is among what is named first, or in a remark."""
    if planted.source:
        named = any(is_wrong(check, row, planted) for row in named_first(check))
    else:
        named = any(set(suspicion.marks) & set(planted.marks) for suspicion in check.suspicions[:1])
    return named or remarked(check, planted)


def beside(check: Check, row: int, planted: Planted) -> bool:
    """Whether a row has the two marks or the station of the wrong row, or touches the wrong mark."""
    marks = check.observed.marks(row)
    if not planted.source:
        return bool(set(marks) & set(planted.marks))
    return set(marks) == set(planted.marks) or (len(marks) > 1 and marks[0] == planted.marks[0])


def table(mistakes: Iterable[tuple[str, str, list[Outcome]]]) -> str:
    """The page's table, a line for each mistake, by its name, its network and what many jobs made of it."""
    lines = [f"| {' | '.join(HEAD)} |", "| --- | --- | ---: | ---: | ---: | ---: | ---: | ---: | ---: |"]
    for name, network, outcomes in mistakes:
        checked = [result for result in outcomes if result.checked]
        shares = (sum(getattr(result, key) for result in checked) for key in ("found", "loop", "line", "row"))
        cells = [name, network, str(len(outcomes)), str(len(outcomes) - len(checked))]
        cells += [percent(share, len(checked)) for share in shares]
        named = [result.named for result in checked if result.found]
        lines.append(f"| {' | '.join(cells)} | {f'{np.mean(named):.1f}' if named else '–'} |")
    return "\n".join(lines) + "\n"


def run(mistakes: Iterable[Mistake], jobs: int) -> Iterator[tuple[str, str, list[Outcome]]]:
    """Every mistake in so many jobs."""
    for mistake in mistakes:
        yield mistake.name, mistake.network, [outcome(mistake, number) for number in range(jobs)]


def percent(part: int, whole: int) -> str:
    """`97 %`."""
    return f"{100 * part / whole:.0f} %" if whole else "–"


if __name__ == "__main__":
    wanted = int(sys.argv[1]) if len(sys.argv) > 1 else JOBS
    by_grade = [mistake for grade in GRADES for mistake in graded_mistakes(grade)]
    rewrite(PAGE, "gross mistakes", table(run(GROSS, wanted)))
    rewrite(PAGE, "graded mistakes", table(run(by_grade, wanted)))

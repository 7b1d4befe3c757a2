"""One gross error in one raw reading: how often do closures alone point at it?

    python -m tests.studies.mutations_raw    # rewrites a table of docs/validation-closures.md

As `tests.studies.mutations`, whose columns these are, with books as a party brings them home: two faces, three rounds
that come back to their first target and leave out a fifth of the sights, weather, target constants, levels through
turning points. One cell of the book is changed before it is read.
"""

from __future__ import annotations

import sys
import tempfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from adjust import FieldDataError, read_job
from adjust.field_book.writing import JobFolder
from adjust.network.closures import check_job
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_pointings import Habits
from tests.studies.mutations import JOBS, PAGE, Outcome, Planted, judge, table
from tests.studies.pages import rewrite
from tests.studies.raw_readings import invented_plan

SEED = 20260207
HABITS = Habits(closes_horizon=True)
FIRST_LINE = 2
"""Of a table with one header row."""

Cells = dict[str, list[str]]
Change = Callable[[JobFolder, np.random.Generator], tuple[str, int]]
"""Changes a folder in one place; returns the table and the row of it."""


@dataclass(frozen=True)
class RawMistake:
    """One kind of mistake in a book."""

    name: str
    change: Change


def added(name: str, column: str, *sizes: float) -> Change:
    """A figure of a column off by one of the sizes, in the column's unit, up or down."""

    def change(folder: JobFolder, generator: np.random.Generator) -> tuple[str, int]:
        cells = folder.tables[name][column]
        row = int(generator.choice([row for row, cell in enumerate(cells) if cell]))
        error = float(generator.choice(sizes)) * float(generator.choice([-1.0, 1.0]))
        value = float(cells[row]) + error
        cells[row] = repr(value % 360.0 if column.endswith("_deg") else value)
        return name, row

    return change


def other_face(folder: JobFolder, generator: np.random.Generator) -> tuple[str, int]:
    """L booked for R, or R for L."""
    cells = folder.tables["pointings"]["face"]
    row = int(generator.integers(len(cells)))
    cells[row] = "R" if cells[row] == "L" else "L"
    return "pointings", row


def left_out(folder: JobFolder, generator: np.random.Generator) -> tuple[str, int]:
    """A pointing on the second face that was never read."""
    pointings = folder.tables["pointings"]
    row = int(generator.choice([row for row, face in enumerate(pointings["face"]) if face == "R"]))
    for cells in pointings.values():
        if cells:
            del cells[row]
    return "pointings", row - 1


def exchanged_targets(folder: JobFolder, generator: np.random.Generator) -> tuple[str, int]:
    """Two pointings of one half-round booked under each other's name."""
    pointings = folder.tables["pointings"]
    half = list(zip(pointings["setup"], pointings["round"], pointings["face"], strict=True))
    row = int(generator.integers(len(half)))
    others = [other for other, same in enumerate(half) if same == half[row] and _differ(pointings, row, other)]
    if others:
        other = int(generator.choice(others))
        pointings["to"][row], pointings["to"][other] = pointings["to"][other], pointings["to"][row]
    return "pointings", row


def _differ(pointings: Cells, row: int, other: int) -> bool:
    return pointings["to"][row] != pointings["to"][other]


def wrong_target(folder: JobFolder, generator: np.random.Generator) -> tuple[str, int]:
    """A target without the constant of the others, all through one setup towards one mark."""
    folder.job_file["targets"]["foil"] = {"constant_mm": 0.0}
    pointings = folder.tables["pointings"]
    row = int(generator.choice([row for row, cell in enumerate(pointings["slope_m"]) if cell]))
    sight = pointings["setup"][row], pointings["to"][row]
    pairs = zip(pointings["setup"], pointings["to"], strict=True)
    pointings["target"] = ["foil" if pair == sight else "" for pair in pairs]
    return "pointings", row


def exchanged_points(folder: JobFolder, generator: np.random.Generator) -> tuple[str, int]:
    """The marks at the two ends of a levelled line exchanged."""
    book = folder.tables["level_book"]
    line = str(generator.choice(sorted(set(book["line"]))))
    rows = [row for row, name in enumerate(book["line"]) if name == line]
    first, last = rows[0], rows[-1]
    book["point"][first], book["point"][last] = book["point"][last], book["point"][first]
    return "level_book", last


MISTAKES = (
    RawMistake("a face left out", left_out),
    RawMistake("a face booked as the other", other_face),
    RawMistake("circle slip of one reading: 10°, 1° or 10′", added("pointings", "circle_deg", 10.0, 1.0, 1 / 6)),
    RawMistake("zenith slip of one reading: 10°, 1° or 10′", added("pointings", "zenith_deg", 10.0, 1.0, 1 / 6)),
    RawMistake("distance of one reading: 0.1, 1 or 10 m", added("pointings", "slope_m", 0.1, 1.0, 10.0)),
    RawMistake("two targets exchanged in a half-round", exchanged_targets),
    RawMistake("target height: 0.1, 0.2 or 0.5 m", added("pointings", "target_height_m", 0.1, 0.2, 0.5)),
    RawMistake("instrument height: 0.1, 0.2 or 0.5 m", added("pointings", "instrument_height_m", 0.1, 0.2, 0.5)),
    RawMistake("temperature: 10 or 20 °C", added("pointings", "temperature_c", 10.0, 20.0)),
    RawMistake("pressure: 50 hPa", added("pointings", "pressure_hpa", 50.0)),
    RawMistake("target constant of 34.4 mm left out", wrong_target),
    RawMistake("staff digit, backsight: 0.01, 0.1 or 1 m", added("level_book", "backsight_m", 0.01, 0.1, 1.0)),
    RawMistake("staff digit, foresight: 0.01, 0.1 or 1 m", added("level_book", "foresight_m", 0.01, 0.1, 1.0)),
    RawMistake("levelled from and to exchanged", exchanged_points),
)


def outcome(mistake: RawMistake, number: int) -> Outcome:
    """One book with the mistake, read, reduced and checked; one that is refused as it is read is found by that."""
    generator = np.random.default_rng([SEED, number])
    folder = read_by_a_party(invented_plan(generator), generator, HABITS).folder
    name, row = mistake.change(folder, generator)
    marks, source = _marks(folder, name, row), f"{name}.csv:{row + FIRST_LINE}"
    try:
        with tempfile.TemporaryDirectory() as place:
            folder.write(Path(place))
            job = read_job(place)
    except FieldDataError as refusal:
        named = source in {f"{mistake.file}:{mistake.line}" for mistake in refusal.mistakes}
        return Outcome(checked=True, found=True, loop=named, line=named, row=named, named=int(named))
    names = job.marks.index
    return judge(check_job(job), Planted(job, source, tuple(names[mark] for mark in marks if mark in names)))


def _marks(folder: JobFolder, name: str, row: int) -> tuple[str, ...]:
    """The marks that a row is about: station and target, or the two ends of the levelled section."""
    cells = folder.tables[name]
    if name == "pointings":
        return cells["at"][row], cells["to"][row]
    marks = [(place, point) for place, point in enumerate(cells["point"]) if not point.startswith("TP")]
    behind = [point for place, point in marks if place <= row and cells["line"][place] == cells["line"][row]]
    ahead = [point for place, point in marks if place > row and cells["line"][place] == cells["line"][row]]
    return (*behind[-1:], *ahead[:1]) if ahead else tuple(behind[-2:])


def run(jobs: int) -> Iterator[tuple[str, str, list[Outcome]]]:
    """Every mistake in so many books."""
    for mistake in MISTAKES:
        yield mistake.name, "raw readings", [outcome(mistake, number) for number in range(jobs)]


if __name__ == "__main__":
    rewrite(PAGE, "raw mistakes", table(run(int(sys.argv[1]) if len(sys.argv) > 1 else JOBS)))

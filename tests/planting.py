"""Mistakes of a field party, made on purpose in the cells of a sound book: each function spoils a copy of the cells.

They are written without the catalogue that has to find them; only how often which digit is taken for which is shared.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from adjust import Job
from adjust.arrays import FloatArray
from adjust.blunders import Cell
from adjust.blunders.mistakes.digit_misread import likeness
from adjust.blunders.mistakes.notation import Notation
from adjust.observations import Observations, SlopeDistances, ZenithAngles
from adjust.simulate import true_geometry
from adjust.units import ARCMINUTE, DEGREE, GON, INTERNATIONAL_FOOT

Cells = dict[str, Cell]
HEIGHTS = ("instrument_height", "target_height")
VALUE = {
    "direction": "direction",
    "angle": "angle",
    "azimuth": "azimuth",
    "slope_distance": "slope",
    "horizontal_distance": "horizontal",
    "zenith": "zenith",
    "height_difference": "rise",
}
LIKE = {
    "dms": "0-00-00.0",
    "deg": "0.00000",
    "gon": "0.0000",
    "m": "0.000",
    "ft": "0.000",
}
"""How instruments show values: the digits that a book has."""


@dataclass(frozen=True)
class Booked:
    """One sound row of a job and the cells that it was written in; `plan` knows the true coordinates."""

    plan: Job
    job: Job
    place: int
    row: int
    cells: Cells

    @property
    def itself(self) -> Any:
        """The row as rows of its kind."""
        return self.job.observations[self.place].take(np.array([self.row]))

    @property
    def kind(self) -> str:
        """Its kind."""
        return self.job.observations[self.place].kind

    def other_marks(self, generator: np.random.Generator) -> str:
        """The name of some mark that is not in the row."""
        names = [name for number, name in enumerate(self.job.marks.names) if number not in self.itself.marks[0]]
        return str(generator.choice(names))


def book(plan: Job, job: Job, place: int, row: int, generator: np.random.Generator) -> Booked:
    """A row of a job written into cells, in units that vary from job to job, and read back from them."""
    rows = job.observations[place].take(np.array([row]))
    angle = str(generator.choice(["dms", "dms", "dms", "gon", "deg"]))
    length = str(generator.choice(["m", "m", "m", "m", "ft"]))
    cells = {role: Cell(role, job.marks.names[mark]) for role, mark in zip(rows.roles, rows.marks[0], strict=True)}
    if rows.kind == "vector":
        for axis, value in zip("xyz", rows.observed[0], strict=True):
            cells[f"d{axis}"] = write(f"d{axis}", "m", "0.0000", value)
    else:
        ending = angle if rows.unit == "rad" else length
        like = "0.0000" if rows.kind == "height_difference" else LIKE[ending]
        cells[VALUE[rows.kind]] = write(VALUE[rows.kind], ending, like, rows.observed[0, 0])
    if isinstance(rows, SlopeDistances | ZenithAngles):
        for name, height in zip(HEIGHTS, rows.heights[0], strict=True):
            cells[name] = write(name, length, "0.000", height)
    booked = Booked(plan, job, place, row, cells)
    return replace(booked, job=with_row(booked, read(booked, cells)))


def write(name: str, ending: str, like: str, value: float) -> Cell:
    """A cell that looks like another one of its column."""
    return Cell(f"{name}_{ending}", Notation(ending, like).write(value))


def read(booked: Booked, cells: Mapping[str, Cell]) -> Observations:
    """The row as the field book reads it from cells."""
    rows = booked.itself
    names = ["dx", "dy", "dz"] if rows.kind == "vector" else [VALUE[rows.kind]]
    numbers = {name: Notation.of(cells[name]).number for name in names}
    index = booked.job.marks.index
    changes: dict[str, Any] = {
        "observed": np.array([[numbers[name] for name in names]]),
        "marks": np.array([[index[cells[role].text] for role in rows.roles]]),
    }
    if isinstance(rows, SlopeDistances | ZenithAngles):
        changes["heights"] = np.array([[Notation.of(cells[name]).number if name in cells else 0.0 for name in HEIGHTS]])
    return replace(rows, **changes)


def with_row(booked: Booked, row: Observations) -> Job:
    """The job with another row in the place of the booked one."""
    kinds = list(booked.job.observations)
    kinds[booked.place] = put(kinds[booked.place], booked.row, row)
    return replace(booked.job, observations=tuple(kinds))


def put(rows: Any, place: int, row: Any) -> Any:
    """Rows with one of them exchanged; where it comes from, and how precise it is, stays."""
    changes = {}
    for name in ("observed", "marks", "heights"):
        if hasattr(rows, name):
            column = getattr(rows, name).copy()
            column[place] = getattr(row, name)[0]
            changes[name] = column
    return replace(rows, **changes)


Spoiler = Callable[[Booked, np.random.Generator], Cells | None]


def retold(cells: Cells, name: str, text: str) -> Cells:
    """Cells with another text in one of them."""
    return {**cells, name: Cell(cells[name].title, text)}


def revalued(cells: Cells, name: str, change: Callable[[float], float]) -> Cells:
    """Cells with another value in one of them, metres or radians, in the same notation."""
    notation = Notation.of(cells[name])
    return retold(cells, name, notation.write(change(notation.number)))


def some_number(booked: Booked, generator: np.random.Generator) -> str:
    """A column of the row that holds a number; the value more often than the heights."""
    names = [VALUE[booked.kind]] if booked.kind in VALUE else ["dx", "dy", "dz"]
    heights = [name for name in HEIGHTS if name in booked.cells]
    return str(generator.choice(heights if heights and generator.random() < 0.2 else names))


def digits_exchanged(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """Two neighbours changed over."""
    name = some_number(booked, generator)
    text = booked.cells[name].text
    return _valid(booked, name, spoil_neighbours(text, generator))


def spoil_neighbours(text: str, generator: np.random.Generator) -> str:
    """A text with two neighbouring digits, of which none is a sign or a separator, changed over."""
    pairs = [(i, i + 1) for i in range(len(text) - 1) if text[i : i + 2].isdigit() and text[i] != text[i + 1]]
    if "-" not in text[1:]:
        pairs += [(i - 1, i + 1) for i, sign in enumerate(text) if sign == "." and text[i - 1] != text[i + 1]]
    first, second = pairs[int(generator.integers(len(pairs)))]
    signs = list(text)
    signs[first], signs[second] = signs[second], signs[first]
    return "".join(signs)


def digit_misread(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """One digit taken for another."""
    name = some_number(booked, generator)
    return _valid(booked, name, spoil_digit(booked.cells[name].text, generator))


def spoil_digit(text: str, generator: np.random.Generator) -> str:
    """A text with one digit taken for another."""
    place = int(generator.choice([i for i, sign in enumerate(text) if sign.isdigit()]))
    others = [digit for digit in "0123456789" if digit != text[place]]
    weights = np.array([likeness(text[place], other) for other in others])
    return text[:place] + str(generator.choice(others, p=weights / weights.sum())) + text[place + 1 :]


def _valid(booked: Booked, name: str, text: str) -> Cells | None:
    """None where the field book would refuse the cell."""
    number = Notation(Notation.of(booked.cells[name]).ending, text).number
    sound = np.isfinite(number) and (booked.kind != "zenith" or name in HEIGHTS or 0 <= number <= np.pi)
    return retold(booked.cells, name, text) if sound else None


def whole_angle(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """A graduation taken for its neighbour."""
    name = VALUE[booked.kind]
    steps = {
        "dms": [10 * DEGREE, DEGREE, 10 * ARCMINUTE, ARCMINUTE],
        "deg": [10 * DEGREE, DEGREE],
        "gon": [10 * GON, GON, GON / 10],
    }[Notation.of(booked.cells[name]).ending]
    step = float(generator.choice(steps)) * float(generator.choice([-1, 1]))
    return revalued(booked.cells, name, lambda value: _circle(booked, value + step))


def _circle(booked: Booked, value: float) -> float:
    return value % (2 * np.pi) if booked.itself.full_circle else value


def other_face(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """Half a turn off."""
    return revalued(booked.cells, VALUE[booked.kind], lambda value: _circle(booked, value + np.pi))


def counted_otherwise(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """360° − the value; of zenith angles 180° − it or an elevation."""
    if booked.kind != "zenith":
        return revalued(booked.cells, VALUE[booked.kind], lambda value: 2 * np.pi - value)
    return revalued(booked.cells, "zenith", lambda value: abs(np.pi / 2 - value))


def back_and_fore(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """The names of the two sights of an angle changed over."""
    return _names_exchanged(booked, "from", "to")


def ends_exchanged(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """The names of the two ends changed over."""
    return _names_exchanged(booked, booked.itself.roles[0], booked.itself.roles[1])


def _names_exchanged(booked: Booked, first: str, second: str) -> Cells:
    cells = booked.cells
    return {**cells, first: Cell(first, cells[second].text), second: Cell(second, cells[first].text)}


def degrees_and_gon(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """What another unit shows, typed as it was read."""
    name = VALUE[booked.kind]
    notation = Notation.of(booked.cells[name])
    if notation.ending == "dms":
        shown = f"{notation.number / float(generator.choice([GON, DEGREE])):.5f}"
        whole, decimals = shown.split(".")
        text = f"{whole}-{decimals[:2]}-{decimals[2:4]}.{decimals[4:]}"
    elif notation.ending == "deg":
        text = f"{notation.number / GON:.5f}"
    else:
        text = f"{notation.number / DEGREE:.4f}"
    return _valid(booked, name, text)


def metres_and_feet(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """Read in feet, typed as metres, or the reverse."""
    if booked.kind == "vector":
        factor, names = 1 / INTERNATIONAL_FOOT, ["dx", "dy", "dz"]
    else:
        names = [VALUE[booked.kind]]
        factor = INTERNATIONAL_FOOT if booked.cells[names[0]].title.endswith("ft") else 1 / INTERNATIONAL_FOOT
    cells = booked.cells
    for name in names:
        cells = revalued(cells, name, lambda value: value * factor)
    return cells


def dropped_tape(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """Whole metres, or a tape; in a book of feet whole feet."""
    name = VALUE[booked.kind]
    feet = booked.cells[name].title.endswith("ft")
    lost = float(generator.choice([1, 10, 50, 100] if feet else [1, 2, 5, 10, 20, 30, 50, 100]))
    sign = float(generator.choice([-1, -1, 1]))
    change = sign * lost * (INTERNATIONAL_FOOT if feet else 1.0)
    return revalued(booked.cells, name, lambda value: value + change) if booked.itself.observed[0, 0] > 101 else None


def slope_as_horizontal(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """The other distance of the line, with the same error of measurement."""
    row, geometry = booked.itself, true_geometry(booked.plan)
    other = slope_of_line(row, geometry) - float(row.predict(geometry)[0, 0])
    if booked.kind == "slope_distance":
        level, _ = geometry.level_distance(row.marks[:, 0], row.marks[:, 1])
        other = float(level[0]) - float(row.predict(geometry)[0, 0])
    return revalued(booked.cells, VALUE[booked.kind], lambda value: value + other)


def slope_of_line(row: Any, geometry: Any) -> float:
    """The slope distance from mark to mark."""
    slope = SlopeDistances(
        marks=row.marks,
        observed=row.observed,
        provenance=row.provenance,
        precision=row.precision,
        heights=np.zeros((1, 2)),
    )
    return float(slope.predict(geometry)[0, 0])


CONSTANTS = {"round prism": -0.0344, "small prism": -0.0175}
"""Metres, for jobs whose job file names its targets."""


def target_constant(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """Left out, that of another target, or applied twice, the first five times and the second thrice as often."""
    used, right = generator.permutation(list(booked.job.target_constants.values()))
    change = float(generator.choice([-right, used - right, right], p=np.array([5.0, 3.0, 1.0]) / 9.0))
    return revalued(booked.cells, VALUE[booked.kind], lambda value: value + change)


def sign(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """The sign of a rise or of one component."""
    name = VALUE.get(booked.kind) or str(generator.choice(["dx", "dy", "dz"]))
    return revalued(booked.cells, name, lambda value: -value)


def staff_misread(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """A decimetre or a metre of the staff; of a staff in feet, a tenth or a foot."""
    unit = INTERNATIONAL_FOOT if booked.cells["rise"].title.endswith("ft") else 1.0
    step = float(generator.choice([0.1, 1.0]) * generator.choice([-1, 1])) * unit
    return revalued(booked.cells, "rise", lambda value: value + step)


def height_missing(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """One of the two heights not entered."""
    lost = str(generator.choice(HEIGHTS))
    return {name: cell for name, cell in booked.cells.items() if name != lost}


def heights_exchanged(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """Each in the other's column."""
    first, second = (booked.cells[name].text for name in HEIGHTS)
    return retold(retold(booked.cells, HEIGHTS[0], second), HEIGHTS[1], first)


def height_of_another_setup(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """What another row of the job has in the column."""
    role = int(generator.integers(2))
    heights = booked.job.observations[booked.place].heights[:, role]  # type: ignore[attr-defined]
    others = np.unique(heights[np.abs(heights - heights[booked.row]) > 1e-6])
    other = float(generator.choice(others))
    return revalued(booked.cells, HEIGHTS[role], lambda value: other)


def another_mark(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """The name of another mark in the place of the one that was sighted, or levelled from or to."""
    role = str(generator.choice([role for role in booked.itself.roles if role != "at"]))
    return retold(booked.cells, role, booked.other_marks(generator))


def antenna_height(booked: Booked, generator: np.random.Generator) -> Cells | None:
    """The antenna height of one end left out or wrong by some decimetres."""
    coordinates: FloatArray = booked.plan.marks.given[booked.itself.marks[0]]
    up = booked.plan.frame.axes(coordinates)[int(generator.integers(2)), 2]  # type: ignore[attr-defined]
    size = float(generator.uniform(0.1, 2.2) * generator.choice([-1, 1]))
    cells = booked.cells
    for name, part in zip(("dx", "dy", "dz"), (size * up).tolist(), strict=True):
        cells = revalued(cells, name, lambda value, part=part: value + part)  # type: ignore[misc]
    return cells


def spoil_group(booked: Booked, role: int, text: str) -> tuple[Job, Cells]:
    """A job in which every sight that shares the booked row's height has another one, and the first line's cells."""
    name = HEIGHTS[role]
    cells = {key: cell for key, cell in booked.cells.items() if key != name}
    if text:
        cells[name] = Cell(booked.cells[name].title, text)
    height = Notation.of(cells[name]).number if text else 0.0
    mark, written = booked.itself.marks[0, role], booked.itself.heights[0, role]
    changed = []
    for rows in booked.job.observations:
        if isinstance(rows, SlopeDistances | ZenithAngles):
            heights = rows.heights.copy()
            shared = (rows.marks[:, role] == mark) & (np.abs(heights[:, role] - written) < 1e-9)
            heights[shared, role] = height
            rows = replace(rows, heights=heights)
        changed.append(rows)
    return replace(booked.job, observations=tuple(changed)), cells

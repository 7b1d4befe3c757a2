"""Jobs with one mistake of the catalogue in them, and what tells the right explanation."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from adjust import Job
from adjust.arrays import FloatArray
from adjust.blunders import Cell, Context, Explanation
from adjust.job import Control
from adjust.simulate import NETWORKS, Truth, observe, true_geometry
from tests import planting
from tests.planting import (
    CONSTANTS,
    HEIGHTS,
    Booked,
    Cells,
    Spoiler,
    book,
    read,
    spoil_digit,
    spoil_group,
    spoil_neighbours,
    with_row,
)
from tests.suspects import suspect_control, suspect_group, suspect_row

START_SD = 0.3
"""Metres: start coordinates are so far off."""
DETECTABLE = 4.13
"""Sds of the estimated error that are found with a power of 0.80 at 0.001: Baarda's minimal detectable bias (1968)."""
LEAST = 1.5 * DETECTABLE
"""Sds of its estimated error that a planted mistake makes at least: 1.5 × the minimal detectable bias."""
WITHIN = 4.0
"""Sds within which a corrected entry has to agree with the truth."""

SHAPES = {
    "direction": ("traverses", "triangulation", "total station, plane", "mixed"),
    "horizontal_distance": ("traverses", "triangulation", "mixed"),
    "slope_distance": ("total station, plane", "total station, ellipsoid", "mixed"),
    "zenith": ("total station, plane", "total station, ellipsoid", "mixed"),
    "height_difference": ("levelling", "mixed"),
    "vector": ("GNSS", "mixed"),
    "angle": ("mixed",),
    "azimuth": ("mixed",),
}
"""Shapes of network that have each kind."""
ANGLES = ("direction", "angle", "azimuth", "zenith")
DISTANCES = ("slope_distance", "horizontal_distance")
SIGHTS = ("zenith", "slope_distance")


@dataclass(frozen=True)
class Case:
    """A job with one mistake, as the catalogue is told of it. `right` tells whether an explanation names what was done
    and would put it right; `error` is the planted one in sds of the estimated error."""

    job: Job
    context: Context
    right: Callable[[Explanation], bool]

    @property
    def size(self) -> float:
        """The estimated error in its own sds."""
        error, covariance = self.context.estimated_error, self.context.error_covariance
        return float(np.sqrt(error @ np.linalg.solve(covariance, error)))


@dataclass(frozen=True)
class Plant:
    """One line of the study: a mistake by its name in the table of priors, where it was made, and how."""

    mistake: str
    where: str
    make: Callable[[np.random.Generator], Case | None]

    def cases(self, count: int, seed: int) -> Iterator[Case]:
        """So many jobs in which the mistake is at least 1.5 times as large as its minimal detectable bias."""
        for number in range(count):
            generator = np.random.default_rng([seed, number, *self.mistake.encode(), *self.where.encode()])
            yield self._case(generator)

    def _case(self, generator: np.random.Generator) -> Case:
        while True:
            case = self.make(generator)
            if case is not None and case.size >= LEAST:
                return case


def some_row(
    kinds: Sequence[str], generator: np.random.Generator, constants: dict[str, float] | None = None
) -> tuple[Booked, Truth]:
    """A row of one of these kinds in a job of a shape that has it."""
    kind = str(generator.choice(kinds))
    plan = NETWORKS[str(generator.choice(SHAPES[kind]))](generator)
    if constants is not None:
        plan = replace(plan, target_constants=constants)
    job, truth = observe(plan, generator, start_sd=START_SD)
    place = [rows.kind for rows in job.observations].index(kind)
    return book(plan, job, place, int(generator.integers(len(job.observations[place]))), generator), truth


def in_a_row(
    mistake: str, spoil: Spoiler, kinds: Sequence[str], constants: dict[str, float] | None = None
) -> Callable[[np.random.Generator], Case | None]:
    """Plant a mistake in the cells of one row."""

    def make(generator: np.random.Generator) -> Case | None:
        booked, truth = some_row(kinds, generator, constants)
        wrong = spoil(booked, generator)
        if wrong is None:
            return None
        job = with_row(booked, read(booked, wrong))
        context = suspect_row(job, booked.place, booked.row, wrong)
        if context is None:
            return None
        return Case(job, context, lambda told: mistake in told.names and restored(booked, truth, wrong, told))

    return make


def restored(booked: Booked, truth: Truth, wrong: Cells, told: Explanation) -> bool:
    """Whether the row with the corrections agrees with the truth."""
    names = {cell.title: name for name, cell in {**wrong, **booked.cells}.items()}
    cells = dict(wrong)
    for correction in told.corrections:
        if correction.title not in names:
            return True  # a value that belongs into the column of another kind: the name says it all
        cells[names[correction.title]] = Cell(correction.title, correction.text)
    row, geometry = read(booked, cells), true_geometry(booked.plan)
    away = row.observed - row.predict(geometry)
    if row.setup is not None:
        away = away + truth.orientations[row.setup][:, None]
    if row.unit == "rad":
        away = away - 2 * np.pi * np.round(away / (2 * np.pi))
    return bool(away[0] @ np.linalg.solve(row.covariance(geometry)[0], away[0]) <= WITHIN**2)


def in_control(mistake: str, spoil: Callable[[Cells, np.random.Generator], Cells]) -> Callable[..., Case | None]:
    """Plant a mistake in the coordinates of a fixed mark, published to the millimetre."""

    def make(generator: np.random.Generator) -> Case | None:
        plan = NETWORKS[str(generator.choice(["traverses", "triangulation"]))](generator)
        plan = replace(plan, marks=replace(plan.marks, given=plan.marks.given.round(3)))
        job, _ = observe(plan, generator, start_sd=START_SD)
        mark = int(generator.choice(np.flatnonzero(job.marks.control[:, 0] == Control.FIXED)))
        plane = ("easting", "northing")
        cells: Cells = {
            name: Cell(f"{name}_m", f"{value:.3f}")
            for name, value in zip(plane, job.marks.given[mark, :2].tolist(), strict=True)
        }
        wrong = spoil(cells, generator)
        given = job.marks.given.copy()
        given[mark, :2] = [float(wrong[name].text) for name in plane]
        job = replace(job, marks=replace(job.marks, given=given))
        context = suspect_control(job, mark, plan.marks.given[mark] + START_SD, wrong)
        if context is None:
            return None
        return Case(job, context, lambda told: mistake in told.names and _put_right(wrong, told) == cells)

    return make


def _put_right(wrong: Cells, told: Explanation) -> Cells:
    names = {cell.title: name for name, cell in wrong.items()}
    return wrong | {names[entry.title]: Cell(entry.title, entry.text) for entry in told.corrections}


def coordinate_spoiled(spoil: Callable[[str, np.random.Generator], str]) -> Callable[..., Cells]:
    """One of two coordinates with its digits spoiled."""

    def spoiled(cells: Cells, generator: np.random.Generator) -> Cells:
        name = str(generator.choice(list(cells)))
        return planting.retold(cells, name, spoil(cells[name].text, generator))

    return spoiled


def axes_exchanged(cells: Cells, generator: np.random.Generator) -> Cells:
    """Easting and northing changed over."""
    first, second = cells
    return planting.retold(planting.retold(cells, first, cells[second].text), second, cells[first].text)


def of_a_setup(mistake: str, text_of: Callable[[Booked, int, np.random.Generator], str]) -> Callable[..., Case | None]:
    """Plant a mistake in a height that all sights of a setup, or to a target, share."""

    def make(generator: np.random.Generator) -> Case | None:
        booked, _ = some_row(("zenith",), generator)
        role = int(generator.integers(2))
        if not booked.cells[HEIGHTS[role]].title.endswith("_m"):
            return None
        height = float(booked.itself.heights[0, role])
        job, cells = spoil_group(booked, role, text_of(booked, role, generator))
        nature = HEIGHTS[role].replace("_", " ")
        context = suspect_group(job, nature, booked.place, booked.row, cells)
        if context is None:
            return None
        sd = float(np.sqrt(context.error_covariance[0, 0]))

        def right(told: Explanation) -> bool:
            value = told.corrected_value
            return mistake in told.names and value is not None and abs(value[0] - height) <= WITHIN * sd

        return Case(job, context, right)

    return make


def other_setups_height(booked: Booked, role: int, generator: np.random.Generator) -> str:
    """The height of another setup, as the book writes it."""
    heights: FloatArray = booked.job.observations[booked.place].heights[:, role]  # type: ignore[attr-defined]
    others = heights[np.abs(heights - heights[booked.row]) > 1e-6]
    return f"{float(generator.choice(others)):.3f}"


def spoiled_height(booked: Booked, role: int, generator: np.random.Generator) -> str:
    """The height with two digits changed over."""
    return spoil_neighbours(booked.cells[HEIGHTS[role]].text, generator)


def of_all_distances(generator: np.random.Generator) -> Case | None:
    """The constant of a target wrong in all distances of a file."""
    booked, _ = some_row(DISTANCES, generator, CONSTANTS)
    used, right = generator.permutation(list(CONSTANTS.values()))
    change = float(generator.choice([-right, used - right, right], p=np.array([5.0, 3.0, 1.0]) / 9.0))
    kinds = tuple(
        replace(rows, observed=rows.observed + change) if rows.table == "distances" else rows
        for rows in booked.job.observations
    )
    job = replace(booked.job, observations=kinds)
    context = suspect_group(job, "distance constant", booked.place, booked.row, booked.cells)
    if context is None:
        return None
    return Case(job, context, lambda told: "target constant" in told.names and told.w_after <= WITHIN)


BOOKED: tuple[Plant, ...] = (
    *(
        Plant(mistake, where, in_a_row(mistake, spoil, kinds))
        for mistake, where, spoil, kinds in (
            ("digits exchanged", "a row", planting.digits_exchanged, tuple(SHAPES)),
            ("digit misread", "a row", planting.digit_misread, tuple(SHAPES)),
            ("whole angle miscounted", "a row", planting.whole_angle, ANGLES),
            ("other face", "a row", planting.other_face, ("direction", "angle", "azimuth")),
            ("circle counted otherwise", "a row", planting.counted_otherwise, ("direction", "azimuth", "zenith")),
            ("back and fore exchanged", "a row", planting.back_and_fore, ("angle",)),
            ("degrees and gon", "a row", planting.degrees_and_gon, ANGLES),
            ("metres and feet", "a row", planting.metres_and_feet, (*DISTANCES, "height_difference", "vector")),
            ("dropped tape or whole metres", "a row", planting.dropped_tape, DISTANCES),
            ("slope as horizontal", "a row", planting.slope_as_horizontal, ("slope_distance",)),
            ("sign", "a row", planting.sign, ("height_difference", "vector")),
            ("staff misread", "a row", planting.staff_misread, ("height_difference",)),
            ("from and to exchanged", "a row", planting.ends_exchanged, ("height_difference", "vector", "azimuth")),
            ("height missing", "a row", planting.height_missing, SIGHTS),
            ("heights exchanged", "a row", planting.heights_exchanged, SIGHTS),
            ("height of another setup", "a row", planting.height_of_another_setup, SIGHTS),
            ("another mark", "a row", planting.another_mark, tuple(SHAPES)),
            ("antenna height", "a row", planting.antenna_height, ("vector",)),
        )
    ),
    Plant("target constant", "a row", in_a_row("target constant", planting.target_constant, DISTANCES, CONSTANTS)),
    Plant("target constant", "all distances of a file", of_all_distances),
    Plant("height missing", "a setup", of_a_setup("height missing", lambda booked, role, generator: "")),
    Plant("height of another setup", "a setup", of_a_setup("height of another setup", other_setups_height)),
    Plant("digits exchanged", "a setup's height", of_a_setup("digits exchanged", spoiled_height)),
    Plant("digits exchanged", "control", in_control("digits exchanged", coordinate_spoiled(spoil_neighbours))),
    Plant("digit misread", "control", in_control("digit misread", coordinate_spoiled(spoil_digit))),
    Plant("axes exchanged", "control", in_control("axes exchanged", axes_exchanged)),
)
"""Every mistake that can be made in tables of observations and of marks; those of raw readings are in `planted_raw`."""

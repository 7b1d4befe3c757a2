"""Mistakes in raw books: the weather of distances, the staffs of a level book. Each job goes through a folder."""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np

from adjust import Job, read_job
from adjust.blunders import Hypothesis
from adjust.blunders.cells import cells_of
from adjust.field_book.cells import Style
from adjust.field_book.writing import JobFolder, describe_job
from adjust.frames import PlaneFrame
from adjust.simulate import Equipment, assemble, levelling_net, observe, place_marks, triangulated_grid
from adjust.simulate.networks import PLANE_ORIGIN
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_levels import LevelHabits, level_book_table
from adjust.simulate.raw_pointings import Habits
from tests.studies.planted import WITHIN, Case, Plant
from tests.suspects import suspect_group, suspect_row

SPACING = 1000.0
"""Metres between marks: far enough for the air to matter."""
SHOWN = Style({"backsight": 4, "foresight": 4, "backsight_distance": 1, "foresight_distance": 1})
"""Decimals of a level book."""


def wide_plan(generator: np.random.Generator) -> Job:
    """Rounds, zenith angles and slope distances over kilometres."""
    layout = triangulated_grid(3, 4, generator, spacing=SPACING)
    marks = place_marks(layout.coordinates(PlaneFrame(), PLANE_ORIGIN), fixed=(0, len(layout) - 1))
    sights, equipment = layout.both_ways(), Equipment(distance_proportional=1e-6)
    heights = np.full((len(sights), 2), 1.6)
    outward = sights[:, 0] < sights[:, 1]
    kinds = [
        equipment.directions(sights),
        equipment.zenith_angles(sights, heights),
        equipment.slope_distances(sights[outward], heights[outward]),
    ]
    return assemble("Pointings", PlaneFrame(), marks, kinds)


def read_twice(folder: JobFolder, spoil: Callable[[JobFolder, Job], None]) -> tuple[Job, Job, Callable[..., tuple]]:
    """The sound and the spoiled job, and what reads cells of the spoiled one."""
    with tempfile.TemporaryDirectory() as name:
        folder.write(Path(name))
        sound = read_job(name)
        spoil(folder, sound)
        folder.write(Path(name))
        job = read_job(name)
        rows = [
            Hypothesis("observation", "", ((place, np.array([row])),), ("",), "m")
            for place, kind in enumerate(job.observations)
            if kind.unit == "m"
            for row in range(len(kind))
        ]
        cells = dict(zip([(h.rows[0][0], int(h.rows[0][1][0])) for h in rows], cells_of(job, rows, name), strict=True))
    return sound, job, cells.__getitem__


def air_of_all_sights(generator: np.random.Generator) -> Case | None:
    """Every distance of a book corrected in the instrument and again from the book."""
    raw = read_by_a_party(wide_plan(generator), generator, Habits(rounds=1, missing=0.0))

    def spoil(folder: JobFolder, sound: Job) -> None:
        assert sound.reduction.pointings is not None
        slopes = sound.reduction.pointings.slopes.means.provenance
        for row, velocity in enumerate(sound.reduction.pointings.velocity.tolist()):
            for line in (slopes.line[row], *(() if slopes.further is None else slopes.further[row])):
                times(folder, int(line) - 2, velocity)

    _, job, cells = read_twice(raw.folder, spoil)
    place = [rows.kind for rows in job.observations].index("slope_distance")
    context = suspect_group(job, "distance scale", place, 0, cells((place, 0))[0])
    return None if context is None else Case(job, context, lambda told: "weather correction" in told.names)


def times(folder: JobFolder, row: int, factor: float) -> None:
    """Multiply one distance of the pointings."""
    cells = folder.tables["pointings"]["slope_m"]
    cells[row] = f"{float(cells[row]) * factor:.4f}"


def staff_of_a_level_book(generator: np.random.Generator) -> Case | None:
    """One reading of one staff a decimetre or a metre off."""
    plan = levelling_net(generator)
    known, _ = observe(plan, generator)
    folder = describe_job(replace(known, observations=()))
    folder.tables["level_book"] = level_book_table(plan, LevelHabits(collimation=0.0), generator, SHOWN)
    folder.job_file["defaults"] = {"levels_instrument": "NA2"}
    folder.job_file["instruments"] = {"NA2": {"level_mm_per_sqrt_km": 0.7}}
    step = float(generator.choice([0.1, 1.0]) * generator.choice([-1, 1]))
    spoiled: list[int] = []

    def spoil(folder: JobFolder, sound: Job) -> None:
        column = folder.tables["level_book"][f"{generator.choice(['backsight', 'foresight'])}_m"]
        read = [row for row, text in enumerate(column) if text and float(text) + step > 0]
        spoiled.append(int(generator.choice(read)))
        column[spoiled[0]] = f"{float(column[spoiled[0]]) + step:.4f}"

    sound, job, cells = read_twice(folder, spoil)
    before, after = (rows.observations[0].observed[:, 0] for rows in (sound, job))
    row = int(np.argmax(np.abs(after - before)))
    first, *further = cells((0, row))
    context = suspect_row(job, 0, row, first, tuple(further))
    if context is None:
        return None

    def right(told: object) -> bool:
        value = told.corrected_value  # type: ignore[attr-defined]
        sd = np.sqrt(context.error_covariance[0, 0])
        return "staff misread" in told.names and abs(value[0] - before[row]) <= WITHIN * sd  # type: ignore[attr-defined]

    return Case(job, context, right)


RAW: tuple[Plant, ...] = (
    Plant("weather correction", "all pointings", air_of_all_sights),
    Plant("staff misread", "a level book", staff_of_a_level_book),
)

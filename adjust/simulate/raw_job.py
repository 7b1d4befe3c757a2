"""A plan observed as a raw job folder: the books as a party brings them home."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.field_book.cells import EXACT, Style
from adjust.field_book.writing import JobFolder, describe_job
from adjust.job import Job
from adjust.observations import Directions, HeightDifferences, SlopeDistances, ZenithAngles
from adjust.simulate.observing import observe
from adjust.simulate.raw_levels import LevelHabits, level_book_table
from adjust.simulate.raw_pointings import (
    REFERENCE_INDEX,
    SCALE,
    TARGET_CONSTANT,
    WAVELENGTH,
    Habits,
    Sights,
    pointings_table,
)
from adjust.units import ARCSEC

TARGET = "prism"


@dataclass(frozen=True)
class RawJob:
    """A folder to be written, and the true values behind its pointings."""

    folder: JobFolder
    sights: Sights


def read_by_a_party(
    plan: Job,
    generator: np.random.Generator,
    habits: Habits | None = None,
    level_habits: LevelHabits | None = None,
    style: Style = EXACT,
    *,
    states_errors: bool = True,
) -> RawJob:
    """The raw job of a plan of rounds, zenith angles, slope distances and levels; other kinds are left out.

    `states_errors` puts collimation and index error into the job file; without it they have to come from the pairs.
    Control is as the plan's marks give it, free marks have no coordinates. Instruments are exactly centred.
    """
    habits, level_habits = habits or Habits(), level_habits or LevelHabits()
    known, _ = observe(plan, generator)
    pointings, sights = pointings_table(plan, habits, generator, style)
    folder = describe_job(replace(known, observations=()), style)
    folder.tables["pointings"] = pointings
    if any(isinstance(rows, HeightDifferences) for rows in plan.observations):
        folder.tables["level_book"] = level_book_table(plan, level_habits, generator, style)
    folder.job_file["defaults"] = {"instrument": "TS1", "levels_instrument": "NA2", "target": TARGET}
    folder.job_file["instruments"] = {
        "TS1": _total_station(plan, habits, states_errors=states_errors),
        "NA2": {
            "level_mm_per_sqrt_km": _key(level_habits.sd_per_root_metre * np.sqrt(1000.0) * 1000.0),
            "level_collimation_arcsec": _key(level_habits.collimation / ARCSEC),
        },
    }
    folder.job_file["targets"] = {TARGET: {"constant_mm": _key(TARGET_CONSTANT * 1000.0)}}
    return RawJob(folder, sights)


def _total_station(plan: Job, habits: Habits, *, states_errors: bool) -> dict[str, float]:
    """The keys of the total station, from the precision of the plan's rows and the party's habits."""
    keys: dict[str, float] = {}
    for rows in plan.observations:
        if isinstance(rows, Directions):
            keys["direction_arcsec"] = _key(rows.precision.constant[0] / ARCSEC)
        elif isinstance(rows, ZenithAngles):
            keys["zenith_arcsec"] = _key(rows.precision.constant[0] / ARCSEC)
        elif isinstance(rows, SlopeDistances):
            keys["distance_mm"] = _key(rows.precision.constant[0] * 1e3)
            keys["distance_ppm"] = _key(rows.precision.proportional[0] * 1e6)
    if states_errors:
        keys |= {"collimation_arcsec": _key(habits.collimation / ARCSEC), "index_arcsec": _key(habits.index / ARCSEC)}
    light = {
        "edm_wavelength_nm": WAVELENGTH * 1e9,
        "edm_reference_index": REFERENCE_INDEX,
        "edm_scale_ppm": SCALE * 1e6,
    }
    return keys | {key: _key(value) for key, value in light.items()}


def _key(value: float) -> float:
    """A figure of the job file, without the last digits that conversion of units leaves."""
    return round(float(value), 10)

"""Levelling an invented network: staff readings from turning point to turning point, sights not all of one length."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.field_book.cells import EXACT, Style, Table
from adjust.job import Job
from adjust.observations import HeightDifferences
from adjust.simulate.observing import true_geometry
from adjust.units import ARCSEC

LOWEST, HIGHEST = 0.3, 2.9
"""Staff readings, metres, between which the line of sight is kept."""
MIDDLE = (LOWEST + HIGHEST) / 2


@dataclass(frozen=True)
class LevelHabits:
    """How a party levels, metres and radians: usual length of a sight, by how much the two of a setup differ (1σ), and
    by how much the line of sight rises."""

    sight: float = 35.0
    imbalance: float = 6.0
    collimation: float = 8.0 * ARCSEC
    sd_per_root_metre: float = 0.0007 / np.sqrt(1000.0)


@dataclass
class _Page:
    """The book as it fills, row by row."""

    line: list[str]
    point: list[str]
    readings: list[tuple[float, float, float, float, float]]
    """Backsight, intermediate, foresight, backsight distance, foresight distance."""

    def add(self, line: str, point: str, *readings: float) -> None:
        self.line.append(line)
        self.point.append(point)
        self.readings.append((readings[0], readings[1], readings[2], readings[3], readings[4]))


def level_book_table(plan: Job, habits: LevelHabits, generator: np.random.Generator, style: Style = EXACT) -> Table:
    """The book of a plan's height differences: each one a line of its own, through turning points.

    `precision.constant` or the sd stated with each row is not used: readings scatter so that a section of L metres has
    `sd_per_root_metre` · √L. A line has the length that its stated sd stands for.
    """
    page = _Page([], [], [])
    geometry = true_geometry(plan)
    for rows in plan.observations:
        if isinstance(rows, HeightDifferences):
            sd = np.sqrt(rows.covariance(geometry)[:, 0, 0])
            for number, (marks, rise) in enumerate(zip(rows.marks, rows.predict(geometry)[:, 0], strict=True), 1):
                names = tuple(plan.marks.names[mark] for mark in marks)
                length = float(sd[number - 1] / habits.sd_per_root_metre) ** 2
                _walk(page, f"L{number}", (names[0], names[1]), float(rise), length, habits, generator)
    table: Table = {"line": page.line, "point": page.point}
    columns = np.array(page.readings).T
    for name, values in zip(
        ("backsight", "intermediate", "foresight", "backsight_distance", "foresight_distance"), columns, strict=True
    ):
        table |= style.length(name, values)
    return {title: cells for title, cells in table.items() if any(cells)}


def _walk(
    page: _Page,
    line: str,
    marks: tuple[str, str],
    rise: float,
    length: float,
    habits: LevelHabits,
    generator: np.random.Generator,
) -> None:
    """One line: as many setups as its length asks for and its rise allows."""
    setups = max(int(np.ceil(length / (2 * habits.sight))), int(np.ceil(abs(rise) / (HIGHEST - LOWEST) * 1.2)), 1)
    sights = _sights(length, setups, habits, generator)
    readings = _readings(rise, setups, generator)
    scatter = habits.sd_per_root_metre * np.sqrt(sights)
    seen = readings + habits.collimation * sights + generator.normal(0.0, scatter)
    none = np.nan
    page.add(line, marks[0], seen[0, 0], none, none, sights[0, 0], none)
    for setup in range(1, setups):
        page.add(line, f"TP{setup}", seen[setup, 0], none, seen[setup - 1, 1], sights[setup, 0], sights[setup - 1, 1])
    page.add(line, marks[1], none, none, seen[-1, 1], none, sights[-1, 1])


def _sights(length: float, setups: int, habits: LevelHabits, generator: np.random.Generator) -> FloatArray:
    """Lengths of the sights (setups, 2), paced to the decimetre, that add up to about the length of the line."""
    usual = length / (2 * setups)
    spread = generator.normal(0.0, habits.imbalance, (setups, 2)) * min(1.0, usual / habits.sight)
    return np.clip(usual + spread, 2.0, None).round(1).astype(np.float64)


def _readings(rise: float, setups: int, generator: np.random.Generator) -> FloatArray:
    """True staff readings (setups, 2), back and ahead, whose differences add up to the rise."""
    share = generator.normal(0.0, 0.15, setups)
    rises = rise / setups + share - share.mean()
    lift = generator.normal(0.0, 0.1, setups)
    return np.column_stack([MIDDLE + rises / 2 + lift, MIDDLE - rises / 2 + lift])

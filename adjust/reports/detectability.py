"""What a blunder would have to be to show at all: kind by kind, and where the least is seen."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.adjustment import Adjustment
from adjust.observations import KIND_NAMES
from adjust.quality import LEAST_REDUNDANCY
from adjust.reports.check_words import by_file
from adjust.reports.layout import Column, paragraph, table
from adjust.reports.records import MILLIMETRES, Record, number
from adjust.reports.wording import ARCSECONDS, counted, decimals
from adjust.residuals import Residuals

WORST = 3
"""Observations of each kind that are named, those in which the largest errors stay unseen."""
NAMED = 8
"""Observations without any check that are named."""


@dataclass(frozen=True)
class Detectability:
    """One kind: how many scalars it has and how many nothing checks; of the others the median and the `largest` of the
    smallest errors that show, in metres or degrees, and the sources of the largest ones, largest first."""

    kind: str
    unit: str
    observations: int
    unchecked: int
    median: float | None
    largest: float | None
    worst: tuple[str, ...]

    def record(self) -> Record:
        """For programs."""
        return {
            "kind": self.kind,
            "unit": self.unit,
            "observations": self.observations,
            "unchecked": self.unchecked,
            "median": self.median,
            "largest": self.largest,
            "worst": list(self.worst),
        }


def detectability(adjustment: Adjustment) -> list[Detectability]:
    """All kinds, in the order of the registry."""
    return list(map(_of_kind, adjustment.residuals))


def _of_kind(residuals: Residuals) -> Detectability:
    observations = residuals.observations
    biases = residuals.minimal_detectable_bias
    if observations.unit == "rad":
        biases = np.degrees(biases)
    checked = np.isfinite(biases) & (residuals.redundancy >= LEAST_REDUNDANCY)
    sizes = np.where(checked, biases, -np.inf).max(axis=1)
    order = np.argsort(-sizes, kind="stable")[:WORST]
    worst = [observations.provenance.label(int(row)) for row in order if sizes[row] > -np.inf]
    seen = biases[checked]
    return Detectability(
        kind=observations.kind,
        unit="deg" if observations.unit == "rad" else "m",
        observations=biases.size,
        unchecked=int(np.count_nonzero(~checked)),
        median=number(float(np.median(seen))) if seen.size else None,
        largest=number(float(seen.max())) if seen.size else None,
        worst=tuple(dict.fromkeys(worst)),
    )


def unchecked_words(unchecked: tuple[str, ...]) -> str:
    """One sentence about the observations with no check at all."""
    if not unchecked:
        return "Every observation is checked by others."
    more = f" and {len(unchecked) - NAMED} more" if len(unchecked) > NAMED else ""
    those = counted(len(unchecked), "observation", "observations")
    return f"Nothing checks {those}, a blunder there goes unseen: {by_file(unchecked[:NAMED])}{more}."


def detectability_lines(adjustment: Adjustment, kinds: list[Detectability]) -> list[str]:
    """A table of the kinds."""
    power = 100 * adjustment.job.statistics.power
    columns = (
        Column("smallest error that shows in", text=True),
        Column("number"),
        Column("unchecked"),
        Column("median"),
        Column("largest"),
        Column("", text=True),
        Column("largest in", text=True),
    )
    note = f"Errors of that size are found {power:g} times in 100; smaller ones may hide."
    return [*table(columns, list(map(_cells, kinds))), *paragraph(note)]


def _cells(kind: Detectability) -> list[str]:
    scale, unit = (MILLIMETRES, "mm") if kind.unit == "m" else (ARCSECONDS, '"')
    sizes = [decimals(None if size is None else size * scale, 2) or "–" for size in (kind.median, kind.largest)]
    counts = [str(kind.observations), str(kind.unchecked)]
    return [KIND_NAMES[kind.kind][1], *counts, *sizes, unit, by_file(kind.worst)]

"""The words of a check: what each closure is called, the marks it walks, its misclosure and what it was allowed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from adjust.network.closures.check import Check
from adjust.network.closures.closures import Judged
from adjust.network.closures.suspicion import Suspicion
from adjust.reports.records import MILLIMETRES
from adjust.reports.wording import SHORT_NAMES, counted
from adjust.units import ARCSEC

NAMES = {
    "half_round": ("half-round back on its first target", "half-rounds back on their first targets"),
    "collimation": ("pair of faces of a direction", "pairs of faces of directions"),
    "vertical_index": ("pair of faces of a zenith angle", "pairs of faces of zenith angles"),
    "direction_reading": ("reading of the horizontal circle", "readings of the horizontal circle"),
    "zenith_reading": ("reading of the vertical circle", "readings of the vertical circle"),
    "distance_reading": ("reading of a distance", "readings of distances"),
    "level_runs": ("forward and backward run", "forward and backward runs"),
    "level_loop": ("level loop", "level loops"),
    "level_line": ("level line between benchmarks", "level lines between benchmarks"),
    "horizon": ("horizon closure", "horizon closures"),
    "repeated_angle": ("angle observed again", "angles observed again"),
    "orientation": ("angle between control marks", "angles between control marks"),
    "triangle": ("triangle", "triangles"),
    "quadrilateral": ("quadrilateral", "quadrilaterals"),
    "angle_sum": ("larger figure of angles", "larger figures of angles"),
    "azimuth_link": ("azimuth carried to a known direction", "azimuths carried to a known direction"),
    "traverse_loop": ("closed traverse", "closed traverses"),
    "traverse_link": ("traverse between control marks", "traverses between control marks"),
    "control_distance": ("distance between control marks", "distances between control marks"),
    "distance_repeats": ("distance measured again", "distances measured again"),
    "reciprocal_zenith": ("pair of reciprocal zenith angles", "pairs of reciprocal zenith angles"),
    "zenith_repeats": ("zenith angle observed again", "zenith angles observed again"),
    "height_loop": ("loop with trigonometric heights", "loops with trigonometric heights"),
    "vector_repeats": ("repeated vector", "repeated vectors"),
    "vector_loop": ("vector loop", "vector loops"),
    "vector_line": ("vector line between control marks", "vector lines between control marks"),
}
"""Of each check: one closure, and many."""

WALKED = 7
"""Marks of a walk that are named; of a longer one the first ones and the last."""
NAMED = 3
"""Observations named in one sentence of those that nothing tells apart; check.json names all."""


@dataclass(frozen=True)
class Small:
    """How misclosures of a check are printed: `scale` times the SI value, with `places` decimals, in `unit`."""

    scale: float
    places: int
    unit: str


def small(judged: Judged) -> Small:
    """Millimetres or seconds of arc."""
    return Small(MILLIMETRES, 1, "mm") if judged.closures.unit == "m" else Small(1.0 / ARCSEC, 1, '"')


def walk(check: Check, judged: Judged, closure: int) -> str:
    """`A–B–C–A`; long ones with their middle left out."""
    names = [check.job.marks.names[mark] for mark in judged.closures.marks[closure].tolist()]
    if len(names) <= WALKED:
        return "–".join(names)
    return f"{'–'.join(names[: WALKED - 2])}–…–{names[-1]} ({len(names)} marks)"


def observations(check: Check, rows: Sequence[int]) -> list[str]:
    """`levels.csv:3`, … of observations by their numbers."""
    return [check.observed.source(row) for row in rows]


def by_file(sources: Sequence[str]) -> str:
    """`levels.csv:3, 7; zeniths.csv:2`: file by file, in the order given."""
    lines: dict[str, list[str]] = {}
    for source in sources:
        file, _, line = source.rpartition(":")
        lines.setdefault(file, []).append(line)
    return "; ".join(f"{file}:{', '.join(numbers)}" for file, numbers in lines.items())


def rests_on(check: Check, judged: Judged, closure: int) -> list[str]:
    """The lines of the field book that a closure rests on."""
    closures = judged.closures
    return [closures.sources[closure]] if closures.sources else observations(check, closures.rows[closure].tolist())


def described(check: Check, row: int) -> str:
    """`rise A → B (levels.csv:3)`."""
    observed = check.observed
    kind = observed.kind(row)
    names = [check.job.marks.names[mark] for mark in observed.marks(row)]
    between = f"{names[0]}: {names[1]} → {names[2]}" if len(names) == 3 else " → ".join(names)
    return f"{SHORT_NAMES.get(kind, kind)} {between} ({observed.source(row)})"


def suspected(check: Check, suspicion: Suspicion, most: int = NAMED) -> str:
    """What a suspicion names, at most so many of what nothing tells apart."""
    control = [f"the given coordinates of {check.job.marks.names[mark]}" for mark in suspicion.marks]
    every = [*(described(check, row) for row in suspicion.rows[:most]), *control]
    left = len(suspicion.rows) + len(control) - most
    return " or ".join(every[:most]) + (f" or {left} more" if left > 0 else "")


def check_verdict(check: Check) -> str:
    """One or two sentences: whether everything closes, and what to look at first."""
    closures = sum(len(judged.closures) for judged in check.closures)
    odd = sum(remark.exceeds for remark in check.remarks)
    if not closures and not odd:
        return "Nothing closes in this job, so that no mistake would show before it is adjusted."
    if check.passed:
        every = f"All {closures} closures keep" if closures > 1 else "The one closure keeps"
        return f"{every} within what is allowed."
    failing = sum(int(judged.exceeds.sum()) for judged in check.closures)
    parts = [f"{failing} of {counted(closures, 'closure', 'closures')}"] if failing else []
    parts += [counted(odd, "other finding", "other findings")] if odd else []
    exceed = "exceeds" if failing + odd == 1 else "exceed"
    return f"{' and '.join(parts)} {exceed} what is allowed. {first_look(check)}".rstrip()


def first_look(check: Check) -> str:
    """What to look at first, in one sentence; "" where no closure fails."""
    if not check.suspicions:
        return ""
    first = check.suspicions[0]
    closures = counted(first.failing, "closure that exceeds rests", "closures that exceed rest")
    others = f", {counted(first.passing, 'other does', 'others do')} too" if first.passing else ", none of the others"
    return f"Look first at {suspected(check, first)}: {closures} on it{others}."


def rules_used(judged: Judged) -> list[str]:
    """The rules that some closure of a check was judged by."""
    return [str(judged.rules[rule]) for rule in np.unique(judged.rule).tolist()]

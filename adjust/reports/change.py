"""What changed from one adjustment of a job to the next: marks that moved, suspects that came and went."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray
from adjust.reports.layout import Column, table
from adjust.reports.records import MILLIMETRES, known_coordinates, records, scalar_figures
from adjust.reports.wording import between, counted, decimals, what
from adjust.unknowns import AXES

MOVED = 1e-5
"""Metres: the iteration's own standstill, below which two runs of the same data may differ."""

NAMED = 10
"""Marks or suspects that are named: enough to find the place, few enough to read."""

COLUMNS = (Column("mark", text=True), *(Column(axis, "mm") for axis in AXES))

Key = tuple[str | int | None, ...]


@dataclass(frozen=True)
class Change:
    """From one adjustment to the next.

    `moves` (m, 3) are metres east, north and up along the grid of the marks `moved`, farthest first; NaN for what
    either run does not have. Suspects are told in words with their place in the book. `comparable` is False where the
    two have different frames, so that nothing can be said of moves.
    """

    comparable: bool
    moved: tuple[str, ...]
    moves: FloatArray
    new_marks: tuple[str, ...]
    gone_marks: tuple[str, ...]
    new_suspects: tuple[str, ...]
    gone_suspects: tuple[str, ...]
    observations: tuple[int, int]
    statistics: tuple[float, float]
    """vᵀPv before and after."""


def change_between(before: Adjustment, after: Adjustment) -> Change:
    """What changed. A suspect stays the same one while its kind and its marks do, whatever its line in the book."""
    earlier, later = suspects_by_key(before), suspects_by_key(after)
    names, former = after.job.marks.index, before.job.marks.index
    comparable = before.job.frame == after.job.frame
    moved, moves = _moves(before, after) if comparable else ((), np.empty((0, 3)))
    return Change(
        comparable,
        moved,
        moves,
        tuple(name for name in names if name not in former),
        tuple(name for name in former if name not in names),
        tuple(words for key, words in later.items() if key not in earlier),
        tuple(words for key, words in earlier.items() if key not in later),
        (before.solution.observations, after.solution.observations),
        (before.solution.global_test.statistic, after.solution.global_test.statistic),
    )


def _moves(before: Adjustment, after: Adjustment) -> tuple[tuple[str, ...], FloatArray]:
    """Marks of both runs that moved, farthest first, and how."""
    common = [name for name in after.job.marks.names if name in before.job.marks.index]
    start = known_coordinates(before)[[before.job.marks.index[name] for name in common]]
    end = known_coordinates(after)[[after.job.marks.index[name] for name in common]]
    frame = after.job.frame
    steps = frame.displacement(start, end)
    turn = np.nan_to_num(frame.grid_rotation(end))
    east = steps[:, 0] * np.cos(turn) - steps[:, 1] * np.sin(turn)
    north = steps[:, 0] * np.sin(turn) + steps[:, 1] * np.cos(turn)
    along_grid = np.column_stack([east, north, steps[:, 2]])
    distance = np.sqrt(np.nansum(along_grid**2, axis=1))
    order = np.argsort(-distance, kind="stable")[: int(np.count_nonzero(distance > MOVED))]
    return tuple(common[row] for row in order.tolist()), along_grid[order]


def suspects_by_key(adjustment: Adjustment) -> dict[Key, str]:
    """Suspects in words, worst first, by what they observe: kind, marks, setup, and which of several such rows."""
    found: dict[str, tuple[Key, str]] = {}
    for tested in adjustment.residuals:
        rows = tested.observations
        for row in np.flatnonzero(tested.suspect.any(axis=1)).tolist():
            component = int(np.argmax(tested.suspect[row]))
            scalar = np.array([row * len(rows.components) + component])
            (record,) = records(scalar_figures(adjustment, tested, scalar))
            same = (rows.marks[:row] == rows.marks[row]).all(axis=1)
            if rows.setup is not None:
                same &= rows.setup[:row] == rows.setup[row]
            parts = [record[key] for key in ("kind", "component", "at", "from", "to", "setup")]
            words = f"{what(record)} {between(record)} ({record['source']})"
            found[record["source"]] = (*parts, int(np.count_nonzero(same))), words
    return dict(found[source] for source in adjustment.suspects)


def change_lines(change: Change) -> list[str]:
    """The change in sentences, the marks that moved first."""
    return list(_lines(change))


def _lines(change: Change) -> Iterator[str]:
    if not change.comparable:
        yield "The frame changed: coordinates cannot be compared with those of the last run."
    elif not change.moved:
        yield "No mark moved."
    else:
        yield f"{counted(len(change.moved), 'mark', 'marks')} moved, farthest first:"
        yield from table(COLUMNS, _move_rows(change))
        if len(change.moved) > NAMED:
            yield f"and {len(change.moved) - NAMED} more"
    for words, names in (
        ("New marks", change.new_marks),
        ("Marks gone", change.gone_marks),
        ("New suspects", change.new_suspects),
        ("No longer suspect", change.gone_suspects),
    ):
        if names:
            more = f" and {len(names) - NAMED} more" if len(names) > NAMED else ""
            yield f"{words}: {', '.join(names[:NAMED])}{more}."
    if change.observations[0] != change.observations[1]:
        yield f"Observations: {change.observations[0]}, now {change.observations[1]}."
    yield f"vᵀPv: {change.statistics[0]:.2f}, now {change.statistics[1]:.2f}."


def _move_rows(change: Change) -> list[list[str]]:
    pairs = zip(change.moved[:NAMED], change.moves.tolist(), strict=False)
    return [[name, *(decimals(MILLIMETRES * step, 2, signed=True) for step in move)] for name, move in pairs]

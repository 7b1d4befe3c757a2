"""Level loops, lines between benchmarks, and forward against backward runs."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.closures import Closures
from adjust.network.closures.differences import Differences, Loops, loops_of
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.observations import HeightDifferences
from adjust.tolerances import Quantity

UP = 2


def level_closures(observed: Observed) -> list[Closures]:
    """Runs between the same two marks against each other, then loops and lines of the runs' means.

    A misclosure is what the levelling arrives at minus what it ought to: the height it set out from for a loop, the
    height of the second benchmark for a line.
    """
    runs = levelled(observed)
    loops = height_loops(observed, runs.means(), observed.geometry.levelled_heights)
    closed = loops.closed
    whole = loop_closures("level_loop", loops, Quantity.LEVEL_LOOP)
    return [
        run_closures("level_runs", runs.repeats(), Quantity.LEVEL_RUNS),
        whole.take(closed),
        replace(whole.take(~closed), check="level_line"),
    ]


def levelled(observed: Observed) -> Differences:
    """Every levelled rise, with the length of its line as stated, else as the crow flies between its marks."""
    rows, numbers = observed.rows_of(HeightDifferences)
    if rows is None:
        return no_differences(1)
    straight = observed.geometry.level_distance(rows.marks[:, 0], rows.marks[:, 1])[0]
    return Differences(
        rows.marks,
        rows.observed,
        observed.sd[numbers][:, None, None] ** 2,
        np.where(np.isnan(rows.length), straight, rows.length),
        Ragged(numbers, np.arange(len(numbers) + 1)),
    )


def no_differences(components: int) -> Differences:
    """No edges at all."""
    nothing = np.empty((0, components))
    return Differences(
        np.empty((0, 2), dtype=np.int64), nothing, np.empty((0, components, components)), np.empty(0), Ragged.of([])
    )


def height_loops(observed: Observed, edges: Differences, heights: FloatArray) -> Loops:
    """Loops of rises and lines between marks whose heights are control; `heights` (n,) in the system of the rises."""
    known = np.where(observed.held[:, 1], heights, np.nan)[:, None]
    return loops_of(edges, len(known), known, observed.control_variance[:, UP:])


def loop_closures(check: str, loops: Loops, quantity: Quantity | None) -> Closures:
    """Loops of one component as closures."""
    return Closures(
        check,
        "m",
        loops.misclosure,
        sds(loops.covariance),
        loops.marks,
        loops.rows,
        loops.length,
        _none(loops.length),
        quantity,
    )


def run_closures(check: str, repeats: Differences, quantity: Quantity | None) -> Closures:
    """Repeated differences as closures: walked there and back."""
    there_and_back = np.column_stack([repeats.marks, repeats.marks[:, :1]])
    marks = Ragged(there_and_back.ravel(), np.arange(len(repeats) + 1) * 3)
    return Closures(
        check,
        "m",
        repeats.value,
        sds(repeats.covariance),
        marks,
        repeats.rows,
        repeats.length,
        _none(repeats.length),
        quantity,
    )


def sds(covariance: FloatArray) -> FloatArray:
    """Standard deviations (closures, components) of covariances (closures, components, components)."""
    variances: FloatArray = np.einsum("cii->ci", covariance)
    return np.sqrt(variances)


def _none(like: FloatArray) -> IntArray:
    return np.zeros(len(like), dtype=np.int64)

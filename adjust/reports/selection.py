"""Which rows a listing shows: all of a small job, the least certain ones of a large job."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Literal

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray, IntArray
from adjust.reports.records import Record, records, scalar_figures

Order = Literal["worst", "book"]


def tested(adjustment: Adjustment) -> FloatArray:
    """|w|, or |τ| on the posterior basis, of all scalars (k,) in the order of the records; −1 where there is none."""
    posterior = adjustment.solution.sd_basis == "posterior"
    figures = [np.abs(table.tau if posterior else table.w).ravel() for table in adjustment.residuals]
    together: FloatArray = np.nan_to_num(np.concatenate([np.empty(0), *figures]), nan=-1.0)
    return together


def worst_first(figures: FloatArray, most: int) -> IntArray:
    """Indices of the `most` largest figures, largest first; ties in their given order, NaN last."""
    sizes = np.nan_to_num(figures, nan=-np.inf)
    if most >= len(sizes):
        return np.argsort(-sizes, kind="stable")
    candidates = np.flatnonzero(sizes >= np.partition(sizes, -most)[-most])
    return candidates[np.argsort(-sizes[candidates], kind="stable")][:most]


def listed_observations(adjustment: Adjustment, order: Order, most: int) -> list[Record]:
    """The records to print: at most `most`, those that fit worst, worst first or as they stand in the book."""
    chosen = worst_first(tested(adjustment), most)
    in_book = np.sort(chosen)
    listed = list(_in_book_order(adjustment, in_book))
    if order == "book":
        return listed
    place = {scalar: position for position, scalar in enumerate(in_book.tolist())}
    return [listed[place[scalar]] for scalar in chosen.tolist()]


def _in_book_order(adjustment: Adjustment, scalars: IntArray) -> Iterator[Record]:
    first = 0
    for table in adjustment.residuals:
        size = table.residual.size
        here = scalars[(scalars >= first) & (scalars < first + size)]
        yield from records(scalar_figures(adjustment, table, here - first))
        first += size


def listed_marks(adjustment: Adjustment, most: int) -> IntArray:
    """At most `most` marks (m,) to print, in the book's order: those with the largest 95 % figures."""
    uncertainty = np.fmax(adjustment.horizontal_95, adjustment.height_95)
    return np.sort(worst_first(uncertainty, most))


def listed_lines(adjustment: Adjustment, most: int) -> IntArray:
    """At most `most` lines (m,) to print, least certain for their length first; without a plan last, by height sd."""
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = adjustment.line_ellipses.semi_major / adjustment.line_lengths
    heights = np.nan_to_num(adjustment.line_covariances[:, 2, 2], nan=-1.0)
    plan = np.nan_to_num(ratio, nan=-1.0, posinf=-1.0)
    order: IntArray = np.lexsort((np.arange(len(plan)), -heights, -plan))[:most]
    return order

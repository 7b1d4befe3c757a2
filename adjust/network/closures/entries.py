"""Rows entered twice, instrument and target heights that nobody sets up at, heights that differ within one sight."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.remarks import Remark
from adjust.observations import ControlCoordinates, Observations, SlopeDistances, ZenithAngles
from adjust.observations.sighted import HeightedSight
from adjust.tolerances import Tolerances

SAME_HEIGHT = 1e-4
"""Metres: heights are measured to the millimetre, so that a tenth of it is the same figure."""


def entry_remarks(observed: Observed, tolerances: Tolerances) -> list[Remark]:
    """Remarks on rows, in the order of the field book."""
    kinds = [(rows, observed.rows_of(type(rows))[1]) for rows in observed.job.observations]
    remarks = [remark for rows, numbers in kinds for remark in _entered_twice(observed, rows, numbers)]
    sighted = [(rows, numbers) for rows, numbers in kinds if isinstance(rows, HeightedSight)]
    for rows, numbers in sighted:
        remarks += _out_of_range(observed, rows, numbers, tolerances)
    return [*remarks, *_heights_that_differ(observed)]


def _entered_twice(observed: Observed, rows: Observations, numbers: IntArray) -> Iterator[Remark]:
    """Rows of one kind that agree in every figure."""
    if isinstance(rows, ControlCoordinates):
        return
    columns = [rows.marks, rows.observed]
    columns += [rows.setup[:, None]] if rows.setup is not None else []
    columns += [rows.heights] if isinstance(rows, HeightedSight) else []
    _, same = np.unique(np.hstack([column.astype(np.float64) for column in columns]), axis=0, return_inverse=True)
    groups = Ragged.grouped(same.ravel(), int(same.max()) + 1)
    for group in np.flatnonzero(groups.lengths > 1).tolist():
        found = numbers[groups[group]].tolist()
        sources = ", ".join(observed.source(number) for number in found)
        text = f"{sources}: the same figures; entered twice?"
        yield Remark("duplicate_rows", text, tuple(observed.marks(found[0])), tuple(found))


def _out_of_range(
    observed: Observed, rows: HeightedSight, numbers: IntArray, tolerances: Tolerances
) -> Iterator[Remark]:
    ranges = (("instrument", tolerances.instrument_heights), ("target", tolerances.target_heights))
    for end, (name, (lowest, highest)) in enumerate(ranges):
        heights = rows.heights[:, end]
        for row in np.flatnonzero((heights < lowest) | (heights > highest)).tolist():
            text = (
                f"{rows.provenance.label(row)}: {name} height {heights[row]:.3f} m, outside {lowest:g} … {highest:g} m"
            )
            yield Remark("height_range", text, tuple(rows.marks[row].tolist()), (int(numbers[row]),), exceeds=True)


def _heights_that_differ(observed: Observed) -> Iterator[Remark]:
    """A slope distance and a zenith angle of one sight, each the only one, with different heights."""
    slopes, slope_numbers = observed.rows_of(SlopeDistances)
    zeniths, zenith_numbers = observed.rows_of(ZenithAngles)
    if slopes is None or zeniths is None:
        return
    marks = len(observed.job.marks)
    slope_keys, slope_rows = _only(slopes.marks, marks)
    zenith_keys, zenith_rows = _only(zeniths.marks, marks)
    _, one, other = np.intersect1d(slope_keys, zenith_keys, return_indices=True)
    one, other = slope_rows[one], zenith_rows[other]
    apart = np.abs(slopes.heights[one] - zeniths.heights[other])
    for place in np.flatnonzero((apart > SAME_HEIGHT).any(axis=1)).tolist():
        slope, zenith = int(one[place]), int(other[place])
        text = (
            f"{slopes.provenance.label(slope)} and {zeniths.provenance.label(zenith)}: one sight with instrument and "
            f"target at {_heights(slopes.heights[slope])} and at {_heights(zeniths.heights[zenith])} m"
        )
        rows = (int(slope_numbers[slope]), int(zenith_numbers[zenith]))
        yield Remark("heights_differ", text, tuple(slopes.marks[slope].tolist()), rows)


def _only(pairs: IntArray, marks: int) -> tuple[IntArray, IntArray]:
    """Keys of pairs (rows, 2) that occur once, and their rows."""
    keys, first, count = np.unique(pairs @ np.array([marks, 1]), return_index=True, return_counts=True)
    return keys[count == 1], first[count == 1]


def _heights(heights: FloatArray) -> str:
    return f"{heights[0]:.3f} and {heights[1]:.3f}"

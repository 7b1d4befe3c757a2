"""Medians of repeated readings: one value for each group, unmoved by a single gross error among three."""

from __future__ import annotations

import numpy as np

from adjust.angles import wrapped
from adjust.arrays import FloatArray, IntArray


def group_medians(keys: IntArray, values: FloatArray) -> tuple[IntArray, FloatArray]:
    """The distinct keys (groups,), ascending, and the median of the values (rows,) of each."""
    groups, first, counts = np.unique(keys, return_index=True, return_counts=True)
    if len(groups) == len(keys):
        return groups, values[first]
    sorted_values = values[np.lexsort((values, keys))]
    starts = np.cumsum(counts) - counts
    lower, upper = starts + (counts - 1) // 2, starts + counts // 2
    return groups, 0.5 * (sorted_values[lower] + sorted_values[upper])


def group_circular_medians(keys: IntArray, angles: FloatArray) -> tuple[IntArray, FloatArray]:
    """As `group_medians`, for angles (rows,) in radians that repeat within half a turn of each other."""
    groups, first, group_of_row = np.unique(keys, return_index=True, return_inverse=True)
    reference = angles[first]
    medians = group_medians(keys, wrapped(angles - reference[group_of_row]))[1]
    return groups, wrapped(reference + medians)

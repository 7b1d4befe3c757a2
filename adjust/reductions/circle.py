"""Readings of a circle as numbers: differences across zero, and means of readings that belong together."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray, IntArray


def first_of_groups(group: IntArray, groups: int) -> IntArray:
    """The first row (groups,) of each group; `group` (rows,) numbers the groups, and none may be empty."""
    first = np.full(groups, len(group), dtype=np.int64)
    np.minimum.at(first, group, np.arange(len(group)))
    return first


def group_sums(values: FloatArray, group: IntArray, groups: int) -> FloatArray:
    """Sum (groups,) of the values (rows,) of each group."""
    sums: FloatArray = np.bincount(group, weights=values, minlength=groups).astype(np.float64)
    return sums


def number_groups(*keys: IntArray | FloatArray) -> tuple[IntArray, int]:
    """Number rows by equal keys (rows,), groups in the order in which they are met: (group of each row, how many)."""
    order = np.lexsort(keys[::-1])
    differs = np.zeros(len(order), dtype=bool)
    for key in keys:
        differs[1:] |= np.diff(key[order]) != 0
    sorted_group = np.cumsum(differs)
    group: IntArray = np.empty(len(order), dtype=np.int64)
    group[order] = sorted_group
    groups = int(sorted_group[-1]) + 1 if len(order) else 0
    place: IntArray = np.empty(groups, dtype=np.int64)
    place[np.argsort(first_of_groups(group, groups))] = np.arange(groups)
    return place[group], groups

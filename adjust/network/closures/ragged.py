"""Lists of different lengths as two arrays."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray


@dataclass(frozen=True)
class Ragged:
    """Lists of numbers, one after the other: list i is `values[starts[i] : starts[i + 1]]`."""

    values: IntArray
    starts: IntArray

    @classmethod
    def of(cls, lists: Sequence[Sequence[int]]) -> Ragged:
        """From lists of integers."""
        lengths = [len(entries) for entries in lists]
        total = sum(lengths)
        values = np.fromiter((value for entries in lists for value in entries), np.int64, total)
        return cls(values, np.concatenate([[0], np.cumsum(lengths, dtype=np.int64)]).astype(np.int64))

    @classmethod
    def grouped(cls, group: IntArray, groups: int) -> Ragged:
        """The places 0, 1, … of an array `group` (rows,) by the group they belong to, in order."""
        counts = np.bincount(group, minlength=groups)
        return cls(np.argsort(group, kind="stable"), np.concatenate([[0], np.cumsum(counts)]).astype(np.int64))

    def __len__(self) -> int:
        return len(self.starts) - 1

    def __getitem__(self, index: int) -> IntArray:
        return self.values[self.starts[index] : self.starts[index + 1]]

    @property
    def lengths(self) -> IntArray:
        """Entries of each list."""
        return np.diff(self.starts)

    @property
    def owner(self) -> IntArray:
        """The list (values,) that each value belongs to."""
        return np.repeat(np.arange(len(self)), self.lengths)

    def take(self, lists: IntArray) -> Ragged:
        """A choice of the lists, in the order given."""
        lengths = self.lengths[lists]
        starts = np.concatenate([[0], np.cumsum(lengths)]).astype(np.int64)
        shift = np.repeat(self.starts[lists] - starts[:-1], lengths)
        return Ragged(self.values[np.arange(starts[-1]) + shift], starts)

    def total(self, values: FloatArray) -> FloatArray:
        """Sums (lists, …) over each list of values that stand beside the entries (entries, …)."""
        result = np.zeros((len(self), *values.shape[1:]))
        np.add.at(result, self.owner, values)
        return result


def joined(parts: Sequence[Ragged]) -> Ragged:
    """The lists of several, one after the other."""
    values = np.concatenate([part.values for part in parts]) if parts else np.empty(0, dtype=np.int64)
    lengths = np.concatenate([part.lengths for part in parts]) if parts else np.empty(0, dtype=np.int64)
    return Ragged(values, np.concatenate([[0], np.cumsum(lengths)]).astype(np.int64))

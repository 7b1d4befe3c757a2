"""Sorts and runs of integers, by plain sorts of packed numbers: several times quicker than NumPy's stable ones."""

from __future__ import annotations

import numpy as np

from adjust.arrays import IntArray


def distinct(codes: IntArray) -> IntArray:
    """The distinct codes (none negative), rising."""
    codes = np.sort(codes)
    return codes[np.diff(codes, prepend=-1) > 0]


def rising(codes: IntArray) -> IntArray:
    """Indices that sort the codes, equal ones in their order; codes times their number must fit 63 bits."""
    count = len(codes)
    return np.sort(codes * count + np.arange(count)) % count if count else np.empty(0, dtype=np.int64)


def counted(sizes: IntArray) -> IntArray:
    """0, 1, 2, … within each of the runs of the given sizes, end to end."""
    end = np.cumsum(sizes)
    return np.arange(int(end[-1]) if len(end) else 0) - np.repeat(end - sizes, sizes)


def offsets_of(sizes: IntArray) -> IntArray:
    """Where runs of the given sizes start when laid end to end, and behind them where the last one ends."""
    return np.concatenate([np.zeros(1, dtype=np.int64), np.cumsum(sizes)])

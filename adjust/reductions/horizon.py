"""Closing the horizon: the first target sighted again at the end of a half-round."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.angles import wrapped
from adjust.arrays import FloatArray, IntArray
from adjust.reductions.circle import first_of_groups


@dataclass(frozen=True)
class HorizonClosures:
    """Half-rounds that came back to their first target: rows (closures,) of the `first` and the `last` sight to it, and
    the `misclosure` (closures,), last minus first reading, radians."""

    first: IntArray
    last: IntArray
    misclosure: FloatArray


def horizon_closures(reading: FloatArray, target: IntArray, half_round: IntArray, half_rounds: int) -> HorizonClosures:
    """Closures of the half-rounds numbered by `half_round` (rows,), none empty, from readings (rows,) in radians in the
    order in which they were taken. A half-round that never sights its first target again has none.

    What it shows is a tripod or a circle that turned. Common practice, no source.
    """
    opening = first_of_groups(half_round, half_rounds)
    again = target == target[opening[half_round]]
    last = opening.copy()
    np.maximum.at(last, half_round[again], np.flatnonzero(again))
    closed = last > opening
    first, last = opening[closed], last[closed]
    return HorizonClosures(first, last, wrapped(reading[last] - reading[first]))

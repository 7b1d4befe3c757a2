"""The pointings of a total station as columns, and what an observer leaves unsaid in a book."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.angles import HALF_TURN
from adjust.arrays import FloatArray, IntArray
from adjust.observations.base import Columns, Provenance
from adjust.reductions.circle import number_groups
from adjust.reductions.faces import LEFT, RIGHT

NOT_SAID = -1
"""In place of a face or a round."""


@dataclass(frozen=True)
class Pointings(Columns):
    """One pointing a row, in the order of the book; arrays (rows,), metres and radians, NaN where nothing was read.

    `setup`, `at`, `to` and `turn`, the round, are numbers of names; `face` is `LEFT` or `RIGHT`. `circle` and `zenith`
    are the readings of the two circles, `slope` is corrected for constants and air. `heights` (rows, 2) are those of
    instrument and target. `collimation` and `index` are the instrument's known errors, NaN where it has none.
    The sds are the instrument's: of a direction and a zenith angle observed on both faces, and of one distance,
    `distance_sd` + `proportional` · D as squares.
    """

    setup: IntArray
    at: IntArray
    to: IntArray
    turn: IntArray
    face: IntArray
    circle: FloatArray
    zenith: FloatArray
    slope: FloatArray
    heights: FloatArray
    collimation: FloatArray
    index: FloatArray
    direction_sd: FloatArray
    zenith_sd: FloatArray
    distance_sd: FloatArray
    proportional: FloatArray
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.setup)


def faces_of(face: IntArray, zenith: FloatArray) -> IntArray:
    """Faces (rows,) where `NOT_SAID` stands: right where the vertical circle reads more than half a turn, else left."""
    with np.errstate(invalid="ignore"):
        shown = np.where(zenith > HALF_TURN, RIGHT, LEFT)
    return np.where(face == NOT_SAID, shown, face)


def carried(values: FloatArray, group: IntArray) -> FloatArray:
    """Values (rows,) that hold within their group until given again; the first one given holds for the rows before it.

    `group` (rows,) numbers setups. NaN stays where a group gives none.
    """
    order = np.argsort(group, kind="stable")
    known = ~np.isnan(values[order])
    place = np.arange(len(values))
    starts = np.searchsorted(group[order], group[order])
    ends = np.searchsorted(group[order], group[order], side="right")
    before = np.maximum.accumulate(np.where(known, place, -1))
    after = np.minimum.accumulate(np.where(known, place, len(values))[::-1])[::-1]
    source = np.where(before >= starts, before, np.where(after < ends, after, -1))
    result = np.full(len(values), np.nan)
    result[order] = np.where(source < 0, np.nan, values[order][source])
    return result


def carried_by_target(values: FloatArray, setup: IntArray, to: IntArray) -> FloatArray:
    """Values (rows,) of targets: one given for a target holds for that target until given again, and one that is given
    for no target of its own takes what was given last in the setup."""
    target, _ = number_groups(setup, to)
    own = carried(values, target)
    return np.where(np.isnan(own), carried(values, setup), own)

"""Two faces: what both readings of a circle say of the direction, and what they say of the instrument.

The error of an instrument is what its readings on face left are too large by, those on face right too small. Half the
difference of the two faces is that error, their mean is free of it. ISO 17123-3:2001, 6.4 (horizontal) and 7.4
(vertical angles; section numbers from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.angles import FULL_TURN, HALF_TURN, wrapped
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.reductions.circle import first_of_groups, group_sums

LEFT, RIGHT = 0, 1


def horizontal_as_left(reading: FloatArray, face: IntArray) -> FloatArray:
    """Horizontal readings (rows,), radians, as face left would read them: face right reads half a turn more."""
    return np.where(face == RIGHT, reading - HALF_TURN, reading)


def zenith_as_left(reading: FloatArray, face: IntArray) -> FloatArray:
    """Readings of the vertical circle (rows,), radians, as face left would read them: face right reads 360° − z."""
    return np.where(face == RIGHT, FULL_TURN - reading, reading)


@dataclass(frozen=True)
class FaceMeans:
    """Readings of one round to one target, face by face, brought together; arrays have one entry for each such group.

    `left` and `right` count the readings on each face. `value` is the mean of the two faces' means, or of the one face
    there is, radians. `error` is half their difference, left minus right, radians; NaN with one face. `variance` is in
    units of the variance of one observation on both faces.
    """

    value: FloatArray
    error: FloatArray
    variance: FloatArray
    left: IntArray
    right: IntArray

    @property
    def single(self) -> BoolArray:
        """Groups that were read on one face only."""
        one: BoolArray = (self.left == 0) | (self.right == 0)
        return one


def mean_of_faces(reading: FloatArray, face: IntArray, group: IntArray, groups: int) -> FaceMeans:
    """Bring readings `as_left` (rows,) of the same target together; `group` (rows,) numbers them, none empty.

    One observation is one reading on each face; a reading on one face then has twice its variance, and means of m and n
    readings have (1/m + 1/n)/2 of it together, 2/n one alone. Values keep the turn of each group's first reading.
    """
    start = reading[first_of_groups(group, groups)]
    beyond = wrapped(reading - start[group])
    left, right = (np.bincount(group[face == side], minlength=groups) for side in (LEFT, RIGHT))
    with np.errstate(invalid="ignore", divide="ignore"):
        by_left = group_sums(np.where(face == LEFT, beyond, 0.0), group, groups) / left
        by_right = group_sums(np.where(face == RIGHT, beyond, 0.0), group, groups) / right
        both = (1.0 / left + 1.0 / right) / 2.0
    single = (left == 0) | (right == 0)
    alone = np.where(right == 0, by_left, by_right)
    value = start + np.where(single, alone, (by_left + by_right) / 2.0)
    error = np.where(single, np.nan, (by_left - by_right) / 2.0)
    return FaceMeans(value, error, np.where(single, 2.0 / np.maximum(left, right), both), left, right)


def corrected_single_faces(means: FaceMeans, error: FloatArray) -> FloatArray:
    """Values (groups,) with what one face alone is known to be off by taken away; both faces stand as they are.

    `error` (groups,), radians: what face left reads too much. An unknown error (NaN) corrects nothing.
    """
    side = np.where(means.single, np.where(means.right == 0, -1.0, 1.0), 0.0)
    corrected: FloatArray = means.value + side * np.nan_to_num(error)
    return corrected


def collimation_of(error: FloatArray, zenith: FloatArray) -> FloatArray:
    """Collimation errors (groups,), radians, of half differences of the horizontal circle: c = error · sin z.

    The tilt i of the trunnion axis is in it as i cos z. Deumlich & Staiger (2002), *Instrumentenkunde der
    Vermessungstechnik*, 9th edition, chapter on the theodolite's axis errors (formula from memory).
    """
    return error * np.sin(zenith)


def effect_of_collimation(collimation: FloatArray, zenith: FloatArray) -> FloatArray:
    """What a collimation error (groups,), radians, does to the horizontal circle on face left: c / sin z."""
    return collimation / np.sin(zenith)

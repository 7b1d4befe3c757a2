"""Distances as instruments show them: velocity of the light, scale, constants, and both ends of a line."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.reductions.atmosphere import HECTOPASCAL, Air
from adjust.reductions.refractivity import BY_VAPOUR, PART_PER_MILLION


def velocity_factor(reference_index: FloatArray, refractivity: FloatArray) -> FloatArray:
    """What a shown distance is multiplied by (rows,): n_ref / n, the first velocity correction.

    `reference_index` (rows,) is the group index that the instrument was set to, `refractivity` (rows,) the n − 1 of the
    air. Rüeger (1996), *Electronic Distance Measurement*, 4th edition, chapter 6 (number from memory).
    """
    return reference_index / (1.0 + refractivity)


def maker_factor(constant: FloatArray, by_pressure: FloatArray, air: Air) -> FloatArray:
    """What a shown distance is multiplied by (rows,), by the formula of the instrument's maker.

    1 + C − D · p/T + 11.27 · e/T, in parts per million with p and e in hPa and T in kelvins; `constant` C in parts
    per million, `by_pressure` D in ppm K/hPa, both (rows,). Rüeger (1996), same chapter.
    """
    ppm = constant - by_pressure * air.pressure / (HECTOPASCAL * air.temperature)
    return 1.0 + PART_PER_MILLION * (ppm + BY_VAPOUR * air.vapour / air.temperature)


def slope_of(shown: FloatArray, velocity: FloatArray, scale: FloatArray, constant: FloatArray) -> FloatArray:
    """Slope distances (rows,), metres: shown · velocity factor · (1 + scale) + constant.

    `scale` (rows,) is the relative correction from a calibration of the frequency, `constant` (rows,) metres the
    addition for instrument and target. Rüeger (1996), chapter on the reduction of distances.
    """
    return shown * velocity * (1.0 + scale) + constant


def mark_to_mark(slope: FloatArray, zenith: FloatArray, instrument: FloatArray, target: FloatArray) -> FloatArray:
    """Slope distances (rows,) between the marks from those between instrument and target at heights above them.

    √((D sin z)² + (D cos z + hᵢ − hₜ)²), verticals parallel: at 1 km and heights of 1.5 m that is 0.2 mm off, enough to
    compare both ends of a line, not to adjust with. Common practice, no source.
    """
    return np.hypot(slope * np.sin(zenith), slope * np.cos(zenith) + instrument - target)


@dataclass(frozen=True)
class BothEnds:
    """Lines measured from both ends: `marks` (lines, 2), weighted `mean`, `difference` there minus back, and the
    variances of both, each (lines,)."""

    marks: IntArray
    mean: FloatArray
    difference: FloatArray
    variance: FloatArray
    difference_variance: FloatArray


def means_of_both_ends(at: IntArray, to: IntArray, value: FloatArray, variance: FloatArray) -> BothEnds:
    """Bring values (rows,) of the lines `at`–`to` measured from both ends together; others are left out.

    Several values from one end are meaned first, all by weight (JCGM 100:2008, 5.1.2). `there` is from the mark with
    the smaller number.
    """
    line, place = np.unique(np.column_stack([np.minimum(at, to), np.maximum(at, to)]), axis=0, return_inverse=True)
    place = place.reshape(-1)
    ends = []
    for side in (at < to, at > to):
        weight = np.bincount(place[side], 1.0 / variance[side], minlength=len(line))
        total = np.bincount(place[side], value[side] / variance[side], minlength=len(line))
        with np.errstate(invalid="ignore"):
            ends.append((total / weight, weight))
    (there, weight_there), (back, weight_back) = ends
    both = (weight_there > 0) & (weight_back > 0)
    weight = (weight_there + weight_back)[both]
    mean = (there[both] * weight_there[both] + back[both] * weight_back[both]) / weight
    apart = 1.0 / weight_there[both] + 1.0 / weight_back[both]
    return BothEnds(line[both], mean, (there - back)[both], 1.0 / weight, apart)

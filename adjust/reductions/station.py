"""Station adjustment: rounds of directions from one setup, some of them without some of the targets."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.angles import FULL_TURN, wrapped
from adjust.arrays import FloatArray, IntArray

WEIGHTS_SETTLED = 1e-13
"""Relative change of an equivalent weight below which they are final: directions of the same standing then have the
same sd to the last digits, and the reduced tables one instrument for them."""
MOST_WEIGHT_STEPS = 1000


@dataclass(frozen=True)
class StationAdjustment:
    """The directions of one setup.

    `direction` (targets,) is radians in 0 … 2π, from the first target of its part; `part` (targets,) numbers parts that
    no target joins: nothing is known of the angle between two parts. `covariance` (targets, targets) refers to the mean
    of each part, and `variance` (targets,) to directions that count as uncorrelated, see `equivalent_variances`; both
    as the readings' variances. `residual` (readings,) is adjusted − read, radians.
    """

    direction: FloatArray
    part: IntArray
    covariance: FloatArray
    variance: FloatArray
    residual: FloatArray
    redundancy: int


def adjust_station(reading: FloatArray, target: IntArray, turn: IntArray, variance: FloatArray) -> StationAdjustment:
    """Adjust readings (readings,), radians, of a setup's targets in its rounds (both numbered from 0, none empty).

    Each reading is its target's direction minus the orientation of its round, one unknown for each; least squares with
    the readings' `variance` (readings,). Eliminating the orientations leaves normal equations that are the Laplacian
    matrix of a graph, one part of it for each part of the setup. Jordan's rule of means is what comes out when every
    round has every target. Jordan & Eggert (1897 and later), *Handbuch der Vermessungskunde* II, station adjustment of
    incomplete rounds (from memory).
    """
    start, orientation, part = _start(reading, target, turn)
    beyond = wrapped(reading + orientation[turn] - start[target])
    weights = np.zeros((turn.max() + 1, target.max() + 1))
    np.add.at(weights, (turn, target), 1.0 / variance)
    of_round = weights.sum(axis=1)
    by_round = np.bincount(turn, beyond / variance) / of_round
    right_side = np.bincount(target, (beyond - by_round[turn]) / variance)
    normal = np.diag(weights.sum(axis=0)) - weights.T @ (weights / of_round[:, None])
    covariance = _inverse_of_parts(normal, part)
    change = covariance @ right_side
    shift = by_round - (weights @ change) / of_round
    return StationAdjustment(
        _from_first_targets(start + change, part),
        part,
        covariance,
        equivalent_variances(covariance, weights.sum(axis=0), part),
        change[target] + shift[turn] - beyond,
        len(reading) - len(start) - len(orientation) + int(part.max()) + 1,
    )


def _start(reading: FloatArray, target: IntArray, turn: IntArray) -> tuple[FloatArray, FloatArray, IntArray]:
    """Directions (targets,) and orientations (rounds,) to start from, and the part of each target.

    A round joins the part that it shares a target with; its other targets then have a direction.
    """
    start = np.full(target.max() + 1, np.nan)
    orientation = np.full(turn.max() + 1, np.nan)
    part = np.full(len(start), -1)
    while np.isnan(orientation).any():
        joined = np.flatnonzero(~np.isnan(start[target]) & np.isnan(orientation[turn]))
        if len(joined):
            row = joined[0]
            orientation[turn[row]], number = start[target[row]] - reading[row], part[target[row]]
        else:
            row = np.flatnonzero(np.isnan(orientation[turn]))[0]
            orientation[turn[row]], number = 0.0, part.max() + 1
        rows = np.flatnonzero((turn == turn[row]) & np.isnan(start[target]))
        start[target[rows]] = reading[rows] + orientation[turn[row]]
        part[target[rows]] = number
    return start, orientation, part


def _inverse_of_parts(normal: FloatArray, part: IntArray) -> FloatArray:
    """Pseudo-inverse of a Laplacian matrix: (N + J)⁻¹ − J, J the averaging matrix of each part."""
    together = (part[:, None] == part).astype(float)
    averaging = together / together.sum(axis=1)
    scale = np.trace(normal) / len(normal) or 1.0
    inverse: FloatArray = np.linalg.inv(normal + scale * averaging) - averaging / scale
    return inverse


def _from_first_targets(direction: FloatArray, part: IntArray) -> FloatArray:
    _, first = np.unique(part, return_index=True)
    reduced: FloatArray = np.remainder(direction - direction[first][part], FULL_TURN)
    reduced[first] = 0.0
    return reduced


def equivalent_variances(covariance: FloatArray, weights: FloatArray, part: IntArray) -> FloatArray:
    """Variances (targets,) with which uncorrelated directions say most nearly what correlated ones say.

    Directions of incomplete rounds are correlated beyond their common orientation, and a table of directions holds one
    sd each. Of all uncorrelated sets with an unknown orientation, the one nearest to the true distribution (least
    Kullback–Leibler divergence) is that in which every direction's deviation from the weighted mean of its part has its
    true variance: 1/wⱼ − 1/Σw = dⱼᵀ Q dⱼ. Σ v²/variance then has its true expectation as well. Complete rounds come
    out as the plain rule has it, variance over number of rounds. `weights` (targets,) is where the search starts.
    """
    together = (part[:, None] == part).astype(float)
    own = covariance.diagonal()
    for _ in range(MOST_WEIGHT_STEPS):
        total, mixed = together @ weights, covariance @ weights
        deviation = own - 2.0 * mixed / total + together @ (weights * mixed) / total**2
        renewed = 1.0 / (deviation + 1.0 / total)
        change = abs(renewed / weights - 1.0).max()
        weights = renewed
        if change < WEIGHTS_SETTLED:
            break
    return 1.0 / weights

"""Angles on the circle, radians."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray

FULL_TURN = 2.0 * np.pi
HALF_TURN = np.pi


def wrapped(angle: FloatArray) -> FloatArray:
    """The same angles within half a turn of zero, −π < angle ≤ π; those that are there already keep every digit."""
    return angle - FULL_TURN * np.ceil(angle / FULL_TURN - 0.5)

"""Measured lengths against the coordinates that the job gives."""

from __future__ import annotations

import numpy as np

from adjust.network.closures.closures import Closures
from adjust.network.closures.lines import Lines
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.tolerances import Quantity


def control_distance_closures(observed: Observed, lines: Lines) -> Closures:
    """Distances between two marks of control: measured minus computed."""
    lengths = lines.lengths
    between = np.flatnonzero(observed.held[lengths.marks, 0].all(axis=1))
    marks = lengths.marks[between]
    computed = observed.geometry.level_distance(*marks.T)[0]
    variance = lengths.covariance[between, 0, 0] + observed.control_variance[marks, :2].max(axis=2).sum(axis=1)
    return Closures(
        "control_distance",
        "m",
        (lengths.value[between, 0] - computed)[:, None],
        np.sqrt(variance)[:, None],
        Ragged(marks.ravel(), np.arange(len(between) + 1) * 2),
        lengths.rows.take(between),
        lengths.length[between],
        np.zeros(len(between), dtype=np.int64),
        Quantity.POSITION,
    )

"""Loops of GNSS vectors, lines of them between control marks, and vectors observed more than once."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import EllipsoidFrame
from adjust.frames.reference_ellipsoid import local_axes
from adjust.network.closures.closures import Closures
from adjust.network.closures.differences import Differences, loops_of
from adjust.network.closures.levelling import loop_closures, run_closures
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.observations import Vectors
from adjust.tolerances import Quantity

COMPONENTS = ("east", "north", "up")


def vector_closures(observed: Observed) -> list[Closures]:
    """Repeated vectors, loops and lines, their misclosures along east, north and up at the first mark of each."""
    rows, numbers = observed.rows_of(Vectors)
    frame = observed.job.frame
    if rows is None or not isinstance(frame, EllipsoidFrame):
        return []
    vectors = Differences(
        rows.marks,
        rows.observed,
        rows.covariances,
        np.sqrt(np.einsum("ri,ri->r", rows.observed, rows.observed)),
        Ragged(numbers, np.arange(len(numbers) + 1)),
    )
    loops = loops_of(vectors.means(), len(observed.job.marks), *_known(observed, frame))
    closed = loops.closed
    whole = _turned(observed, loop_closures("vector_loop", loops, Quantity.VECTOR), loops.covariance)
    repeats = vectors.repeats()
    return [
        _turned(observed, run_closures("vector_repeats", repeats, Quantity.VECTOR), repeats.covariance),
        whole.take(closed),
        replace(whole.take(~closed), check="vector_line"),
    ]


def _known(observed: Observed, frame: EllipsoidFrame) -> tuple[FloatArray, FloatArray]:
    """Geocentric positions (n, 3) of marks held in plan and height, NaN elsewhere, and their variances (n, 3).

    A weighted mark counts with the largest of its three sds along every axis.
    """
    held = observed.held.all(axis=1)[:, None]
    positions = np.full((len(held), 3), np.nan)
    where = np.flatnonzero(held)
    positions[where] = frame.geocentric(observed.geometry.spatial[where])
    largest = observed.control_variance.max(axis=1, keepdims=True)
    return positions, np.repeat(largest, 3, axis=1)


def _turned(observed: Observed, closures: Closures, covariance: FloatArray) -> Closures:
    """Geocentric misclosures turned to east, north and up."""
    places = observed.geometry.coordinates[closures.marks.values[closures.marks.starts[:-1]]]
    known = observed.geometry.coordinates[np.isfinite(observed.geometry.coordinates[:, 0])]
    if len(known):
        places = np.where(np.isnan(places), known[:1], places)
    axes = local_axes(places[:, 0], places[:, 1])
    return replace(
        closures,
        misclosure=np.einsum("cij,cj->ci", axes, closures.misclosure),
        sd=np.sqrt(np.einsum("cij,cjk,cik->ci", axes, covariance, axes)),
        components=COMPONENTS,
    )

"""Start heights: from known heights along levelled lines and vectors, then along zenith angles."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components

from adjust.arrays import FloatArray
from adjust.job import Job
from adjust.network.estimate import Estimate
from adjust.network.sight_lines import Rises, SightLines
from adjust.network.spread import spread
from adjust.network.working_plane import WorkingPlane
from adjust.observations import HeightDifferences, Vectors


def with_heights(job: Job, plane: WorkingPlane, estimate: Estimate, sights: SightLines) -> Estimate:
    """The estimate with every height that follows from those it has.

    Levelled lines and vectors lead as far as they can before any zenith angle does.
    """
    best = _joined([*_levelled(job, estimate), *_vector_rises(job, plane, estimate)])
    heights = spread(estimate.heights, best.marks[:, 0], best.marks[:, 1], best.rise)
    if np.isnan(heights).any():
        every = _joined([best, sights.rises(replace(estimate, heights=heights))])
        heights = spread(heights, every.marks[:, 0], every.marks[:, 1], every.rise)
    return replace(estimate, heights=heights)


def drawn_heights(estimate: Estimate, sights: SightLines, height: float) -> FloatArray:
    """Heights (n,) of a job that seeks none, so that its slopes and zenith angles agree with each other.

    Marks that zenith angles join, but not to a known height, hang on one of them, put at `height`; marks without
    zenith angles stay NaN.
    """
    rises = sights.rises(estimate)
    heights = estimate.heights.copy()
    links = csr_array((np.ones(len(rises.rise)), tuple(rises.marks.T)), shape=(len(heights),) * 2)
    label = connected_components(links, directed=False)[1]
    joined = np.unique(rises.marks)
    drawn = joined[np.isnan(heights[joined])]
    heights[drawn[np.unique(label[drawn], return_index=True)[1]]] = height
    return spread(heights, rises.marks[:, 0], rises.marks[:, 1], rises.rise)


def _levelled(job: Job, estimate: Estimate) -> list[Rises]:
    """Rises in the job's height system: levels compare heights above the geoid."""
    geoid = np.zeros_like(estimate.geoid) if estimate.orthometric else estimate.geoid
    return [
        Rises(rows.marks, rows.observed[:, 0] + geoid[rows.marks[:, 1]] - geoid[rows.marks[:, 0]])
        for rows in job.observations
        if isinstance(rows, HeightDifferences)
    ]


def _vector_rises(job: Job, plane: WorkingPlane, estimate: Estimate) -> list[Rises]:
    """Rises in the job's height system: vectors give heights above the ellipsoid."""
    geoid = estimate.geoid if estimate.orthometric else np.zeros_like(estimate.geoid)
    rises = []
    for rows in job.observations:
        if isinstance(rows, Vectors):
            up = plane.reduced_vectors(rows.observed, rows.marks, estimate.points, estimate.spatial_heights)[1]
            rises.append(Rises(rows.marks, up - geoid[rows.marks[:, 1]] + geoid[rows.marks[:, 0]]))
    return rises


def _joined(rises: list[Rises]) -> Rises:
    if not rises:
        return Rises(np.empty((0, 2), dtype=np.int64), np.empty(0))
    return Rises(np.vstack([part.marks for part in rises]), np.concatenate([part.rise for part in rises]))

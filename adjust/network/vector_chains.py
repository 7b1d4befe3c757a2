"""Chains of GNSS vectors from marks of known position, in geocentric axes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.frames import EllipsoidFrame
from adjust.job import Job
from adjust.network.estimate import Estimate
from adjust.network.spread import spread
from adjust.network.working_plane import WorkingPlane
from adjust.observations import Vectors


def along_vectors(job: Job, plane: WorkingPlane, estimate: Estimate) -> Estimate:
    """The estimate with every position that vectors carry on from marks known in plan and height.

    Nothing is reduced to the working plane on the way, so that the chains may be as long as a continent.
    """
    vectors = [rows for rows in job.observations if isinstance(rows, Vectors)]
    if not vectors or not isinstance(job.frame, EllipsoidFrame):
        return estimate
    known = job.frame.geocentric(np.column_stack([plane.plan(estimate.points), estimate.spatial_heights]))
    ends = np.vstack([rows.marks for rows in vectors])
    observed = np.vstack([rows.observed for rows in vectors])
    reached = np.column_stack([spread(known[:, axis], ends[:, 0], ends[:, 1], observed[:, axis]) for axis in range(3)])
    position = job.frame.from_geocentric(reached)
    new = np.isnan(estimate.points)
    moved = estimate.moved(job, plane, np.where(new, plane.points(position), estimate.points))
    heights = position[:, 2] - moved.geoid if job.orthometric else position[:, 2]
    return replace(moved, heights=np.where(np.isnan(estimate.heights), heights, estimate.heights))

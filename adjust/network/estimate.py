"""Where the marks are thought to lie while a start is sought."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import FloatArray
from adjust.errors import NetworkError
from adjust.job import Job
from adjust.network.wording import listed
from adjust.network.working_plane import ComplexArray, WorkingPlane


@dataclass(frozen=True)
class Estimate:
    """`points` (n,) on the working plane, `heights` (n,) in the job's own height system and `geoid` (n,), metres.

    NaN where nothing is known yet; the geoid is 0 there.
    """

    points: ComplexArray
    heights: FloatArray
    geoid: FloatArray
    orthometric: bool

    @property
    def spatial_heights(self) -> FloatArray:
        """Heights (n,) above the ellipsoid; in a plane frame the only heights there are."""
        return self.heights + self.geoid if self.orthometric else self.heights

    def moved(self, job: Job, plane: WorkingPlane, points: ComplexArray) -> Estimate:
        """The same heights at other points, with the geoid as it is there."""
        return replace(self, points=points, geoid=geoid_heights(job, plane.plan(points)))


def given_estimate(job: Job, plane: WorkingPlane) -> Estimate:
    """What the marks' given coordinates say, whether control or only a start."""
    given = job.marks.given
    return Estimate(plane.points(given), given[:, 2].copy(), geoid_heights(job, given[:, :2]), job.orthometric)


def geoid_heights(job: Job, plan: FloatArray) -> FloatArray:
    """Geoid heights (n,), metres, at the frame's plan coordinates (n, 2): from the grid if there is one.

    Where a mark has no plan coordinates its own geoid height stands. Raises NetworkError for marks off the grid.
    """
    marks = job.marks
    if job.geoid_grid is None:
        return marks.geoid
    known = ~np.isnan(plan[:, 0])
    geoid = marks.geoid.copy()
    geoid[known] = job.geoid_grid.heights(plan[known])
    outside = [marks.names[mark] for mark in np.nonzero(np.isnan(geoid))[0]]
    if outside:
        raise NetworkError(f"{listed(outside)}: outside the geoid grid; give a grid that covers the network", outside)
    return geoid

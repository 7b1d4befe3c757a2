"""Which coordinates and orientations a job's observations and control let us ask for, and their columns."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import BoolArray, IntArray
from adjust.job import Control, Job

EAST, NORTH, UP = 0, 1, 2
AXES = ("east", "north", "up")
"""Their names."""


@dataclass(frozen=True)
class Unknowns:
    """Columns of the design matrix: coordinates mark by mark, then the orientations of the setups.

    `sought` (n, 3) says which of a mark's east, north and up are unknown; `setups` is the number of orientations.
    `plan_only` holds when no height is sought in the whole job, so that slopes and zenith angles use given heights.
    """

    sought: BoolArray
    setups: int
    plan_only: bool

    @cached_property
    def columns(self) -> IntArray:
        """Column (n, 3) of each coordinate, −1 where it is not an unknown."""
        numbered = np.cumsum(self.sought.ravel()) - 1
        return np.where(self.sought, numbered.reshape(self.sought.shape), -1)

    @cached_property
    def coordinates(self) -> int:
        """Number of coordinate unknowns; the orientations' columns follow them."""
        return int(np.count_nonzero(self.sought))

    @property
    def count(self) -> int:
        """Number of all unknowns."""
        return self.coordinates + self.setups

    def mark_of_column(self) -> IntArray:
        """Mark (coordinates,) that each coordinate column belongs to."""
        return np.nonzero(self.sought)[0]


def touched(job: Job, *, plan: bool) -> BoolArray:
    """Marks (n,) that some observation in use could help to determine, in plan or in height."""
    marks = np.zeros(len(job.marks), dtype=bool)
    for rows in job.observations:
        if rows.determines_plan if plan else rows.determines_height:
            marks[rows.marks.ravel()] = True
    return marks


def is_plan_only(job: Job) -> bool:
    """No height control, and nothing observed whose only use is a height: the given heights serve as they are."""
    controlled = job.datum.mode == "inner" or bool(np.any(job.marks.control[:, 1] != Control.FREE))
    heights_observed = any(rows.determines_height and len(rows) for rows in job.observations)
    only_for_heights = any(rows.kind in ("height_difference", "vector") for rows in job.observations)
    return not (controlled and heights_observed) and not only_for_heights


def find_unknowns(job: Job) -> Unknowns:
    """The unknowns of a job. Under inner constraints no mark is held, whatever control `marks.csv` names."""
    held = np.zeros((len(job.marks), 2), dtype=bool)
    weighted = np.zeros_like(held)
    if job.datum.mode == "control":
        held = job.marks.control == Control.FIXED
        weighted = job.marks.control == Control.WEIGHTED
    plan_only = is_plan_only(job)
    plan = (touched(job, plan=True) | weighted[:, 0]) & ~held[:, 0]
    height = (touched(job, plan=False) & (not plan_only) | weighted[:, 1]) & ~held[:, 1]
    return Unknowns(np.column_stack([plan, plan, height]), len(job.setups), plan_only)

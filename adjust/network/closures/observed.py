"""All observations of a job numbered through, so that closures of every kind can name the rows they rest on."""

from __future__ import annotations

from dataclasses import replace
from typing import TypeVar

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Geometry
from adjust.job import Control, Job
from adjust.observations import Observations
from adjust.observations.sighted import SightedObservations

Kind = TypeVar("Kind", bound=Observations)


class Observed:
    """A job, where its marks are thought to lie, and its rows numbered through in the order of `job.observations`.

    `geometry` may lack coordinates (NaN). `sd` (rows,) holds the a-priori sds of scalar observations, metres or
    radians; NaN for vectors. `held` (n, 2) tells which marks count as known in plan and in height: fixed or weighted
    control.
    """

    def __init__(self, job: Job, geometry: Geometry) -> None:
        self.job = job
        self.geometry = geometry
        self.given_geometry = replace(geometry, coordinates=job.marks.given)
        sizes = [len(rows) for rows in job.observations]
        self._starts = np.concatenate([[0], np.cumsum(sizes)]).astype(np.int64)
        self.sd = np.concatenate([np.empty(0), *(_sds(rows, geometry) for rows in job.observations)])
        given = np.isfinite(job.marks.given)
        known = np.column_stack([given[:, :2].all(axis=1), given[:, 2]])
        self.held = known & (job.marks.control != Control.FREE) & (job.datum.mode == "control")
        self.control_variance = np.nan_to_num(np.where(job.marks.control[:, [0, 0, 1]] == 1, job.marks.sd, 0.0)) ** 2
        """(n, 3): of weighted coordinates, m²; 0 where fixed or free."""

    def rows_of(self, kind: type[Kind]) -> tuple[Kind | None, IntArray]:
        """The observations of a kind and their numbers (rows,); None where there are none."""
        for rows, start in zip(self.job.observations, self._starts, strict=False):
            if isinstance(rows, kind):
                return rows, start + np.arange(len(rows))
        return None, np.empty(0, dtype=np.int64)

    def place(self, number: int) -> tuple[Observations, int]:
        """The kind and the row within it of an observation."""
        part = int(np.searchsorted(self._starts, number, side="right")) - 1
        return self.job.observations[part], number - int(self._starts[part])

    def source(self, number: int) -> str:
        """`levels.csv:3`."""
        rows, row = self.place(number)
        return rows.provenance.label(row)

    def kind(self, number: int) -> str:
        """The kind's name."""
        return self.place(number)[0].kind

    def marks(self, number: int) -> list[int]:
        """The marks of an observation, in the order of its kind's roles."""
        rows, row = self.place(number)
        marks: list[int] = rows.marks[row].tolist()
        return marks

    def __len__(self) -> int:
        return int(self._starts[-1])


def _sds(rows: Observations, geometry: Geometry) -> FloatArray:
    """A-priori sds (rows,); without centring where the marks' places are not known."""
    if len(rows.components) > 1:
        return np.full(len(rows), np.nan)
    variance = rows.covariance(geometry)[:, 0, 0]
    if isinstance(rows, SightedObservations):
        precision = rows.precision
        plain = precision.constant**2 + (precision.proportional * rows.observed[:, 0]) ** 2
        variance = np.where(np.isnan(variance), plain, variance)
    return np.sqrt(variance)

"""The adjustment of a job, and the immutable result that answers questions about it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Literal

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.covariance import Transformation
from adjust.frames import Geometry
from adjust.job import Control, Job
from adjust.quality import Ellipse, GlobalTest, circle_radius, ellipse_factor, half_interval, standard_ellipse
from adjust.residuals import Residuals
from adjust.solver import Factor
from adjust.unknowns import Unknowns

if TYPE_CHECKING:
    import pandas

Status = Literal["fixed", "weighted", "adjusted", "none"]

PUBLISHED = 0.95
"""Probability of the 95 % circle and height that accuracy standards ask for, whatever the job's own confidence."""


@dataclass(frozen=True)
class Solution:
    """The scalars of an adjustment.

    `variance_factor` is vᵀPv / degrees of freedom, None without any. `second_opinion_gap` is the largest difference,
    metres or radians, between the first step, which leads all the way from the start, and the one LSQR finds for it.
    """

    observations: int
    unknowns: int
    datum_defect: int
    degrees_of_freedom: int
    iterations: int
    converged: bool
    variance_factor: float | None
    global_test: GlobalTest
    condition_number: float
    sd_basis: Literal["prior", "posterior"]
    second_opinion_gap: float

    @property
    def variance_scale(self) -> float:
        """What σ₀ = 1 covariances are multiplied with: 1 on the prior basis, else σ̂₀²; NaN where that is unknown."""
        if self.sd_basis == "prior":
            return 1.0
        return np.nan if self.variance_factor is None else self.variance_factor


def _status(control: int, sought: bool) -> Status:
    if control == Control.FIXED:
        return "fixed"
    if control == Control.WEIGHTED:
        return "weighted"
    return "adjusted" if sought else "none"


@dataclass(frozen=True)
class Adjustment:
    """An adjusted network. Arrays over marks follow `job.marks`; over lines, `lines`.

    `geometry` holds the adjusted coordinates, `orientations` (setups,) the azimuths of the circles' zeros, radians.
    Covariances are m², of easting, northing and height along the grid's axes, on the basis that `solution.sd_basis`
    names. A fixed coordinate has variance 0; one that is neither held nor adjusted has NaN.
    `mark_covariances` is (n, 3, 3); `lines` (lines, 2) are the pairs of marks that an observation joins;
    `line_covariances` (lines, 3, 3) are those of the differences second minus first.
    """

    job: Job
    unknowns: Unknowns
    geometry: Geometry
    orientations: FloatArray
    residuals: tuple[Residuals, ...]
    solution: Solution
    mark_covariances: FloatArray
    lines: IntArray
    line_covariances: FloatArray
    notes: tuple[str, ...]
    _factor: Factor = field(repr=False)
    _transformation: Transformation | None = field(repr=False)
    _grid: FloatArray = field(repr=False)

    @property
    def coordinates(self) -> FloatArray:
        """Adjusted coordinates (n, 3) in the frame: E, N, height; or longitude, latitude (radians), height."""
        return self.geometry.coordinates

    @cached_property
    def statuses(self) -> tuple[tuple[Status, Status], ...]:
        """How the plan and the height of every mark came about."""
        controlled = self.job.datum.mode == "control"
        pairs = zip(self.job.marks.control.tolist(), self.unknowns.sought[:, 1:].tolist(), strict=True)
        return tuple(
            (_status(control[0] * controlled, sought[0]), _status(control[1] * controlled, sought[1]))
            for control, sought in pairs
        )

    @property
    def degrees_of_freedom_used(self) -> int | None:
        """Degrees of freedom behind the sds: None on the prior basis, where they are known."""
        return None if self.solution.sd_basis == "prior" else self.solution.degrees_of_freedom

    @cached_property
    def standard_deviations(self) -> FloatArray:
        """Sd (n, 3) of easting, northing, height, metres; 0 where fixed, NaN where there is none."""
        sd: FloatArray = np.sqrt(np.einsum("nii->ni", self.mark_covariances))
        return sd

    @cached_property
    def ellipses(self) -> Ellipse:
        """Standard (1σ) ellipses of all marks."""
        return standard_ellipse(self.mark_covariances[:, :2, :2])

    @cached_property
    def line_ellipses(self) -> Ellipse:
        """Standard relative ellipses of `lines`."""
        return standard_ellipse(self.line_covariances[:, :2, :2])

    @property
    def ellipse_factor(self) -> float:
        """From standard ellipses to those of the job's confidence."""
        return ellipse_factor(self.job.statistics.confidence, self.degrees_of_freedom_used)

    @cached_property
    def horizontal_95(self) -> FloatArray:
        """Radius (n,) of the 95 % circle, metres."""
        ellipses = self.ellipses
        return circle_radius(ellipses.semi_major, ellipses.semi_minor, PUBLISHED, self.degrees_of_freedom_used)

    @cached_property
    def height_95(self) -> FloatArray:
        """95 % half-interval (n,) of the height, metres."""
        return half_interval(self.standard_deviations[:, 2], PUBLISHED, self.degrees_of_freedom_used)

    @cached_property
    def line_lengths(self) -> FloatArray:
        """Horizontal length (lines,) at the marks' mean height, metres; NaN without plan coordinates."""
        first, second = self.lines.T
        return self.geometry.level_distance(first, second)[0]

    def covariance(self, marks: Sequence[str]) -> FloatArray:
        """Joint covariance (3m, 3m) of easting, northing and height of any marks, m², basis as the other sds.

        Rows of coordinates that are not adjusted are 0. Raises KeyError for an unknown mark.
        """
        from scipy.linalg import block_diag

        rows = np.array([self.job.marks.index[mark] for mark in marks], dtype=np.int64)
        columns = self.unknowns.columns[rows].ravel()
        kept = np.flatnonzero(columns >= 0)
        identity = np.zeros((self.unknowns.count, len(kept)))
        identity[columns[kept], np.arange(len(kept))] = 1.0
        block = np.zeros((1, len(columns), len(columns)))
        block[0][np.ix_(kept, kept)] = self._factor.normal_solve(identity)[columns[kept]]
        if self._transformation is not None:
            block = self._transformation.apply(block, (columns[None], columns[None]))
        turned = block_diag(*self._grid[rows])
        scaled: FloatArray = turned @ block[0] @ turned.T * self.solution.variance_scale
        return scaled

    def relative_ellipse(self, first: str, second: str) -> Ellipse:
        """Standard ellipse of the plan difference of any two marks. Raises KeyError for an unknown mark."""
        joint = self.covariance([first, second])
        difference = np.hstack([-np.eye(3), np.eye(3)])
        return standard_ellipse((difference @ joint @ difference.T)[:2, :2])

    @cached_property
    def suspects(self) -> tuple[str, ...]:
        """Sources of the observations that failed their test, worst first."""
        found: dict[str, float] = {}
        for table in self.residuals:
            for row in np.flatnonzero(table.suspect.any(axis=1)):
                label = table.observations.provenance.label(int(row))
                found[label] = max(found.get(label, 0.0), float(np.nanmax(np.abs(table.w[row]))))
        return tuple(sorted(found, key=lambda label: (-found[label], label)))

    @property
    def accepted(self) -> bool:
        """Whether the global test passed (or could not be made) and no observation is suspect."""
        return self.solution.global_test.passed is not False and not self.suspects

    def to_frame(self, table: Literal["marks", "lines", "observations"] = "marks") -> pandas.DataFrame:
        """A table of the results for pandas, with the columns of the reports: units in their names, NaN for none.

        Marks and observations are indexed by name and by source, lines by both ends. `attrs` holds title, date and
        cautions. Raises OutputError where pandas is not installed.
        """
        from adjust.reports.frame import frame

        return frame(self, table)

    def __repr__(self) -> str:
        from adjust.reports.summary import text

        return text(self)

    def _repr_html_(self) -> str:
        from adjust.reports.summary import html

        return html(self)

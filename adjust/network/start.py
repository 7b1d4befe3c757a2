"""Start coordinates and orientations of a job, from its control and its observations alone."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import BoolArray, FloatArray
from adjust.frames import EllipsoidFrame, Geometry
from adjust.job import Job
from adjust.network.assembly import Assembly
from adjust.network.consensus import group_circular_medians
from adjust.network.estimate import Estimate, given_estimate
from adjust.network.explaining import height_error, plan_error
from adjust.network.heights import drawn_heights, with_heights
from adjust.network.plan_relations import plan_relations
from adjust.network.searching import BEGINNINGS
from adjust.network.sight_lines import SightLines
from adjust.network.survey import Survey
from adjust.network.vector_chains import along_vectors
from adjust.network.wording import listed, names_of
from adjust.network.working_plane import ComplexArray, GridPlane, WorkingPlane, working_plane
from adjust.observations import Directions
from adjust.unknowns import Unknowns

MOST_PASSES = 4
"""Times the plan is built at most: the first may know neither where a mark lies (convergence, the vertical of a vector)
nor how high (slope distances); each pass gains several digits in both."""


@dataclass(frozen=True)
class Start:
    """Where an adjustment begins: `orientations` (setups,) in radians, `notes` on what was decided for the surveyor."""

    geometry: Geometry
    orientations: FloatArray
    notes: tuple[str, ...]


def find_start(job: Job, unknowns: Unknowns, *, searching: bool = True) -> Start:
    """Start coordinates for every unknown, near enough for Gauss–Newton.

    Given coordinates are used as they are. `searching`: whether marks that no construction reaches are searched for,
    which takes its time. Raises NetworkError, naming the marks and what is missing, where the
    observations lead to no start.
    """
    finder = _Finder(job, unknowns, searching)
    estimate = finder.estimate()
    geometry = finder.geometry(estimate)
    finder.note_idle_setups()
    return Start(geometry, _orientations(job, geometry), tuple(finder.notes))


class _Finder:
    """The search for one job's start."""

    def __init__(self, job: Job, unknowns: Unknowns, searching: bool) -> None:
        self.job, self.unknowns, self.searching = job, unknowns, searching
        self.notes: list[str] = []
        self.sights = SightLines(job)
        self.in_plan = unknowns.sought[:, 0] | _observed_in_plan(job)
        plan_known = ~np.isnan(job.marks.given[:, 0])
        needs_plane = bool(np.any(self.in_plan | plan_known))
        self.plane: WorkingPlane = working_plane(job) if needs_plane else GridPlane()

    def estimate(self) -> Estimate:
        """Plan and heights by turns, until what the plan was built from stays as it is."""
        given = self._with_height_origin(given_estimate(self.job, self.plane))
        given = along_vectors(self.job, self.plane, given)
        estimate = self._raised(given)
        if not np.isnan(given.points[self.in_plan]).any():
            return estimate
        relations = plan_relations(self.job, self.plane, estimate, self.sights)
        for _ in range(MOST_PASSES):
            assembly = self._assembled(Survey(relations, len(self.job.marks)), given.points)
            points = given.points.copy()
            points[list(assembly.world.points)] = list(assembly.world.points.values())
            estimate = self._raised(given.moved(self.job, self.plane, points))
            former, relations = relations, plan_relations(self.job, self.plane, estimate, self.sights)
            if not relations.differs(former):
                break
        self._note_assembly(assembly)
        return estimate

    def _assembled(self, survey: Survey, given: ComplexArray) -> Assembly:
        """The plan of all marks observed in plan, from the given points."""
        wanted = np.nonzero(self.in_plan)[0].tolist()
        known = {mark: complex(given[mark]) for mark in wanted if not np.isnan(given[mark])}
        free = self.job.datum.mode == "inner"
        assembly = Assembly(survey, known, set(wanted), free=free, searching=self.searching)
        assembly.run()
        if missing := assembly.missing():
            raise plan_error(self.job, assembly, missing)
        return assembly

    def _with_height_origin(self, estimate: Estimate) -> Estimate:
        """In a free network without any given height, the first mark whose height is sought is put at 0 m."""
        sought = np.nonzero(self.unknowns.sought[:, 2])[0]
        if self.job.datum.mode != "inner" or not len(sought) or not np.isnan(estimate.heights).all():
            return estimate
        heights = estimate.heights.copy()
        heights[sought[0]] = 0.0
        origin = listed(names_of(self.job, sought[:1]))
        self.notes.append(f"free network without given heights: they count from {origin}, put at 0 m")
        return replace(estimate, heights=heights)

    def _raised(self, estimate: Estimate) -> Estimate:
        """With the heights that follow from the given ones; in a plan-only job, from any."""
        raised = with_heights(self.job, self.plane, estimate, self.sights)
        if not self.unknowns.plan_only:
            return raised
        return replace(raised, heights=drawn_heights(raised, self.sights, _mean_height(raised)))

    def _note_assembly(self, assembly: Assembly) -> None:
        self.notes += assembly.notes
        if found := names_of(self.job, assembly.found_by_search):
            self.notes.append(
                f"{listed(found)}: no construction leads there; the start is the only fit that a search from "
                f"{BEGINNINGS} scattered beginnings found"
            )

    def geometry(self, estimate: Estimate) -> Geometry:
        """The frame's coordinates: given ones to the last digit, marks without a height at the mean height."""
        job, sought = self.job, self.unknowns.sought
        lacking = np.nonzero(sought[:, 2] & np.isnan(estimate.heights))[0]
        if len(lacking):
            raise height_error(job, lacking)
        heights = np.where(self.in_plan & np.isnan(estimate.heights), _mean_height(estimate), estimate.heights)
        self._note_mean_height(self.in_plan & np.isnan(estimate.heights), heights)
        if self.unknowns.plan_only and np.isnan(job.marks.given[:, 2]).all() and not np.isnan(estimate.heights).all():
            self.notes.append(
                "no heights are given; to reduce slopes they follow from the zenith angles, counted from 0 m"
            )
        plan = np.where(np.isnan(job.marks.given[:, :2]), self.plane.plan(estimate.points), job.marks.given[:, :2])
        return Geometry(
            job.frame,
            np.column_stack([plan, heights]),
            estimate.geoid,
            job.marks.deflection,
            job.orthometric,
            job.refraction_coefficient,
        )

    def _note_mean_height(self, low: BoolArray, heights: FloatArray) -> None:
        """Say which marks were put at the mean height, where that bears on the result."""
        if not isinstance(self.job.frame, EllipsoidFrame):
            low = low & _on_slopes(self.job)
        if marks := names_of(self.job, np.nonzero(low)[0]):
            height = heights[np.nonzero(low)[0][0]]
            self.notes.append(f"{listed(marks)}: no height; taken at the job's mean height, {height:.3f} m")

    def note_idle_setups(self) -> None:
        """Say which rounds see one target only: they orient themselves and give nothing."""
        for rows in self.job.observations:
            if isinstance(rows, Directions):
                marks = len(self.job.marks)
                sights = np.unique(rows.setup * marks + rows.marks[:, 1])
                idle = np.nonzero(np.bincount(sights // marks, minlength=len(self.job.setups)) == 1)[0]
                if len(idle):
                    names = listed([self.job.setups[setup] for setup in idle], "setup")
                    self.notes.append(f"{names}: one target only, so the directions orient the round and fix nothing")


def _mean_height(estimate: Estimate) -> float:
    """Mean of the known heights, metres; 0 where none is known."""
    known = estimate.heights[~np.isnan(estimate.heights)]
    return float(known.mean()) if len(known) else 0.0


def _observed_in_plan(job: Job) -> BoolArray:
    """Marks (n,) at either end of an observation that is predicted from plan positions."""
    marks = np.zeros(len(job.marks), dtype=bool)
    for rows in job.observations:
        if rows.determines_plan or rows.kind == "zenith":
            marks[rows.marks.ravel()] = True
    return marks


def _on_slopes(job: Job) -> BoolArray:
    """Marks (n,) at either end of a slope distance or a zenith angle."""
    marks = np.zeros(len(job.marks), dtype=bool)
    for rows in job.observations:
        if rows.kind in ("slope_distance", "zenith"):
            marks[rows.marks.ravel()] = True
    return marks


def _orientations(job: Job, geometry: Geometry) -> FloatArray:
    """Orientation (setups,) of each round: the median over its directions; 0 for a round without any."""
    orientations = np.zeros(len(job.setups))
    for rows in job.observations:
        if isinstance(rows, Directions):
            turns = rows.predict(geometry)[:, 0] - rows.observed[:, 0]
            setups, medians = group_circular_medians(rows.setup, turns)
            orientations[setups] = medians
    return orientations

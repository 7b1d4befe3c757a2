"""Checks a job before it is adjusted."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from adjust.errors import NetworkError
from adjust.frames import Geometry
from adjust.job import Job
from adjust.network.closures.angle_sums import angle_closures
from adjust.network.closures.closures import Closures, Judged, judged
from adjust.network.closures.clues import Clue, find_clues
from adjust.network.closures.coordinates import control_distance_closures
from adjust.network.closures.entries import entry_remarks
from adjust.network.closures.heights import height_closures
from adjust.network.closures.levelling import level_closures
from adjust.network.closures.linear import Traversing
from adjust.network.closures.lines import Lines, distance_closures, zenith_closures
from adjust.network.closures.observed import Observed
from adjust.network.closures.orientation import Orientations, control_orientation_closures
from adjust.network.closures.polar import two_place_remarks
from adjust.network.closures.positions import position_remarks
from adjust.network.closures.readings import reading_closures
from adjust.network.closures.remarks import Remark
from adjust.network.closures.stations import Stations, station_closures
from adjust.network.closures.suspicion import SharedLine, Suspicion, shared_lines, suspicions
from adjust.network.closures.traverse import Traverse, traverse_at, traverse_closures
from adjust.network.closures.vectors import vector_closures
from adjust.network.start import Start, find_start
from adjust.unknowns import find_unknowns


@dataclass(frozen=True)
class Check:
    """What can be said of a job before it is adjusted.

    `closures` has one entry for each check that found something to close, in a fixed order; `remarks` what is odd
    without being a misclosure; `shared`, `suspicions` and `clues` say what to look at first; `traverses` are those
    behind the closures `traverse_loop` and `traverse_link`, in their order; `notes` what could not be checked and why.
    """

    observed: Observed
    closures: tuple[Judged, ...]
    remarks: tuple[Remark, ...]
    traverses: tuple[Traverse, ...]
    shared: tuple[SharedLine, ...]
    clues: tuple[Clue, ...]
    suspicions: tuple[Suspicion, ...]
    notes: tuple[str, ...]
    start: Start | None = None
    """The start coordinates that it was checked at, None where the observations lead to none."""

    @property
    def job(self) -> Job:
        """The job that was checked."""
        return self.observed.job

    @property
    def exceeding(self) -> int:
        """Closures and remarks beyond what is allowed."""
        closures = sum(int(judged.exceeds.sum()) for judged in self.closures)
        return closures + sum(remark.exceeds for remark in self.remarks)

    @property
    def passed(self) -> bool:
        """Whether nothing exceeds its tolerance."""
        return self.exceeding == 0


def check_job(job: Job) -> Check:
    """Close everything that closes, and look for what is odd. Never raises for a job that could be read."""
    # a zenith angle misread as 0 divides by zero; what comes of it is not finite and closes nothing
    with np.errstate(all="ignore"):
        return _checked(job)


def _checked(job: Job) -> Check:
    start, geometry, notes = _geometry(job)
    observed = Observed(job, geometry)
    lines, stations = Lines(observed), Stations(observed)
    orientations = Orientations(observed, stations)
    traverses = Traversing(observed, orientations, lines)
    checks = judged(_closures(orientations, lines, traverses), job.tolerances)
    clues = tuple(find_clues(observed, checks, traverses))
    return Check(
        observed,
        checks,
        (
            *position_remarks(observed, lines, job.tolerances),
            *two_place_remarks(observed, stations, lines),
            *entry_remarks(observed, job.tolerances),
        ),
        tuple(traverse_at(traverses, number) for number in np.flatnonzero(traverses.from_control).tolist()),
        tuple(shared_lines(checks)),
        clues,
        tuple(narrowed(suspicion, clues) for suspicion in suspicions(checks, observed)),
        notes,
        start,
    )


def _closures(orientations: Orientations, lines: Lines, traverses: Traversing) -> list[Closures]:
    """Every check that found something to close, in the order of the reports."""
    observed, stations = orientations.observed, orientations.stations
    every = [
        *reading_closures(observed),
        *level_closures(observed),
        *station_closures(observed, stations),
        control_orientation_closures(observed, orientations),
        *angle_closures(observed, orientations, lines.length_of(orientations.marks)),
        *traverse_closures(traverses),
        control_distance_closures(observed, lines),
        *distance_closures(lines),
        *zenith_closures(lines),
        height_closures(observed, lines),
        *vector_closures(observed),
    ]
    finite = [closures.take(closures.finite) for closures in every]
    return [closures for closures in finite if len(closures)]


def narrowed(suspicion: Suspicion, clues: Sequence[Clue]) -> Suspicion:
    """A suspicion without the rows that a clue speaks against: where one wrong angle or length of a traverse would
    explain it, rows of its other angles and lengths do not."""
    rows = suspicion.rows
    for clue in clues:
        told = tuple(row for row in rows if row in clue.rows)
        rows = told or rows
    return suspicion if rows == suspicion.rows else replace(suspicion, rows=rows, marks=())


def _geometry(job: Job) -> tuple[Start | None, Geometry, tuple[str, ...]]:
    """Where the marks lie: start coordinates if the observations lead to them, else only those given."""
    try:
        start = find_start(job, find_unknowns(job))
        return start, start.geometry, ()
    except NetworkError as error:
        marks = job.marks
        given = Geometry(
            job.frame, marks.given, marks.geoid, marks.deflection, job.orthometric, job.refraction_coefficient
        )
        return None, given, (f"No start coordinates, so that only given ones could be checked: {error}",)

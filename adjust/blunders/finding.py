"""From an adjustment to its blunders: supposed errors, search, and the words for what was found."""

from __future__ import annotations

from pathlib import Path

from adjust.adjustment import Adjustment
from adjust.blunders.findings import Findings
from adjust.blunders.released import doubtful, tell_released
from adjust.blunders.round import GROSS, Round
from adjust.blunders.rounds import Rounds
from adjust.blunders.telling import tell
from adjust.job import Job
from adjust.model import State
from adjust.network import find_start
from adjust.robust import robust_start
from adjust.unknowns import Unknowns, find_unknowns


def find_blunders(adjustment: Adjustment, folder: str | Path | None = None) -> Findings:
    """Every observation, and everything observations share, that is wrong at the job's significance.

    `folder` is where the job was read from: entries are then quoted as they stand in the book.
    """
    job, unknowns = adjustment.job, adjustment.unknowns
    adjusted = Rounds(job, unknowns, State(adjustment.geometry, adjustment.orientations))
    if (adjustment.solution.variance_factor or 0.0) < GROSS:
        return _told(adjusted.last(), folder)
    robust = Rounds(job, unknowns, _robust_state(job, unknowns)).last()
    if robust.plausible:
        return _told(robust, folder)
    return _told(min([robust, adjusted.last()], key=lambda found: (not found.settled, found.left)), folder)


def find_blunders_of(job: Job, folder: str | Path | None = None) -> Findings:
    """As `find_blunders`, of a job whose adjustment does not settle. Raises NetworkError where it has no start."""
    unknowns = find_unknowns(job)
    return _told(Rounds(job, unknowns, _robust_state(job, unknowns)).last(), folder)


def _told(found: Round, folder: str | Path | None) -> Findings:
    """With a mark's control released, where the round leaves doubt and that explains the job better."""
    released = tell_released(found, folder) if doubtful(found) else None
    return tell(found, folder) if released is None else released


def _robust_state(job: Job, unknowns: Unknowns) -> State:
    """Where most observations agree."""
    start = robust_start(job, unknowns, find_start(job, unknowns))
    return State(start.geometry, start.orientations)

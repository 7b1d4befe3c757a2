"""Gross errors of fixed control: each mark's coordinates released in turn.

Every linearisation holds fixed coordinates as true; tens of metres off, the effect of their error is taken at the wrong
place, and the search names sound observations. A mark whose coordinates are found anew, from the observations alone,
says how far they are off whatever the size. It is the same error as a hypothesis of control has, and has its price.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np

from adjust.arrays import IntArray
from adjust.blunders.findings import Findings
from adjust.blunders.groups import PLAN
from adjust.blunders.hypothesis import Hypothesis
from adjust.blunders.released_mark import ReleasedMark
from adjust.blunders.round import Round
from adjust.blunders.rounds import Rounds
from adjust.blunders.separability import EQUAL
from adjust.blunders.telling import tell
from adjust.errors import HubtackError
from adjust.job import Control, Job
from adjust.model import State
from adjust.network import find_start
from adjust.robust import MOST_MARKS, robust_start
from adjust.unknowns import find_unknowns

LARGEST_LINEAR = 1.0
"""Metres that a fixed mark may be off in plan for its effect to be linear: across a sight of 50 m the neglected second
order is s²/2D, a centimetre. Free marks are linearised again where they stand, a fixed one is not."""

MOST_RELEASED, MOST_RELEASED_OF_LARGE = 10, 3
"""Marks tried at most, those whose observations misclose most first: each is a search of its own."""


def doubtful(found: Round) -> bool:
    """Whether the control of the job may be grossly wrong: the search did not come to rest or left gross residuals, or
    names, or leaves standing, control so far off that the size is not to be relied on."""
    return not found.plausible or _names_control_far_off(found)


def _names_control_far_off(found: Round) -> bool:
    """Fixed in plan, by itself or as what may stand in the place of an observation as far off."""
    diagnosis, hypothesis = found.diagnosis, found.hypotheses.hypothesis
    for number in diagnosis.chosen:
        size = np.abs(diagnosis.allowed.errors[diagnosis.allowed.own(number)]).max()
        if hypothesis(number).unit == "m" and size > LARGEST_LINEAR:
            suspects = map(hypothesis, (number, *diagnosis.alternatives(number)))
            if any(_fixed_in_plan(found.system.job, suspect) for suspect in suspects):
                return True
    return False


def _fixed_in_plan(job: Job, suspect: Hypothesis) -> bool:
    """Whether it is about plan coordinates that are held."""
    if suspect.nature != "control" or suspect.mark is None or not set(suspect.components) <= set(PLAN):
        return False
    return bool(job.marks.control[suspect.mark, 0] == Control.FIXED)


def tell_released(found: Round, folder: str | Path | None) -> Findings | None:
    """The findings with one mark's control released, the one that costs least; None where none explains the job
    better than `found`. The others that would do as well are told as its alternatives."""
    released = sorted(_released(found), key=lambda one: (one.cost, one.mark, one.part))
    if not released or found.left - released[0].cost <= _equal(found):
        return None
    best, others = released[0], released[1:]
    standing = [other for other in others if other.cost <= best.cost + best.price]
    findings = tell(best.found, folder)
    blunders = [*findings.blunders, best.blunder(standing, folder)]
    return replace(findings, blunders=tuple(sorted(blunders, key=lambda blunder: -blunder.test / blunder.critical)))


def _equal(found: Round) -> float:
    """Difference of cost within which two explanations fit equally well: T, or what it is of ln vᵀPv."""
    return EQUAL / max(found.system.freedom, 1) if found.diagnosis.criterion.estimated else EQUAL


def _released(found: Round) -> Iterator[ReleasedMark]:
    """Every release that leads to a network that settles."""
    job = found.system.job
    if job.datum.mode == "inner":
        return
    most = MOST_RELEASED if len(job.marks) <= MOST_MARKS else MOST_RELEASED_OF_LARGE
    for mark in _most_contradicted(found)[:most].tolist():
        for part in np.flatnonzero(job.marks.control[mark] == Control.FIXED).tolist():
            settled = _searched(_without(job, mark, part))
            if settled is not None and not np.isnan(settled.state.geometry.coordinates[mark, 2 * part]):
                one = ReleasedMark(job, mark, part, settled)
                if one.components and np.isfinite(one.cost):
                    yield one


def _most_contradicted(found: Round) -> IntArray:
    """Fixed marks by the mean square of the misclosures of their observations, the largest first."""
    job, squares = found.system.job, found.system.linearisation.right_side**2
    total, count = np.zeros(len(job.marks)), np.zeros(len(job.marks))
    for block in found.system.model.blocks:
        own = squares[block.system_rows].reshape(-1, block.components).mean(axis=1)
        for marks in block.observations.marks.T:
            np.add.at(total, marks, own)
            np.add.at(count, marks, 1.0)
    fixed = np.flatnonzero((job.marks.control == Control.FIXED).any(axis=1) & (count > 0.0))
    return fixed[np.argsort(-total[fixed] / count[fixed], kind="stable")]


def _without(job: Job, mark: int, part: int) -> Job:
    """The job with a mark free in plan (part 0) or height (1), its coordinates no start either."""
    control, given = job.marks.control.copy(), job.marks.given.copy()
    control[mark, part] = Control.FREE
    given[mark, [0, 1] if part == 0 else [2]] = np.nan
    return replace(job, marks=replace(job.marks, control=control, given=given))


def _searched(job: Job) -> Round | None:
    """The round that settles a job; None where none does."""
    try:
        unknowns = find_unknowns(job)
        start = robust_start(job, unknowns, find_start(job, unknowns, searching=False))
        if not np.isfinite(start.geometry.coordinates[unknowns.sought]).all():
            return None
        found = Rounds(job, unknowns, State(start.geometry, start.orientations)).last()
    except HubtackError:
        return None
    return found if found.plausible else None

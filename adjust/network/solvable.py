"""Whether a network can be solved as given: connection, datum, and marks that nothing determines."""

from __future__ import annotations

import numpy as np

from adjust.arrays import IntArray
from adjust.errors import NetworkError
from adjust.job import Job
from adjust.network.hinges import Hinge, find_hinges
from adjust.network.parts import Part, Structure, height_parts, plan_parts, structure_of
from adjust.network.shortfall import undetermined
from adjust.network.wording import listed, names_of
from adjust.unknowns import Unknowns

CURES = {
    "position": "fix or weight the plan coordinates of one of its marks",
    "rotation": "fix or weight the plan coordinates of one more mark, or observe an azimuth",
    "scale": "fix or weight the plan coordinates of one more mark, or observe a distance",
    "height": "fix or weight the height of one of its marks",
}
"""What gives a part the datum element that it lacks."""

FREE_NETWORK = 'or set [datum] mode = "inner" in job.toml to adjust a free network'


def check_solvable(job: Job, unknowns: Unknowns) -> None:
    """Check all that can be told without coordinates.

    Raises NetworkError, naming the marks, what is missing and what would cure it: unconnected parts, datum elements
    that nothing fixes, marks that too few observations touch, figures that hang on one mark. What depends on the
    geometry (a danger circle, sights that hardly cross) shows when a start is sought or the system is solved.
    """
    complaint = _Complaint(job)
    structure = structure_of(job, unknowns)
    failing = undetermined(structure)
    _check_parts(complaint, structure, np.array([mark for marks in failing.values() for mark in marks], dtype=np.int64))
    for reason, marks in failing.items():
        complaint.add(marks, reason)
    complaint.raise_if_any()
    for hinge in find_hinges(structure):
        complaint.add(hinge.moving, _hinge_reason(job, hinge))
    complaint.raise_if_any()


class _Complaint:
    """Sentences about marks, raised together."""

    def __init__(self, job: Job) -> None:
        self.job = job
        self.sentences: list[str] = []
        self.marks: dict[str, None] = {}

    def add(self, marks: IntArray | list[int], reason: str) -> None:
        """Complain of some marks."""
        names = names_of(self.job, marks)
        self.marks |= dict.fromkeys(names)
        self.sentences.append(f"{listed(names)}: {reason}")

    def raise_if_any(self) -> None:
        """Raises NetworkError where there is a complaint."""
        if self.sentences:
            heading = "the network cannot be solved as given"
            raise NetworkError("\n".join([heading, *self.sentences]), tuple(self.marks))


def _check_parts(complaint: _Complaint, structure: Structure, failing: IntArray) -> None:
    """Complain of parts without a datum; marks that are `failing` by themselves have their own."""
    standing = structure.unknowns.sought[:, 0].copy()
    standing[failing] = False
    plan = tuple(part for part in plan_parts(structure) if standing[part.marks].any())
    heights = height_parts(structure)
    if structure.job.datum.mode == "inner":
        _check_one_piece(complaint, plan, "plan")
        _check_one_piece(complaint, heights, "height")
        return
    for part in plan:
        if part.missing:
            complaint.add(part.marks, _plan_reason(part, structure))
    for part in heights:
        if part.missing:
            complaint.add(part.marks, f"no height here is fixed; {CURES['height']}, {FREE_NETWORK}")


def _check_one_piece(complaint: _Complaint, parts: tuple[Part, ...], where: str) -> None:
    """A free network must hang together: inner constraints fix one datum, not one for each part."""
    if len(parts) > 1:
        for part in parts:
            complaint.add(
                part.marks,
                f"not joined in {where} to the rest of this free network; observe what joins them, "
                "or adjust the parts one by one",
            )


def _plan_reason(part: Part, structure: Structure) -> str:
    unfixed = [_named(name) for name in ("position", "rotation", "scale") if _lacks(part, name)]
    cures = [CURES[name] for name in ("position", "rotation", "scale") if _lacks(part, name)]
    reason = f"nothing here fixes the {_enumerated(unfixed)}; {'; '.join(dict.fromkeys(cures))}"
    return reason if np.any(structure.held_plan) else f"{reason}, {FREE_NETWORK}"


def _lacks(part: Part, name: str) -> bool:
    return ("east" if name == "position" else name) in part.missing


def _named(name: str) -> str:
    return "position (east and north)" if name == "position" else name


def _enumerated(words: list[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def _hinge_reason(job: Job, hinge: Hinge) -> str:
    motions = [word for word, moves in (("turn about", hinge.turns), ("grow or shrink from", hinge.grows)) if moves]
    cures = [CURES[name] for name, moves in (("rotation", hinge.turns), ("scale", hinge.grows)) if moves]
    name = job.marks.names[hinge.mark]
    return f"can {' and '.join(motions)} mark {name}, the only tie to control; {'; '.join(cures)}"

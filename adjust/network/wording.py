"""Names of marks in sentences."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from adjust.arrays import IntArray
from adjust.job import Job

NAMED = 8
"""Marks named in one sentence: enough to find the place, few enough to read."""


def listed(names: Sequence[str], noun: str = "mark") -> str:
    """`mark P`, `marks P and Q`, `marks P, Q, R … and 12 more`."""
    if len(names) == 1:
        return f"{noun} {names[0]}"
    if len(names) > NAMED:
        return f"{noun}s {', '.join(names[:NAMED])} … and {len(names) - NAMED} more"
    return f"{noun}s {', '.join(names[:-1])} and {names[-1]}"


def names_of(job: Job, marks: IntArray | Iterable[int]) -> list[str]:
    """Names of marks by their rows."""
    return [job.marks.names[mark] for mark in marks]

"""What one job is held against: the standards it names, and figures of its own."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from adjust.standards.published import ACCURACY_STANDARDS
from adjust.standards.requirements import Requirement


@dataclass(frozen=True)
class Specification:
    """What `[specification]` of the job file says.

    `standards` are keys of `ACCURACY_STANDARDS`; `own` figures are held against beside them. `pairs` are the pairs of
    marks that an observation joins, or all pairs; `marks` (indices; empty: all) limits both to some of the marks.
    """

    standards: tuple[str, ...] = ()
    own: tuple[Requirement, ...] = ()
    pairs: Literal["observed", "all"] = "observed"
    marks: tuple[int, ...] = ()

    @property
    def requirements(self) -> tuple[Requirement, ...]:
        """All that has to hold: the standards' figures, then the job's own."""
        published = (figure for name in self.standards for figure in ACCURACY_STANDARDS[name].requirements)
        return (*published, *self.own)

"""Another mark sighted, occupied or levelled to than the one that was booked."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.context import Correction
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect


class AnotherMark:
    """Any mark of the job in the place of one of the row's, or of the group's."""

    name = "another mark"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every mark whose position would do."""
        if suspect.nature in ("station", "target"):
            return self._for_group(suspect)
        if not suspect.kind or suspect.kind == "control" or suspect.size < len(suspect.context.observations.components):
            return None
        row = suspect.row_itself
        own = [place for place, role in enumerate(row.roles) if role != "at" or row.setup is None]
        return Candidates.together([self._in_role(suspect, place) for place in own])

    @staticmethod
    def _in_role(suspect: Suspect, place: int) -> Candidates | None:
        row = suspect.row_itself
        marks = np.setdiff1d(np.arange(len(suspect.job.marks)), row.marks[0])
        errors = suspect.error_if(suspect.with_marks(marks, place))
        names, role = suspect.job.marks.names, row.roles[place]
        written, lines = names[row.marks[0, place]], suspect.lines

        def remedy(number: int, error: FloatArray) -> Remedy:
            mark = names[marks[number]]
            detail = f"{role} {mark} in place of {written}"
            replacement = suspect.with_marks(marks[number : number + 1], place)
            corrections = tuple(Correction(source, role, mark) for source, _ in lines)
            return Remedy("another mark", detail, corrections, replacement)

        return Candidates(errors, np.full(len(marks), 1 / len(names)), remedy)

    @staticmethod
    def _for_group(suspect: Suspect) -> Candidates | None:
        """The whole setup stood on another mark, or everybody sighted another."""
        geometry, mark = suspect.context.geometry, suspect.mark
        marks = np.setdiff1d(np.arange(len(suspect.job.marks)), [mark])
        start = np.repeat(geometry.coordinates[mark : mark + 1], len(marks), axis=0)
        errors = suspect.job.frame.displacement(start, geometry.coordinates[marks])[:, : suspect.size]
        names = suspect.job.marks.names
        did = "the instrument stood on" if suspect.nature == "station" else "the target stood on"

        def remedy(number: int, error: FloatArray) -> Remedy:
            return Remedy(f"{did} {names[marks[number]]}, not on {names[mark]}")

        return Candidates(errors, np.full(len(marks), 1 / len(names)), remedy)

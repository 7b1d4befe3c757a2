"""A slope distance in the column of horizontal ones, or the reverse."""

from __future__ import annotations

import numpy as np

from adjust.blunders.context import Correction
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect
from adjust.observations import HorizontalDistances, Observations, SlopeDistances


class SlopeAsHorizontal:
    """The value is right and stands in the wrong column."""

    name = "slope as horizontal"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The value as the other kind of distance."""
        row = suspect.row_itself
        common = {"marks": row.marks, "observed": row.observed, "provenance": row.provenance}
        if suspect.kind == "horizontal_distance":
            other: Observations = SlopeDistances(**common, precision=row.precision, heights=np.zeros((1, 2)))
            columns, what = ("horizontal", "slope"), "a slope distance booked as horizontal"
        elif suspect.kind == "slope_distance":
            other = HorizontalDistances(**common, precision=row.precision)
            columns, what = ("slope", "horizontal"), "a horizontal distance booked as slope"
        else:
            return None
        errors = suspect.error_if(other)
        return Candidates.listed(errors, [Remedy(what, "", self._corrections(suspect, *columns), other)])

    @staticmethod
    def _corrections(suspect: Suspect, written: str, meant: str) -> tuple[Correction, ...]:
        if not suspect.values:
            return ()
        entry = suspect.values[0]
        moved = Correction(entry.source, entry.cell.title.replace(written, meant, 1), entry.cell.text)
        return (entry.correction(""), moved)

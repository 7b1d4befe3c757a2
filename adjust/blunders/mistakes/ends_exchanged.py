"""The two marks of a line, or back and fore of an angle, booked the wrong way round."""

from __future__ import annotations

from dataclasses import dataclass

from adjust.blunders.context import Correction
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect

REVERSED = ("height_difference", "vector")
"""Kinds whose value changes its sign and nothing else, so that no network can tell the exchange from a lost sign."""


@dataclass(frozen=True)
class Exchange:
    """The columns of two marks changed over, for the kinds in which that shows."""

    name: str
    words: str
    kinds: tuple[str, ...]
    roles: tuple[str, str]

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The row with the two marks changed over."""
        if suspect.kind not in self.kinds or (suspect.kind == "vector" and suspect.size < 3):
            return None
        row = suspect.row_itself
        roles = ("at", "to") if "from" not in row.roles else self.roles
        first, second = (row.roles.index(role) for role in roles)
        marks = row.marks.copy()
        marks[:, [first, second]] = marks[:, [second, first]]
        other = suspect.copies(1, marks=marks)
        names = [suspect.job.marks.names[mark] for mark in marks[0, [first, second]]]
        source = suspect.lines[0][0]
        corrections = tuple(Correction(source, role, name) for role, name in zip(roles, names, strict=True))
        detail = f"{roles[0]} {names[0]} {roles[1]} {names[1]} in place of the reverse"
        errors = 2.0 * suspect.observed[None] if suspect.kind in REVERSED else suspect.error_if(other)
        return Candidates.listed(errors, [Remedy(self.words, detail, corrections, other)])


ENDS_EXCHANGED = Exchange(
    "from and to exchanged",
    "the ends exchanged",
    ("height_difference", "vector", "azimuth", "zenith"),
    ("from", "to"),
)
BACK_AND_FORE = Exchange("back and fore exchanged", "back and fore exchanged", ("angle",), ("from", "to"))

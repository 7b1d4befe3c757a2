"""One digit taken for another."""

from __future__ import annotations

from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.suspect import Suspect

LOOK_ALIKE = frozenset({"06", "08", "17", "27", "35", "38", "49", "56", "68"})
"""Figures that look alike in a quick hand or on a dim display: common practice, no source."""
LIKENESS = {"alike": 4.0, "next": 2.0, "other": 0.5}
"""How often figures that look alike, that follow each other on a scale, and others are taken for each other: a guess,
no source."""


class DigitMisread:
    """A 1 for a 7, a 3 for an 8, or the next figure of a scale."""

    name = "digit misread"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every other digit in every place of every number of the suspect."""
        parts = []
        for entry in suspect.numbers:
            text = entry.cell.text
            choices = [(place, other) for place in entry.notation.digits() for other in "0123456789"]
            choices = [(place, other) for place, other in choices if other != text[place]]
            parts.append(
                entry.candidates(
                    [text[:place] + other + text[place + 1 :] for place, other in choices],
                    [f"digit {other} taken for {text[place]}" for place, other in choices],
                    [likeness(text[place], other) for place, other in choices],
                )
            )
        return Candidates.together(parts)


def likeness(first: str, second: str) -> float:
    """How often one figure is taken for the other, as a multiple."""
    if "".join(sorted((first, second))) in LOOK_ALIKE:
        return LIKENESS["alike"]
    return LIKENESS["next" if abs(int(first) - int(second)) == 1 else "other"]

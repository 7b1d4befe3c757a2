"""Two neighbouring digits changed over while copying."""

from __future__ import annotations

from itertools import pairwise

from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.notation import Notation
from adjust.blunders.mistakes.suspect import Suspect


class DigitsExchanged:
    """187.564 written 187.654; also across the decimal point, not from minutes to seconds."""

    name = "digits exchanged"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every pair of neighbours in every number of the suspect."""
        parts = []
        for entry in suspect.numbers:
            text, pairs = entry.cell.text, neighbours(entry.notation)
            others = [exchanged(text, first, second) for first, second in pairs]
            whats = [f"digits {text[second]} and {text[first]} exchanged" for first, second in pairs]
            parts.append(entry.candidates(others, whats))
        return Candidates.together(parts)


def neighbours(notation: Notation) -> list[tuple[int, int]]:
    """Places of neighbouring digits that differ."""
    text = notation.text
    return [
        (first, second)
        for first, second in pairwise(notation.digits())
        if text[first] != text[second] and text[first + 1 : second] in ("", ".", ",")
    ]


def exchanged(text: str, first: int, second: int) -> str:
    """The text with two of its signs changed over."""
    signs = list(text)
    signs[first], signs[second] = signs[second], signs[first]
    return "".join(signs)

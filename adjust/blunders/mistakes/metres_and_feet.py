"""Feet booked as metres, metres as feet, one foot as the other."""

from __future__ import annotations

import numpy as np

from adjust.blunders.context import Correction
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.notation import Notation
from adjust.blunders.mistakes.suspect import Suspect
from adjust.units import INTERNATIONAL_FOOT, LENGTH_ENDINGS, US_SURVEY_FOOT

METRIC = {
    "feet booked as metres": INTERNATIONAL_FOOT,
    "US survey feet booked as metres": US_SURVEY_FOOT,
    "taken for feet and made metres once too often": 1 / INTERNATIONAL_FOOT,
}
"""What a length in a metric column is multiplied by to be right."""
FEET = {
    "metres booked as feet": 1 / INTERNATIONAL_FOOT,
    "made feet twice": INTERNATIONAL_FOOT,
}
FOOT_OF = {
    "ft": {"US survey feet booked as international feet": US_SURVEY_FOOT / INTERNATIONAL_FOOT},
    "usft": {"international feet booked as US survey feet": INTERNATIONAL_FOOT / US_SURVEY_FOOT},
}
SHARES = (3.0, 1.0, 1.0)
"""The first of each list is the likeliest: a guess, no source."""


class MetresAndFeet:
    """The digits are right, the unit of the column is another's."""

    name = "metres and feet"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The same digits in every other unit of length."""
        if suspect.context.hypothesis.unit != "m":
            return None
        if suspect.kind == "vector" and suspect.size == 3:
            return self._of_vector(suspect)
        parts = []
        for entry in suspect.values:
            if entry.cell.text and entry.notation.ending in LENGTH_ENDINGS:
                factors = factors_of(entry.notation)
                values, whats = entry.value * np.array([*factors.values()]), list(factors)
                parts.append(entry.valued(values, whats.__getitem__, np.array(SHARES[: len(whats)])))
        return Candidates.together(parts)

    @staticmethod
    def _of_vector(suspect: Suspect) -> Candidates:
        """All components together."""
        factors = factors_of(suspect.values[0].notation)
        remedies = []
        for what, factor in factors.items():
            corrections = tuple(
                Correction(entry.source, entry.cell.title, entry.notation.write(factor * entry.value))
                for entry in suspect.values
            )
            texts = ", ".join(correction.text for correction in corrections)
            remedies.append(Remedy(what, texts, corrections))
        errors = [(1 - factor) * suspect.observed for factor in factors.values()]
        return Candidates.listed(errors, remedies, SHARES[: len(errors)])


def factors_of(notation: Notation) -> dict[str, float]:
    """What a cell's value is multiplied by, by what was done."""
    return FEET | FOOT_OF[notation.ending] if notation.ending in FOOT_OF else METRIC

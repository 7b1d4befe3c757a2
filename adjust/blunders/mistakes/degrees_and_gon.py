"""Degrees booked as gon, gon as degrees, minutes and seconds as decimals."""

from __future__ import annotations

import numpy as np

from adjust.blunders.mistakes.interface import Candidates
from adjust.blunders.mistakes.notation import Notation
from adjust.blunders.mistakes.suspect import Suspect
from adjust.units import DEGREE, GON

PACKED = "degrees, minutes and seconds booked as decimals"


class DegreesAndGon:
    """The digits are right, the unit of the column is another's."""

    name = "degrees and gon"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The same digits in every other unit."""
        if not suspect.angular:
            return None
        parts = []
        for entry in suspect.values:
            others = {what: value for what, value in meanings(entry.notation).items() if np.isfinite(value)}
            whats = list(others)
            if whats:
                parts.append(entry.valued(suspect.in_range(np.array([*others.values()])), whats.__getitem__))
        return Candidates.together(parts)


def meanings(notation: Notation) -> dict[str, float]:
    """What the digits of a cell would mean in other units, radians; NaN where they can not."""
    if notation.sexagesimal:
        number = decimal_of(notation.text)
        return {
            "gon booked as degrees, minutes and seconds": number * GON,
            "decimals of a degree booked as minutes and seconds": number * DEGREE,
        }
    number = notation.number / notation.unit
    if notation.ending == "deg":
        return {"gon booked as degrees": number * GON, PACKED: sexagesimal_of(number)}
    if notation.ending == "gon":
        return {"degrees booked as gon": number * DEGREE, PACKED: sexagesimal_of(number)}
    return {}


def decimal_of(text: str) -> float:
    """123-45-06.7 as the decimal number 123.45067; NaN where it is not written so."""
    parts = "".join(sign if sign.isdigit() else " " for sign in text).split()
    if len(parts) < 3:
        return np.nan
    sign = -1.0 if text.startswith("-") else 1.0
    return sign * float(f"{parts[0]}.{parts[1].zfill(2)}{parts[2].zfill(2)}{''.join(parts[3:])}")


def sexagesimal_of(number: float) -> float:
    """123.45067 read as 123° 45′ 06.7″, radians; NaN where minutes or seconds would reach 60."""
    degrees, rest = divmod(abs(number), 1.0)
    minutes, seconds = divmod(round(rest * 1e4, 6), 100.0)
    if minutes >= 60 or seconds >= 60:
        return np.nan
    return float(np.copysign((degrees + minutes / 60 + seconds / 3600) * DEGREE, number))

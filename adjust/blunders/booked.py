"""The numbers of the book that a blunder rests on: what stands there, and what the network expects in their place."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from adjust.angles import FULL_TURN
from adjust.blunders.context import Context
from adjust.blunders.mistakes.entry import Entry
from adjust.blunders.mistakes.suspect import Suspect
from adjust.units import ANGLE_ENDINGS

STEP = {True: 1e-6, False: 1e-3}
"""By how much an angle (rad) or a length (m) is changed to see what that does to the error: small beside any error that
shows, large beside rounding."""


@dataclass(frozen=True)
class Booked:
    """One cell of the book, `source` its file and line, `title` its column.

    `expected` is what would stand there, in its notation, if nothing but this cell were wrong (of a vector or a
    position: nothing but its components); blank where the cell is.
    """

    source: str
    title: str
    text: str
    expected: str


def booked(context: Context) -> tuple[Booked, ...]:
    """The cells of a single suspect, of a control mark or of a shared height; none of any other group."""
    return tuple(_booked(Suspect(context)))


def _booked(suspect: Suspect) -> Iterator[Booked]:
    for entry in suspect.values:
        if entry.cell.text:
            yield Booked(entry.source, entry.cell.title, entry.cell.text, _expected(suspect, entry))


def _expected(suspect: Suspect, entry: Entry) -> str:
    """x − (∇ · d) / (d · d): d is what one unit of the cell makes of the error ∇."""
    written = entry.value
    angular = entry.notation.ending in ANGLE_ENDINGS
    step = STEP[angular]
    here, further = entry.error_of(np.array([written, written - step]))
    effect = (further - here) / step
    if not np.isfinite(effect).all() or not effect.any():
        return ""
    value = written - float(suspect.context.estimated_error @ effect / (effect @ effect))
    if angular and entry.name in ("direction", "angle", "azimuth", "circle"):
        return entry.notation.write(value % FULL_TURN)
    return "" if entry.name in ("slope", "horizontal") and value <= 0.0 else entry.notation.write(value)

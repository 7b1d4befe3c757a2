"""What a misclosure looks like: its size and direction often say which mistake was made, and where."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, FloatArray
from adjust.network.closures.closures import Judged
from adjust.network.closures.linear import Traversing
from adjust.network.closures.observed import Observed
from adjust.network.closures.traverse import Traverse, traverse_at

GROSS = 4.0
"""Sds of an angular misclosure beyond which an angle is wrong rather than a length: once in 16 000 by chance."""
MOST_CLUES = 100
"""Failing closures, the worst of each check, that are looked into: a screen or two of text."""
TELLING = 20.0
"""A figure is telling when the next one lies that many allowances away: one misclosure in ten hits one by chance."""
LENGTH_SLIPS = tuple(digit * 10.0**power for power in (-2, -1, 0, 1, 2) for digit in range(1, 10))
"""Metres: one digit misread, from centimetres to hundreds of metres."""
ANGLE_SLIPS = (1 / 60, 1 / 6, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 30.0, 60.0, 90.0, 180.0, 0.9, 9.0)
"""Degrees: a minute, ten of them or a degree misread, a graduation of ten, a wrong face; 1 and 10 gon."""


@dataclass(frozen=True)
class Clue:
    """What one failing closure suggests: `check` and its place `closure` there, in words, and which observations."""

    check: str
    closure: int
    text: str
    rows: tuple[int, ...] = ()


def find_clues(observed: Observed, checks: Sequence[Judged], traverses: Traversing) -> Iterator[Clue]:
    """Clues of every check's failing closures, the worst first."""
    first = {"traverse_loop": 0, "traverse_link": int(traverses.closed.sum())}
    for judged in checks:
        check = judged.closures.check
        worst = np.argsort(-judged.severity, kind="stable")[: min(MOST_CLUES, int(judged.exceeds.sum()))]
        for number in worst.tolist():
            yield from _slips(judged, number)
            yield from _turned(observed, judged, number)
            if check in first:
                traverse = traverse_at(traverses, first[check] + number)
                yield from _on_the_way(observed, traverse, float(judged.allowed[number, 0]), check, number)


def _slips(judged: Judged, number: int) -> Iterator[Clue]:
    closures = judged.closures
    if len(closures.components) > 1 or "traverse" in closures.check:
        return
    text = slip(float(closures.misclosure[number, 0]), float(judged.allowed[number, 0]), closures.unit)
    if text:
        yield Clue(closures.check, number, f"the misclosure is {text}")


def slip(misclosure: float, allowed: float, unit: str) -> str:
    """The round figure that a misclosure nearly is, in words; "" where it is none that tells anything."""
    if unit == "m":
        figure = min(LENGTH_SLIPS, key=lambda slip: abs(slip - abs(misclosure)))
        step, name = 10.0 ** np.floor(np.log10(figure) + 1e-9), f"{figure:g} m"
    else:
        figure = float(np.radians(min(ANGLE_SLIPS, key=lambda slip: abs(np.radians(slip) - abs(misclosure)))))
        step, name = figure, _angle_name(figure)
    close = abs(figure - abs(misclosure)) <= allowed
    return f"nearly {name}" if close and step >= TELLING * allowed else ""


def _angle_name(angle: float) -> str:
    degrees = float(np.degrees(angle))
    if round(degrees / 0.9, 6) in (1.0, 10.0):
        return f"{degrees / 0.9:.0f} gon"
    return f"{degrees:g}°" if degrees >= 0.5 else f"{degrees * 60:g}′"


def _turned(observed: Observed, judged: Judged, number: int) -> Iterator[Clue]:
    """Rises of a failing closure that would close it if they ran the other way."""
    closures = judged.closures
    misclosure, allowed = abs(float(closures.misclosure[number, 0])), float(judged.allowed[number, 0])
    for row in closures.rows[number].tolist():
        rows, place = observed.place(row)
        twice = 2.0 * abs(float(rows.observed[place, 0]))
        if rows.kind == "height_difference" and twice > allowed and abs(misclosure - twice) <= allowed:
            text = f"with the ends of {observed.source(row)} exchanged it would close"
            yield Clue(closures.check, number, text, (row,))


def doubtful_angles(traverse: Traverse, allowed: float) -> list[int]:
    """Corners (by the leg that leaves them) of a traverse where all of its angular misclosure would explain where it
    ends.

    With one angle wrong by w the legs behind it are turned about its mark, so that the end is off by (R(w) − 1) times
    what leads from the mark to the end: the old rule that the perpendicular bisector of the misclosure passes through
    the mark (Ghilani & Wolf, *Elementary Surveying*, section on locating blunders in traverses; from memory).
    """
    if not traverse.angular:
        return []
    sine, cosine = np.sin(traverse.angular), np.cos(traverse.angular)
    at = np.vstack([np.zeros(2), np.cumsum(traverse.unbalanced, axis=0)])
    closed = traverse.marks[0] == traverse.marks[-1]
    ahead = at[-1] - (at[:-1] if closed else at)
    unturned = np.column_stack([ahead[:, 0] * cosine - ahead[:, 1] * sine, ahead[:, 1] * cosine + ahead[:, 0] * sine])
    left = at[-1] - traverse.arrival - (ahead - unturned)
    return _numbers(np.hypot(*left.T) <= allowed)


def doubtful_legs(traverse: Traverse, allowed: float) -> list[int]:
    """Legs that the linear misclosure runs along: their length wrong by it would explain it (same source)."""
    length = np.hypot(*traverse.steps.T)
    along = traverse.steps / length[:, None]
    across: FloatArray = np.abs(along[:, 0] * traverse.misclosure[1] - along[:, 1] * traverse.misclosure[0])
    return _numbers(across <= allowed)


def _numbers(mask: BoolArray) -> list[int]:
    numbers: list[int] = np.flatnonzero(mask).tolist()
    return numbers


def _on_the_way(observed: Observed, traverse: Traverse, allowed: float, check: str, number: int) -> Iterator[Clue]:
    """Where a traverse that does not close is likely to be wrong, if it is wrong in one place."""
    names = observed.job.marks.names
    sites = [names[mark] for mark in traverse.marks]
    if abs(traverse.angular) > GROSS * traverse.angular_sd:
        corners = doubtful_angles(traverse, allowed)
        if 0 < len(corners) < len(traverse.steps):
            text = f"one wrong angle, at {' or '.join(sites[corner] for corner in corners)}, would explain it"
            rows = (row for corner in corners for row in traverse.corner_rows.get(corner, ()))
            yield Clue(check, number, text, tuple(rows))
        return
    legs = doubtful_legs(traverse, allowed)
    if 0 < len(legs) < len(traverse.steps):
        text = f"one wrong length, {' or '.join(f'{sites[leg]}–{sites[leg + 1]}' for leg in legs)}, would explain it"
        yield Clue(check, number, text, tuple(row for leg in legs for row in traverse.leg_rows[leg]))

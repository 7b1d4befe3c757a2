"""Which of two possible points of a mark is right, by what follows from each for the marks around it.

A mark with two distances lies on either side of the line between its neighbours. Following both sides until an
observation objects is the branch-and-prune search of Liberti, Lavor & Maculan (2008), *International Transactions in
Operational Research* 15(1), 1–17, confined to the surroundings of one mark: in a net of measured triangles those around
an inner mark close the horizon only if none of them is folded over.
"""

from __future__ import annotations

import math

from adjust.network.constructions.point import refutes
from adjust.network.figure import Figure

LOOKAHEAD = 5
"""Undecided marks that are followed together, 32 combinations: enough for eight triangles around one mark."""

FOLLOWED = 30
"""Marks placed at most on the strength of one assumption; further off, new evidence seldom bears on it."""


def grow_decidedly(figure: Figure) -> None:
    """Grow a figure; wherever it is stuck between two points of a mark, decide and grow on."""
    figure.grow()
    tried: dict[int, tuple[complex, ...]] = {}
    while (choice := _decidable(figure, tried)) is not None:
        figure.place(*choice)
        figure.grow()


def _decidable(figure: Figure, tried: dict[int, tuple[complex, ...]]) -> tuple[int, complex] | None:
    """The first undecided mark that can be decided, with its point. `tried` remembers what could not be."""
    for mark, points in list(figure.rivals.items()):
        if tried.get(mark) != points:
            point = decided(figure, mark)
            if point is not None:
                return mark, point
            tried[mark] = points
    return None


def decided(figure: Figure, mark: int) -> complex | None:
    """The one of a mark's two points that the marks around it, or around one of its neighbours, leave standing."""
    points = figure.rivals[mark]
    survey = figure.survey
    pivots = [mark, *(other for other in survey.neighbours(mark) if other in figure.points)]
    for pivot in dict.fromkeys(pivots):
        around = set(survey.neighbours(pivot))
        strains = [_strain(figure, mark, point, around, LOOKAHEAD, math.inf) for point in points]
        better, worse = (0, 1) if strains[0] <= strains[1] else (1, 0)
        if refutes(strains[worse], strains[better]):
            return points[better]
    return None


def _strain(figure: Figure, mark: int, point: complex, around: set[int], depth: int, bound: float) -> float:
    """The least that observations object to a mark at a point, undecided marks `around` followed both ways.

    A branch that reaches `bound` is followed no further: another one is better.
    """
    with figure.trial():
        figure.place(mark, point)
        figure.grow(FOLLOWED)
        strain = figure.strain
        following = next((other for other in figure.rivals if other in around), None)
        if depth == 0 or following is None or strain >= bound:
            return strain
        least = bound
        for rival in figure.rivals[following]:
            least = min(least, _strain(figure, following, rival, around, depth - 1, least))
        return least

"""Where figures of their own begin: at a round with its station as the origin, or at a single distance."""

from __future__ import annotations

import cmath
from collections.abc import Iterator

from adjust.network.deciding import grow_decidedly
from adjust.network.figure import Figure
from adjust.network.survey import Survey

Seed = tuple[int, int | None]
"""(round, None), or the two ends of a distance."""


def rounds_in_order(survey: Survey) -> list[int]:
    """Rounds with a distance along one of their rays first, then those with many rays."""

    def rank(number: int) -> tuple[bool, int, int]:
        return not _has_distance(survey, number), -len(survey.sights[number]), number

    return sorted(range(len(survey.station)), key=rank)


def lines_in_order(survey: Survey) -> Iterator[tuple[int, int]]:
    """The two ends of every distance."""
    for mark, distances in enumerate(survey.distances):
        for other in distances:
            if other > mark:
                yield mark, other


def figure_from_round(survey: Survey, number: int) -> Figure | None:
    """The figure that grows from a round: in metres if it measured a distance, else its first side is 1.

    Without a distance every side of the round is tried until one grows, sides that were observed from both ends first.
    None where none does.
    """
    if _has_distance(survey, number):
        return _grown_figure(survey, number, None)
    sides = sorted(survey.sights[number], key=lambda target: not survey.rounds[target])
    for target in sides if len(sides) > 1 else ():
        figure = _grown_figure(survey, number, target)
        if figure is not None:
            return figure
    return None


def figure_from_line(survey: Survey, one: int, other: int) -> Figure | None:
    """The figure that grows from a distance by distances alone, perhaps a mirror image; None where none does."""
    figure = Figure(survey, scaled=True, handed=False)
    figure.place(one, 0j)
    figure.place(other, survey.distances[one][other] + 0j)
    grow_decidedly(figure)
    return figure if len(figure.points) > 2 else None


def _has_distance(survey: Survey, number: int) -> bool:
    measured = survey.distances[survey.station[number]]
    return any(target in measured for target in survey.sights[number])


def _grown_figure(survey: Survey, number: int, side: int | None) -> Figure | None:
    """From a station at the origin and its round with zero to the north; `side` is a target to be put at 1."""
    figure = Figure(survey, scaled=side is None)
    figure.place(survey.station[number], 0j)
    figure.orient(number, 0.0)
    if side is not None:
        figure.place(side, cmath.rect(1.0, survey.sights[number][side]))
    grow_decidedly(figure)
    return figure if len(figure.points) > (1 if side is None else 2) else None

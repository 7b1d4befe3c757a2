"""What a figure knows about a mark that is not in it yet."""

from __future__ import annotations

import cmath
from typing import TYPE_CHECKING

from adjust.network.constructions.loci import Arc, Circle, Locus, Ray
from adjust.network.constructions.point import Pencil, consensus
from adjust.network.constructions.similarity import free_station

if TYPE_CHECKING:
    from adjust.network.figure import Figure


def polar_point(figure: Figure, mark: int) -> complex | None:
    """The mark from a distance and an oriented ray along the same line; the median where there are several."""
    if not figure.scaled:
        return None
    points = []
    for other, length in figure.survey.distances[mark].items():
        origin = figure.points.get(other)
        if origin is not None and (direction := _direction(figure, other, mark)) is not None:
            points.append(origin + length * direction)
    return consensus(points) if points else None


def free_station_point(figure: Figure, mark: int) -> complex | None:
    """The mark from a round on it and distances to two or more of the targets."""
    if not (figure.scaled and figure.handed):
        return None
    distances = figure.survey.distances[mark]
    for number in figure.survey.rounds[mark]:
        if number in figure.orientations:
            continue
        sights = figure.survey.sights[number]
        seen = [target for target in sights if target in distances and target in figure.points]
        if len(seen) > 1:
            readings = [(sights[target], distances[target]) for target in seen]
            point = free_station(readings, [figure.points[target] for target in seen])
            if point is not None:
                return point
    return None


def loci_of(figure: Figure, mark: int) -> list[Locus]:
    """All loci of a mark: rays, each line once; circles; arcs over neighbouring targets of its own round."""
    loci: list[Locus] = [*_rays(figure, mark), *figure.hints.get(mark, ())]
    if figure.scaled:
        distances = figure.survey.distances[mark].items()
        loci += [Circle(figure.points[other], length) for other, length in distances if other in figure.points]
    for pencil in pencils_of(figure, mark):
        for k in range(len(pencil.targets) - 1):
            angle = pencil.readings[k + 1] - pencil.readings[k]
            loci.append(Arc(pencil.targets[k], pencil.targets[k + 1], angle))
    return loci


def pencils_of(figure: Figure, mark: int) -> list[Pencil]:
    """The rounds on a mark that are not oriented and see two marks of the figure or more."""
    pencils: list[Pencil] = []
    for number in figure.survey.rounds[mark] if figure.handed else ():
        if number not in figure.orientations:
            sights = figure.survey.sights[number]
            seen = [target for target in sights if target in figure.points]
            if len(seen) > 1:
                readings = tuple(sights[target] for target in seen)
                pencils.append(Pencil(readings, tuple(figure.points[target] for target in seen)))
    return pencils


def _rays(figure: Figure, mark: int) -> list[Ray]:
    survey = figure.survey
    seeing = [survey.station[number] for number in survey.seen_by[mark]]
    seen = [target for number in survey.rounds[mark] for target in survey.sights[number]]
    rays = []
    for other in dict.fromkeys((*seeing, *seen)):
        origin = figure.points.get(other)
        if origin is not None and (direction := _direction(figure, other, mark)) is not None:
            rays.append(Ray(origin, direction))
    return rays


def _direction(figure: Figure, origin: int, mark: int) -> complex | None:
    """Direction from one mark to another by an oriented round on either; None where there is none."""
    survey, orientations = figure.survey, figure.orientations
    for number in survey.rounds[origin]:
        if number in orientations and mark in survey.sights[number]:
            return cmath.rect(1.0, orientations[number] + survey.sights[number][mark])
    for number in survey.rounds[mark]:
        if number in orientations and origin in survey.sights[number]:
            return -cmath.rect(1.0, orientations[number] + survey.sights[number][origin])
    return None

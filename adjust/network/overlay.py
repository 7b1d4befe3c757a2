"""How one figure lies over another that shares marks with it."""

from __future__ import annotations

from adjust.network.constructions.point import consensus, refutes
from adjust.network.constructions.similarity import Similarity, fit, worst_gap
from adjust.network.figure import Figure


def shared_marks(figure: Figure, host: Figure) -> list[int]:
    """Marks that have a point in both, in the order of the first."""
    return [mark for mark in figure.points if mark in host.points]


def overlay(figure: Figure, host: Figure) -> Similarity | None:
    """The transformation of a figure into the axes of its host; None where nothing tells.

    One shared mark is enough where both know north and the metre, else two. Where either can be a mirror image, a third
    one off their line or what the host knows about the figure's other marks has to tell which of the two it is.
    """
    shared = shared_marks(figure, host)
    source, target = [figure.points[mark] for mark in shared], [host.points[mark] for mark in shared]
    if shared and figure.northed and host.northed and figure.scaled and host.scaled:
        return Similarity(1.0 + 0j, consensus([aim - point for point, aim in zip(source, target, strict=True)]))
    if len(shared) < 2:
        return None
    keep_scale = figure.scaled and host.scaled
    upright = fit(source, target, keep_scale=keep_scale)
    mirrored = fit(source, target, keep_scale=keep_scale, mirrored=True)
    if upright is None or mirrored is None or (figure.handed and host.handed):
        return upright
    objections = [_objection(figure, host, similarity) for similarity in (upright, mirrored)]
    if refutes(objections[1], objections[0]):
        return upright
    return mirrored if refutes(objections[0], objections[1]) else None


def _objection(figure: Figure, host: Figure, similarity: Similarity) -> float:
    """The worst misfit, on the shared marks or on what the host observed, of a figure laid over it."""
    shared = shared_marks(figure, host)
    source, target = [figure.points[mark] for mark in shared], [host.points[mark] for mark in shared]
    gap = worst_gap(similarity, source, target) / max(abs(aim - target[0]) for aim in target)
    with host.trial():
        for mark, point in figure.points.items():
            if mark not in host.points:
                host.place(mark, similarity(point))
        return max(gap, host.strain)


def host_of_two(one: Figure, other: Figure) -> tuple[Figure, Figure]:
    """Which of two figures is to take in which: the one that knows more, then the larger one, comes second."""
    ranked = sorted((one, other), key=lambda figure: (figure.handed, figure.scaled, len(figure.points)))
    return ranked[0], ranked[1]

"""Why a mark has no start: errors that name the marks and what would give them one."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

from adjust.arrays import IntArray
from adjust.errors import NetworkError
from adjust.job import Job
from adjust.network.assembly import Assembly
from adjust.network.constructions.loci import meetings
from adjust.network.evidence import loci_of
from adjust.network.figure import Figure
from adjust.network.overlay import shared_marks
from adjust.network.wording import listed, names_of

ROUGHLY = "or give rough coordinates in marks.csv"


def plan_error(job: Job, assembly: Assembly, missing: Sequence[int]) -> NetworkError:
    """The error for marks without plan start coordinates, grouped by what is missing."""
    reasons: dict[str, list[int]] = {}
    for mark in missing:
        reasons.setdefault(_plan_reason(job, assembly, mark), []).append(mark)
    sentences = [f"{listed(names_of(job, marks))}: {reason}" for reason, marks in reasons.items()]
    return NetworkError("no start coordinates could be found\n" + "\n".join(sentences), names_of(job, missing))


def _plan_reason(job: Job, assembly: Assembly, mark: int) -> str:
    world = assembly.world
    if mark in world.rivals:
        return (
            "two positions fit the observations equally well, and nothing to choose between them; "
            f"observe a third distance or a direction, {ROUGHLY}"
        )
    if mark in world.endangered:
        return (
            "lies on the danger circle, the one through the marks it sees, where directions alone do not fix it; "
            f"observe a distance or another mark, {ROUGHLY}"
        )
    if _crosses_flatly(world, mark):
        return (
            "the sights that lead there lie on one line or nearly so (they cross at less than half a degree); "
            f"observe another mark or a distance, {ROUGHLY}"
        )
    figures = [figure for figure in assembly.figures.values() if mark in figure.points]
    if not figures:
        return (
            "the observations do not lead there from the control: too few sights to marks that can be placed; "
            f"observe another direction or distance, {ROUGHLY}"
        )
    figure = max(figures, key=lambda candidate: len(candidate.points))
    hinges = names_of(job, shared_marks(figure, world))
    if len(hinges) > 1:
        return (
            f"a figure of distances, tied to the rest at {listed(hinges)}, that could as well be its mirror image; "
            f"observe a direction or an angle, fix or weight one more of its marks, {ROUGHLY}"
        )
    if not hinges:
        return f"a figure of its own, not tied to the control; fix or weight two of its marks, {ROUGHLY}"
    return (
        f"a figure of its own, tied to the rest only at {listed(hinges)}, about which it can turn or grow; "
        f"observe an azimuth or another sight across, fix or weight one more of its marks, {ROUGHLY}"
    )


def _crosses_flatly(world: Figure, mark: int) -> bool:
    """Whether two sights or distances lead to a mark and no two of them give a point."""
    loci = loci_of(world, mark)
    return len(loci) > 1 and not any(meetings(one, other) for one, other in combinations(loci, 2))


def height_error(job: Job, missing: IntArray) -> NetworkError:
    """The error for marks whose height is sought and does not follow from any known one."""
    names = names_of(job, missing)
    return NetworkError(
        f"no start height could be found for {listed(names)}: nothing leads there from a mark of known height; observe "
        "a levelled line, a zenith angle with its distance, or a vector, or give the height in marks.csv",
        names,
    )

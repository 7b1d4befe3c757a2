"""The last resort for a few marks that no construction reaches: fit their points from many scattered beginnings.

It serves small cores whose marks depend on each other all at once, such as stations that see only each other and one
known mark each. A fit is taken only when every beginning that fits the observations fits them at the same place, and
every observation is checked by the others.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.figure import Figure
from adjust.network.working_plane import ComplexArray

MOST_MARKS = 8
"""Marks that are searched for together: beyond, scattered beginnings find too few of the possible solutions."""

BEGINNINGS = 60
"""Scattered beginnings, of which most end nowhere."""

DESCENT = 30
"""Steps of one descent, each with a difference quotient for every unknown; a descent that converges needs about ten."""

CONFIRMED = 3
"""Beginnings that have to end at the same place."""

FITTING = 2e-3
"""Largest misfit of a solution, radians or share of a distance: above the errors of the field, below false fits."""

SAME_PLACE = 0.01
"""Solutions that differ by less, as a share of the extent, are one."""

UNCHECKED = 1e-4
"""Redundancy under which an observation has no check. Where one can be left out and the rest would give way, the figure
has a second solution as a rule: Hendrickson (1992), *SIAM Journal on Computing* 21(1), 65–84."""


@dataclass(frozen=True)
class _Sights:
    """Rays and distances about the marks searched for; indices count the marks sought first, then the known ones.

    `orientation` (rays,) is NaN where the ray's round is to be oriented as it fits best.
    """

    station: IntArray
    target: IntArray
    reading: FloatArray
    round: IntArray
    orientation: FloatArray
    ends: IntArray
    length: FloatArray

    def freedom(self, marks: int) -> int:
        """Observations beyond those needed for the points of `marks` and the orientations of the rounds."""
        free = len(np.unique(self.round[np.isnan(self.orientation)]))
        return len(self.reading) + len(self.length) - free - 2 * marks

    def misfits(self, points: ComplexArray) -> FloatArray:
        """Angles between seen and observed rays, radians, then misfits of distances as shares of them."""
        line = points[self.target] - points[self.station]
        turn = line * np.exp(-1j * self.reading)
        turn /= np.maximum(np.abs(turn), np.finfo(float).tiny)
        mean = np.zeros(self.round.max(initial=-1) + 1, dtype=complex)
        np.add.at(mean, self.round, turn)
        free = np.isnan(self.orientation)
        zero = np.where(free, mean[self.round], np.exp(1j * np.nan_to_num(self.orientation)))
        length = np.abs(points[self.ends[:, 1]] - points[self.ends[:, 0]])
        return np.concatenate([np.angle(turn * zero.conj()), length / self.length - 1.0])


def search(figure: Figure, marks: list[int]) -> dict[int, complex] | None:
    """Points of some marks, by the only solution that scattered beginnings find; None where there is none, or two."""
    if not figure.points or len(marks) > MOST_MARKS:
        return None
    known, sights = _sights_about(figure, marks)
    centre, extent = _surroundings(known, sights)
    if sights.freedom(len(marks)) < 1 or extent == 0.0:
        return None
    scatter = np.random.default_rng(len(marks)).uniform(-1.0, 1.0, (BEGINNINGS, len(marks), 2))
    beginnings = list(centre + extent * (scatter[..., 0] + 1j * scatter[..., 1]))
    found: list[ComplexArray] = []
    while beginnings:
        fit = _fit(known, sights, beginnings.pop(), extent)
        if np.abs(fit.fun).max() > FITTING:
            continue
        found.append(fit.x.view(complex) * extent)
        if not _checked(sights, fit.jac) or np.abs(found[-1] - found[0]).max() > SAME_PLACE * extent:
            return None
        if len(found) == 1:
            beginnings.append(_mirrored(found[0], known))
    return dict(zip(marks, found[0].tolist(), strict=True)) if len(found) >= CONFIRMED else None


def _mirrored(points: ComplexArray, known: ComplexArray) -> ComplexArray:
    """Points mirrored about the line that the known points lie along, where distances from them would not notice."""
    centre = known.mean()
    twice_azimuth = np.angle(np.sum((known - centre) ** 2))
    mirrored: ComplexArray = centre + np.exp(1j * twice_azimuth) * (points - centre).conj()
    return mirrored


def _sights_about(figure: Figure, marks: list[int]) -> tuple[ComplexArray, _Sights]:
    """The known points about some marks, and every ray and distance between them that tells of the marks.

    A round on a mark, or one that sees a mark, counts with all its rays: they share its orientation.
    """
    survey, points = figure.survey, figure.points
    rounds = sorted({number for mark in marks for number in (*survey.rounds[mark], *survey.seen_by[mark])})
    about = [mark for number in rounds for mark in (survey.station[number], *survey.sights[number])]
    about += [other for mark in marks for other in survey.distances[mark]]
    known = [mark for mark in dict.fromkeys(about) if mark in points]
    index = {mark: place for place, mark in enumerate((*marks, *known))}
    rays = [
        (index[survey.station[number]], index[target], reading, label, figure.orientations.get(number, np.nan))
        for label, number in enumerate(rounds)
        for target, reading in survey.sights[number].items()
        if survey.station[number] in index and target in index
    ]
    lines = [
        (index[mark], index[other], length)
        for mark in marks
        for other, length in survey.distances[mark].items()
        if other in points or (other in index and mark < other)
    ]
    return np.array([points[mark] for mark in known], dtype=complex), _as_arrays(rays, lines)


def _as_arrays(rays: list[tuple[int, int, float, int, float]], lines: list[tuple[int, int, float]]) -> _Sights:
    ray_columns = np.array(rays, dtype=float).reshape(-1, 5).T
    line_columns = np.array(lines, dtype=float).reshape(-1, 3).T
    station, target, number = ray_columns[[0, 1, 3]].astype(np.int64)
    return _Sights(
        station, target, ray_columns[2], number, ray_columns[4], line_columns[:2].T.astype(np.int64), line_columns[2]
    )


def _surroundings(known: ComplexArray, sights: _Sights) -> tuple[complex, float]:
    """Centre and half-width of the square in which beginnings are scattered: what is known, and as far again."""
    if not len(known):
        return 0j, 0.0
    centre = complex(known.mean())
    extent = 2.0 * float(np.abs(known - centre).max()) + float(sights.length.max(initial=0.0))
    return centre, extent


def _fit(known: ComplexArray, sights: _Sights, beginning: ComplexArray, extent: float) -> Any:
    """Where a least-squares descent from a beginning ends, in units of the extent."""
    from scipy.optimize import least_squares

    def misfits(unknown: FloatArray) -> FloatArray:
        return sights.misfits(np.concatenate([unknown.view(complex) * extent, known]))

    start = (beginning / extent).view(float)
    return least_squares(misfits, start, method="lm", max_nfev=DESCENT * (len(start) + 1))


def _checked(sights: _Sights, jacobian: FloatArray) -> bool:
    """Whether every observation has redundancy left after it helped to fix the points and to orient its round."""
    basis = np.linalg.qr(jacobian)[0]
    leverage = np.sum(basis**2, axis=1)
    rays = np.bincount(sights.round, minlength=1)[sights.round]
    leverage[: len(rays)] += np.where(np.isnan(sights.orientation), 1.0 / rays, 0.0)
    return bool(leverage.max() < 1.0 - UNCHECKED)

"""Closures of raw readings: half-rounds, the two faces against each other, and each reading against its mean."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.closures import Closures
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import Ragged
from adjust.observations import Directions, Observations, Provenance, SlopeDistances, ZenithAngles
from adjust.reductions.outcome import FaceErrors, Horizons, PointingsReduced, Reduced, Scatter
from adjust.tolerances import Quantity

MEDIAN_EFFICIENCY = 2.0 / np.pi
"""Variance of a mean over that of a median of many normal values (Kendall & Stuart, *The Advanced Theory of
Statistics* I, chapter 14; from memory)."""

MEDIAN_DEVIATION = 0.6745
"""Median of the absolute value of a normal variable of variance 1, Φ⁻¹(3/4)."""


def reading_closures(observed: Observed) -> list[Closures]:
    """What the rounds of a job's pointings close, if it has any; each closure names the lines of the book it is about.

    The misclosure of a half-round is what it reads on its first target at its end minus at its beginning; that of a
    pair of faces is the collimation or index error it shows minus the median of the setup's other pairs; that of a
    reading is its mean minus the reading.
    """
    pointings = observed.job.reduction.pointings
    if pointings is None:
        return []
    kinds = (
        (Directions, pointings.directions, "direction_reading", "collimation"),
        (ZenithAngles, pointings.zeniths, "zenith_reading", "vertical_index"),
        (SlopeDistances, pointings.slopes, "distance_reading", ""),
    )
    found = [_half_rounds(observed, pointings)]
    for kind, reduced, of_readings, of_faces in kinds:
        made_of = _Lines(observed, kind)
        found += [_faces(made_of, reduced, of_faces)] if of_faces else []
        found.append(_single_readings(made_of, reduced, of_readings))
    return found


class _Lines:
    """The observations of a kind, found by the lines of the book that they are means of."""

    def __init__(self, observed: Observed, kind: type[Observations]) -> None:
        self.observed, self.unit = observed, kind.unit
        rows, numbers = observed.rows_of(kind)
        self._number: dict[tuple[str, int], int] = {}
        if rows is not None:
            for row, number in enumerate(numbers.tolist()):
                self._number.update(dict.fromkeys(lines_of(rows.provenance, row), number))

    def observation(self, provenance: Provenance, row: int) -> list[int]:
        """The observation that the first line of a reading went into; none where it went into none."""
        number = self._number.get(lines_of(provenance, row)[0])
        return [] if number is None else [number]


def lines_of(provenance: Provenance, row: int) -> list[tuple[str, int]]:
    """All lines of a row, each with its file."""
    further = () if provenance.further is None else provenance.further[row]
    file = provenance.files[provenance.file[row]]
    return [(file, int(line)) for line in (provenance.line[row], *further)]


def _half_rounds(observed: Observed, pointings: PointingsReduced) -> Closures:
    """Each reading is on one face: of twice the variance of a direction on both."""
    horizons: Horizons = pointings.horizons
    sd = 2.0 * pointings.directions.stated[horizons.setup]
    made_of = _Lines(observed, Directions)
    return _closures("half_round", made_of, horizons, horizons.misclosure, sd, np.arange(len(horizons)))


def _faces(made_of: _Lines, reduced: Reduced, check: str) -> Closures:
    """Each pair of faces of a setup against its others.

    An eccentric circle moves the two faces apart and leaves their mean alone, so that pairs may scatter more than the
    sds promise: where they do, their own spread over the whole job, as its median shows it, takes the place of the sds.
    """
    errors: FaceErrors = reduced.errors
    deviation, sd = np.full(len(errors), np.nan), np.full(len(errors), np.nan)
    for setup in np.unique(errors.setup).tolist():
        pairs = np.flatnonzero(errors.setup == setup)
        if len(pairs) > 1:
            deviation[pairs] = list(_from_others(errors.error[pairs]))
            sd[pairs] = reduced.stated[setup] * np.sqrt(1.0 + _variance_of_median(len(pairs) - 1))
    known = np.flatnonzero(np.isfinite(deviation) & np.isfinite(sd))
    wider = float(np.median(np.abs(deviation[known] / sd[known]))) / MEDIAN_DEVIATION if len(known) else 1.0
    closures = _closures(check, made_of, errors, deviation, sd * max(wider, 1.0), known)
    return replace(closures, quantity=Quantity.FACES)


def _from_others(values: FloatArray) -> Iterator[float]:
    """Each value minus the median of the others."""
    for place in range(len(values)):
        yield float(values[place] - np.median(np.delete(values, place)))


def _variance_of_median(count: int) -> float:
    """Of so many values of variance 1: the median of one or two is their mean."""
    return 1.0 / count if count < 3 else 1.0 / (MEDIAN_EFFICIENCY * count)


def _single_readings(made_of: _Lines, reduced: Reduced, check: str) -> Closures:
    """Readings of setups that have more than they need, against the means they went into."""
    scatter = reduced.scatter
    checked = np.flatnonzero(reduced.redundancy[scatter.setup] > 0)
    return _closures(check, made_of, scatter, scatter.residual, scatter.sd, checked)


def _closures(
    check: str,
    made_of: _Lines,
    readings: Horizons | FaceErrors | Scatter,
    misclosure: FloatArray,
    sd: FloatArray,
    chosen: IntArray,
) -> Closures:
    """The chosen readings as closures, their walk the sight that they went into."""
    provenance = readings.provenance
    rows = [made_of.observation(provenance, row) for row in chosen.tolist()]
    marks = [
        made_of.observed.marks(numbers[0]) if numbers else [target]
        for numbers, target in zip(rows, readings.mark[chosen].tolist(), strict=True)
    ]
    return Closures(
        check,
        made_of.unit,
        misclosure[chosen, None],
        sd[chosen, None],
        Ragged.of(marks),
        Ragged.of(rows),
        np.full(len(chosen), np.nan),
        np.zeros(len(chosen), dtype=np.int64),
        sources=tuple(provenance.label(row) for row in chosen.tolist()),
    )

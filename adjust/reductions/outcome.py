"""What a reduction found: the means that go on as observations, and what the readings say of themselves."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.observations.base import Columns, Provenance
from adjust.reductions.circle import group_sums
from adjust.reductions.distance import BothEnds
from adjust.reductions.level_book import ArithmeticCheck, Sections
from adjust.reductions.spread import Spread, spread_from


@dataclass(frozen=True)
class Means(Columns):
    """Reduced observations (means,): `row` of the book that each begins with, `value` and `sd`, metres or radians.

    `part` numbers the parts of a setup that no common target joins (directions; elsewhere 0).
    """

    row: IntArray
    value: FloatArray
    sd: FloatArray
    part: IntArray
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.value)


@dataclass(frozen=True)
class FaceErrors(Columns):
    """What pairs of faces say of the instrument: one pair a row, `setup` and `mark` sighted, `error` in radians."""

    setup: IntArray
    mark: IntArray
    error: FloatArray
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.error)


@dataclass(frozen=True)
class Scatter(Columns):
    """How single observations fall beside their mean: `residual` mean − observed and stated `sd`, metres or radians."""

    setup: IntArray
    mark: IntArray
    residual: FloatArray
    sd: FloatArray
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.residual)


@dataclass(frozen=True)
class Reduced:
    """One kind of observation of all setups; `redundancy` (setups,) counts what the readings have over the means,
    `stated` (setups,) is the instrument's sd of one of them, NaN for a setup without."""

    means: Means
    errors: FaceErrors
    scatter: Scatter
    redundancy: IntArray
    stated: FloatArray
    uncorrected: int = 0
    """Groups read on one face only of an instrument whose error is not known."""

    def statistic(self) -> FloatArray:
        """Σ (residual/sd)² of each setup (setups,), to be compared with χ² of its `redundancy`."""
        scatter = self.scatter
        return group_sums((scatter.residual / scatter.sd) ** 2, scatter.setup, len(self.redundancy))

    def spread(self, confidence: float, setup: int | None = None) -> Spread:
        """The spread of one setup, or of all together."""
        chosen = slice(None) if setup is None else slice(setup, setup + 1)
        return spread_from(float(self.statistic()[chosen].sum()), int(self.redundancy[chosen].sum()), confidence)


@dataclass(frozen=True)
class Horizons(Columns):
    """Half-rounds that closed: `misclosure` last minus first reading to `mark`, radians."""

    setup: IntArray
    mark: IntArray
    face: IntArray
    misclosure: FloatArray
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.misclosure)


@dataclass(frozen=True)
class PointingsReduced:
    """What came of the pointings. `setups` names the setups that the other columns number."""

    setups: tuple[str, ...]
    directions: Reduced
    zeniths: Reduced
    slopes: Reduced
    horizons: Horizons
    both_ends: BothEnds
    """Lines with slope and zenith angle measured at either end, from mark to mark."""
    velocity: FloatArray
    """(slopes,): what the first reading of each was multiplied by for the air, 1 where nothing was known of it."""


@dataclass(frozen=True)
class LevelsReduced:
    """What came of the level book. `lines` names the lines of `check`; `marks` (sections, 2) and `line` (sections,) are
    those of each section; `sd` (sections,) in metres."""

    lines: tuple[str, ...]
    line: IntArray
    marks: IntArray
    sections: Sections
    sd: FloatArray
    check: ArithmeticCheck
    provenance: Provenance


@dataclass(frozen=True)
class Reduction:
    """What came of the raw tables of a job; None for a table that it has not."""

    pointings: PointingsReduced | None = None
    levels: LevelsReduced | None = None


def no_errors(provenance: Provenance) -> FaceErrors:
    """Of a kind that is not observed on faces."""
    nothing: IntArray = np.zeros(0, dtype=np.int64)
    return FaceErrors(nothing, nothing, np.zeros(0), provenance.take(nothing))

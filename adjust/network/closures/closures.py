"""What a closure is: observations that go round and ought to come back to where they began."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Literal

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.network.closures.ragged import Ragged
from adjust.tolerances import Quantity, Rule, Tolerances


@dataclass(frozen=True)
class Closures:
    """All closures of one check; arrays have one entry for each closure.

    `misclosure` and `sd` (closures, components) are metres or radians, the sd being what the a-priori sds of its rows
    promise. `marks` are walked in that order, a closed walk naming its first mark again at its end; `rows` are the
    observations that it rests on, by their numbers in `Observed`. `length` is metres, `angles` a count; either may be
    NaN and 0 where the check has none. `figures` are further columns by name, SI.
    """

    check: str
    unit: Literal["m", "rad"]
    misclosure: FloatArray
    sd: FloatArray
    marks: Ragged
    rows: Ragged
    length: FloatArray
    angles: IntArray
    quantity: Quantity | None = None
    """Which tolerances hold for it; None where only the sds can tell."""
    components: tuple[str, ...] = ("",)
    figures: Mapping[str, FloatArray] = field(default_factory=dict)
    sources: tuple[str, ...] = ()
    """Of closures of raw readings: the lines of the book that each is about."""

    def __len__(self) -> int:
        return len(self.misclosure)

    @property
    def finite(self) -> BoolArray:
        """Closures (closures,) with a misclosure and an sd: rows that make no sense have none."""
        return np.asarray(np.isfinite(self.misclosure).all(axis=1) & np.isfinite(self.sd).all(axis=1))

    def take(self, chosen: BoolArray | IntArray) -> Closures:
        """A choice of the closures."""
        places: IntArray = np.arange(len(self))[chosen]
        return replace(
            self,
            misclosure=self.misclosure[places],
            sd=self.sd[places],
            marks=self.marks.take(places),
            rows=self.rows.take(places),
            length=self.length[places],
            angles=self.angles[places],
            figures={name: values[places] for name, values in self.figures.items()},
            sources=tuple(self.sources[place] for place in places.tolist()) if self.sources else (),
        )


@dataclass(frozen=True)
class Judged:
    """Closures of one check with what they may miss.

    `allowed` (closures, components), metres or radians; `rules` say by which rules, `rule` (closures,) indexes them.
    """

    closures: Closures
    allowed: FloatArray
    rules: tuple[Rule, ...]
    rule: IntArray

    @property
    def exceeds(self) -> BoolArray:
        """Closures (closures,) with a component beyond what is allowed."""
        beyond = np.abs(self.closures.misclosure) > self.allowed
        return np.asarray(beyond.any(axis=1))

    @property
    def severity(self) -> FloatArray:
        """The largest misclosure over allowance (closures,): above 1 it exceeds."""
        with np.errstate(divide="ignore", invalid="ignore"):
            share = np.abs(self.closures.misclosure) / self.allowed
        worst: FloatArray = np.nan_to_num(share, nan=0.0, posinf=np.inf).max(axis=1, initial=0.0)
        return worst


def judged(checks: Sequence[Closures], tolerances: Tolerances) -> tuple[Judged, ...]:
    """Each check's closures with the tolerances of the job; the sds judge what no figure is given for.

    The factor of the sds leaves a job without mistakes the chance `confidence` of passing all m tests of that kind:
    Φ⁻¹((1 + confidence^(1/m)) / 2), Šidák (1967), *Journal of the American Statistical Association* 62, equation 2.
    """
    by_figures = [_by_figures(closures, tolerances) for closures in checks]
    tests = sum(int(np.isnan(allowed).sum()) for allowed, _, _ in by_figures)
    factor = tolerances.sd_factor or sd_factor(tests, tolerances.confidence)
    return tuple(_by_sds(closures, *figures, factor) for closures, figures in zip(checks, by_figures, strict=True))


def sd_factor(tests: int, confidence: float) -> float:
    """How many sds each of so many tests may miss by, so that all pass with the probability `confidence`."""
    from scipy.special import ndtri

    return float(ndtri(0.5 * (1.0 + confidence ** (1.0 / max(tests, 1)))))


def _by_figures(closures: Closures, tolerances: Tolerances) -> tuple[FloatArray, tuple[Rule, ...], IntArray]:
    """Allowances (closures, 1) by the job's figures, NaN where there are none, the rules and which of them counts."""
    rules = tolerances.rules(closures.quantity) if closures.quantity else ()
    if not rules:
        return np.full((len(closures), 1), np.nan), (), np.zeros(len(closures), dtype=np.int64)
    size = closures.angles.astype(np.float64) if closures.unit == "rad" else closures.length
    allowed = np.column_stack([rule.allowed(size) for rule in rules])
    smallest = np.argmin(np.where(np.isnan(allowed), np.inf, allowed), axis=1)
    return allowed[np.arange(len(closures)), smallest][:, None], rules, smallest


def _by_sds(closures: Closures, allowed: FloatArray, rules: tuple[Rule, ...], rule: IntArray, factor: float) -> Judged:
    unjudged = np.isnan(allowed)
    by_sd = Rule(f"{factor:.2f} × the sd that the instruments promise")
    return Judged(
        closures,
        np.where(unjudged, factor * closures.sd, allowed),
        (*rules, by_sd),
        np.where(unjudged[:, 0], len(rules), rule),
    )

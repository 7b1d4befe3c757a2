"""One variance component as a result, with the plain sentence that it comes to."""

from __future__ import annotations

import math
from dataclasses import dataclass

from adjust.observations import KIND_NAMES

VAGUE = 20.0
"""Upper over lower bound of a factor: beyond it, too little tells this group from the others to say anything of it."""

SHOWN = 5
"""Names in one sentence: enough to find the places, few enough to read."""


@dataclass(frozen=True)
class VarianceComponent:
    """What the residuals say of the sds of one group of observations.

    `factor` is what the sds as stated would have to be multiplied with, `sd` its standard deviation; NaN where too
    little checks the group. `lower` and `upper` hold the true factor with the probability `confidence`, for all groups
    of the job at once; `differs` says whether 1 lies outside. Nothing of this is applied to the adjustment.
    """

    name: str
    kind: str
    instrument: str | None
    """Where its rows share one and the kind has several."""
    file: str | None
    """Where its rows share one and the kind has several: the day, in a job with one file a day."""
    group: str | None
    """The word in the column `group`."""
    merged: tuple[str, ...]
    """The groups too small by themselves that were put together here."""
    observations: int
    """Scalars that took part: vectors have three."""
    redundancy: float
    """Share of the degrees of freedom: the sum of the redundancy numbers, at the weights estimated."""
    factor: float
    sd: float
    lower: float
    upper: float
    confidence: float
    left_out: tuple[str, ...]
    """Sources of rows that took no part, in the order of the book: they stand too far off, or were named."""

    @property
    def estimated(self) -> bool:
        """Whether there is a factor."""
        return not math.isnan(self.factor)

    @property
    def differs(self) -> bool:
        """Whether the factor differs significantly from 1; False where there is none."""
        return self.estimated and not self.lower <= 1.0 <= self.upper

    @property
    def sentence(self) -> str:
        """What a surveyor needs to hear."""
        return " ".join(part for part in (self._finding(), self._merged_words(), self._left_out_words()) if part)

    def _finding(self) -> str:
        if not self.estimated or self.upper > VAGUE * self.lower:
            return f"Too little checks the {self.name} to say how well their sds were stated."
        span = f"between {_digits(self.lower)} and {_digits(self.upper)}"
        if not self.differs:
            return f"The {self.name} agree with their stated sds (factor {_digits(self.factor)}, {span})."
        worse = self.factor > 1
        times = _digits(self.factor if worse else 1 / self.factor)
        return f"The {self.name} behave as {times} × {'worse' if worse else 'better'} than stated (factor {span})."

    def _merged_words(self) -> str:
        return f"Judged together, being too few each: {_listed(self.merged)}." if self.merged else ""

    def _left_out_words(self) -> str:
        if not self.left_out:
            return ""
        one, many = KIND_NAMES[self.kind]
        count = len(self.left_out)
        return f"Without {count} {one if count == 1 else many} too far off: {_listed(self.left_out)}."


def _digits(factor: float) -> str:
    """Two decimals below 10, the next whole number above."""
    return f"{factor:.2f}" if factor < 9.995 else f"{factor:.0f}"


def _listed(names: tuple[str, ...]) -> str:
    more = f" and {len(names) - SHOWN} more" if len(names) > SHOWN else ""
    return "; ".join(names[:SHOWN]) + more

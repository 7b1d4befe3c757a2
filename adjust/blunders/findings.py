"""What the search for blunders found, in the words and units of the job."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from adjust.arrays import FloatArray
from adjust.blunders.context import Explanation
from adjust.blunders.hypothesis import Hypothesis
from adjust.model import State

if TYPE_CHECKING:
    from adjust.blunders.booked import Booked


@dataclass(frozen=True)
class Blunder:
    """One error that the observations give away.

    `estimated_error` (q,) is written minus true with its `sd` (q,), in `hypothesis.unit`; `expected_value` (q,) is
    what should have been written, where that is a number of the book. `test` is √T given the other blunders, over σ̂₀
    where σ₀ is estimated; it passes `critical`. `alternatives` could stand in its place: it is one of these.
    `deciding` is the observation whose repetition tells them apart best, and by how many of its sds.
    """

    hypothesis: Hypothesis
    sources: tuple[str, ...]
    """File and line of every row it enters."""
    estimated_error: FloatArray
    sd: FloatArray
    expected_value: FloatArray | None
    test: float
    critical: float
    alternatives: tuple[Hypothesis, ...]
    deciding: tuple[str, float] | None
    explanations: tuple[Explanation, ...]
    instead_explained: tuple[Explanation | None, ...] = ()
    """For each of the alternatives the likeliest mistake, were it that one; None where no common mistake fits."""
    booked: tuple[Booked, ...] = ()
    """The cells of the book that it rests on, and what the network expects there."""
    advice: str = ""
    """What to do next."""

    @property
    def name(self) -> str:
        """File and line of an observation, or the name of a group."""
        return self.hypothesis.name

    @property
    def explained(self) -> bool:
        """Whether a common mistake accounts for it."""
        return bool(self.explanations)


@dataclass(frozen=True)
class Findings:
    """All blunders, the plainest first, and the network as it stands without them.

    `unchecked` are the observations with no check at all: a blunder in one of them goes unseen. `significance` is that
    of the test of one observation.
    """

    blunders: tuple[Blunder, ...]
    unchecked: tuple[str, ...]
    significance: float
    estimated: bool
    """Whether σ₀ was estimated, not taken as known."""
    state: State
    settled: bool = True
    """Whether the network stands where it was linearised: if not, so gross are the errors that what is named may be
    wrong in part."""

"""The tolerances of one job: its own figures before those of the standards it names."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

from adjust.tolerances.published import STANDARDS
from adjust.tolerances.rules import Quantity, Rule

INSTRUMENT_HEIGHTS = (0.0, 2.5)
"""Metres above the mark between which an instrument stands: on a pillar, or on a tripod that a person looks through.
Common practice, no source."""
TARGET_HEIGHTS = (0.0, 5.0)
"""Metres above the mark, to the top of a long prism pole. Common practice, no source."""
SAME_MARK = 0.05
"""Metres between two names below which they may be one mark: two marks of a network are not built that close. Common
practice, no source."""
CONFIDENCE = 0.99
"""Chance that a job without mistakes passes all closures that are judged by its a-priori sds."""


@dataclass(frozen=True)
class Tolerances:
    """What `[tolerances]` of the job file says, metres and radians.

    `standards` are keys of `STANDARDS`; `own` figures win over them. Where neither says anything a closure may miss by
    `sd_factor` times the sd that the instruments promise for it; without a factor, by as much as leaves a job without
    mistakes the chance `confidence` of passing every one of its closures.
    """

    standards: tuple[str, ...] = ()
    own: Mapping[Quantity, tuple[Rule, ...]] = field(default_factory=lambda: MappingProxyType({}))
    sd_factor: float | None = None
    confidence: float = CONFIDENCE
    instrument_heights: tuple[float, float] = INSTRUMENT_HEIGHTS
    target_heights: tuple[float, float] = TARGET_HEIGHTS
    same_mark: float = SAME_MARK

    def rules(self, quantity: Quantity) -> tuple[Rule, ...]:
        """The rules for a quantity, of which the smallest allowance counts; none where the sds decide.

        Triangles are closed figures like others where nothing is said of them.
        """
        if quantity in self.own:
            return self.own[quantity]
        figures = (figure for name in self.standards for figure in STANDARDS[name].figures)
        rules = tuple(figure.rule for figure in figures if figure.quantity is quantity)
        return self.rules(Quantity.ANGLES) if quantity is Quantity.TRIANGLE and not rules else rules

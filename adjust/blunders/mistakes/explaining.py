"""Ranks what the catalogue says of one suspect."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from scipy.special import logsumexp

from adjust.arrays import FloatArray
from adjust.blunders.context import Context, Explanation
from adjust.blunders.mistakes.catalogue import MISTAKES
from adjust.blunders.mistakes.entries import HEIGHTS, SHARED_HEIGHTS
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.priors import PRIORS
from adjust.blunders.mistakes.suspect import Suspect
from adjust.blunders.mistakes.weighing import Weighing

MOST_CHANCE = 0.045
"""A suspect is explained when at most that share of random errors would be: the usual 5 % of a test, less the 0.5 % by
which a share of the trial errors is uncertain."""
MOST_EXPLANATIONS = 5
"""More are no help to a surveyor."""
LEAST_ODDS = 1e-3
"""Explanations below a thousandth are not worth a line."""
MOST_ODDS = 1e6
"""A million to one: beyond it the tails of normal errors would speak, which nobody has measured."""
MOST_REFINED = 20
"""Candidates that are put to the network one by one, as far as `LEAST_ODDS` lets them count at all."""
ALIKE = 0.02
"""Standard deviations by which two errors differ that come to the same correction."""


def explain(context: Context) -> tuple[Explanation, ...]:
    """What somebody probably did, the most likely first; empty where no common mistake explains the suspect.

    A mistake is offered when it fits: its misfit passes the test, and the catalogue as a whole explains the error
    better than it explains all but `MOST_CHANCE` of random errors of the same order of size.
    """
    suspect = Suspect(context)
    asked = ((mistake.name, mistake.candidates(suspect)) for mistake in MISTAKES)
    found = [(name, known) for name, every in asked if every is not None and len(known := every.known())]
    return _Ranking(suspect, found).explanations() if found else ()


@dataclass(frozen=True)
class _Choice:
    """One candidate that is left: mistakes by name, what to do, its misfit and the logarithm of its weight."""

    names: tuple[str, ...]
    remedy: Remedy
    error: FloatArray
    misfit: float
    weight: float


@dataclass(frozen=True)
class _Ranking:
    suspect: Suspect
    found: list[tuple[str, Candidates]]
    starts: list[int] = field(init=False)

    def __post_init__(self) -> None:
        starts = np.cumsum([0, *(len(candidates) for _, candidates in self.found)]).tolist()
        object.__setattr__(self, "starts", starts)

    @cached_property
    def weighing(self) -> Weighing:
        """All candidates against the error found."""
        context = self.suspect.context
        every = [candidates for _, candidates in self.found]
        return Weighing(
            context.estimated_error,
            context.error_covariance,
            np.concatenate([part.errors for part in every]),
            np.concatenate([part.open_part for part in every]),
            np.concatenate([PRIORS[name] * part.shares for name, part in self.found]),
            self.suspect.angular,
        )

    def explanations(self) -> tuple[Explanation, ...]:
        """Those that are offered."""
        choices = [choice for choice in self._choices() if choice.misfit <= self.suspect.context.critical]
        if not choices or self.weighing.chance * self._rarity > MOST_CHANCE:
            return ()
        merged = sorted(self._merged(choices), key=lambda choice: -choice.weight)
        weights = np.array([*(choice.weight for choice in merged), self.weighing.none])
        against = [logsumexp(np.delete(weights, place)) for place in range(len(merged))]
        odds = np.exp(np.minimum(weights[:-1] - against, np.log(MOST_ODDS)))
        told = [self._told(choice, float(chance)) for choice, chance in zip(merged, odds, strict=True)]
        return tuple(explanation for explanation in told[:MOST_EXPLANATIONS] if explanation.odds >= LEAST_ODDS)

    @property
    def _rarity(self) -> float:
        best = int(np.argmax(self.weighing.weights))
        return self.found[self._owner(best)][1].rarity

    def _owner(self, place: int) -> int:
        return int(np.searchsorted(self.starts, place, side="right")) - 1

    def _choices(self) -> list[_Choice]:
        """The likeliest candidates, those that change more than a value put to the network."""
        weights = self.weighing.weights
        likeliest = np.argsort(-weights, kind="stable")[:MOST_REFINED]
        return [self._choice(int(place)) for place in likeliest if weights[place] >= weights.max() + np.log(LEAST_ODDS)]

    def _choice(self, place: int) -> _Choice:
        owner = self._owner(place)
        name, candidates = self.found[owner]
        error = self.weighing.stood_for(place)
        remedy = candidates.remedy(place - self.starts[owner], error)
        misfit, weight = float(self.weighing.misfits[place]), float(self.weighing.weights[place])
        if remedy.replacement is not None and not self.weighing.loose[place].any():
            misfit, weight = self._refined(remedy, misfit, weight)
        return _Choice((name,), remedy, error, misfit, weight)

    def _refined(self, remedy: Remedy, misfit: float, weight: float) -> tuple[float, float]:
        """With what the network itself expects of the replacement, whose sd may be another."""
        assert remedy.replacement is not None
        exact = float(self.suspect.context.fit(remedy.replacement)[0])
        if not np.isfinite(exact) or exact == 0.0:
            return misfit, weight
        wider = self.suspect.size * np.log(misfit / exact) if misfit > 0.0 else 0.0
        return exact, weight + 0.5 * (misfit**2 - exact**2) - wider

    def _merged(self, choices: list[_Choice]) -> list[_Choice]:
        """Candidates that come to the same error as one, under the names of all."""
        merged: list[_Choice] = []
        for choice in sorted(choices, key=lambda choice: -choice.weight):
            same = next((place for place, other in enumerate(merged) if self._alike(choice, other)), None)
            if same is None:
                merged.append(choice)
            else:
                merged[same] = _joined(merged[same], choice)
        return merged

    def _alike(self, first: _Choice, second: _Choice) -> bool:
        apart = self.suspect.context.misfit(self.suspect.context.estimated_error + first.error - second.error)
        return bool(apart[0] < ALIKE)

    def _told(self, choice: _Choice, odds: float) -> Explanation:
        remedy = choice.remedy
        return Explanation(
            mistake=f"{remedy.what}: {remedy.detail}" if remedy.detail else remedy.what,
            names=choice.names,
            corrected_value=None if remedy.replacement is not None else self._corrected(choice.error),
            corrections=remedy.corrections,
            w_after=choice.misfit,
            odds=odds,
        )

    def _corrected(self, error: FloatArray) -> FloatArray | None:
        """The observed value, or the shared height, without the error."""
        suspect = self.suspect
        if suspect.kind and suspect.kind != "control":
            corrected: FloatArray = suspect.row_itself.observed[0].copy()
            corrected[suspect.components] -= error
            return suspect.in_range(corrected)
        if suspect.nature in SHARED_HEIGHTS:
            written = suspect.row_itself.heights[0, HEIGHTS.index(suspect.values[0].name)]
            return np.array([written]) - error
        return None


def _joined(first: _Choice, second: _Choice) -> _Choice:
    """Two candidates of one error. Where one mistake could have been made in several places, none is named."""
    remedy, other = first.remedy, second.remedy
    whats = remedy.what if other.what in remedy.what else f"{remedy.what}, or {other.what}"
    if remedy.what == other.what and remedy.corrections != other.corrections:
        joined = Remedy(whats)
    else:
        joined = Remedy(whats, remedy.detail, remedy.corrections, remedy.replacement)
    names = tuple(dict.fromkeys(first.names + second.names))
    return _Choice(names, joined, first.error, first.misfit, float(np.logaddexp(first.weight, second.weight)))

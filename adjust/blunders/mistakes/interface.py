"""What every mistake of the catalogue answers: which errors it could have made, each with what would put it right."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.context import Correction
from adjust.observations import Observations

if TYPE_CHECKING:
    from adjust.blunders.mistakes.suspect import Suspect


@dataclass(frozen=True)
class Remedy:
    """What somebody did, in words, and the entries that would undo it.

    `detail` says in the notation of the book what it would have to read. `replacement` is the suspect's row as it
    should have been booked, where more than its value changes.
    """

    what: str
    detail: str = ""
    corrections: tuple[Correction, ...] = ()
    replacement: Observations | None = None


@dataclass(frozen=True)
class Candidates:
    """Errors (k, q) that one mistake could have made of a suspect, in the unit of its hypothesis.

    `shares` (k,) is how often each of them happens when the mistake does, altogether 1 or less. `loose` (k, q) is one
    standard deviation of what the mistake leaves open, along one line: a height that nobody wrote down; zero where it
    leaves nothing open. `rarity` is the share of all rows that look as if the mistake had been made: a blank cell where
    few are blank speaks for itself. `remedy` tells one candidate by its place, given the error (q,) that it stands for
    in this case.
    """

    errors: FloatArray
    shares: FloatArray
    remedy: Callable[[int, FloatArray], Remedy]
    loose: FloatArray | None = None
    rarity: float = 1.0

    def __len__(self) -> int:
        return len(self.errors)

    def known(self) -> Candidates:
        """Without those whose error the network cannot tell: NaN."""
        finite = np.isfinite(self.errors).all(axis=1) & np.isfinite(self.open_part).all(axis=1)
        if finite.all():
            return self
        chosen = np.flatnonzero(finite)
        loose = None if self.loose is None else self.loose[chosen]
        return Candidates(
            self.errors[chosen],
            self.shares[chosen],
            lambda place, error: self.remedy(int(chosen[place]), error),
            loose,
            self.rarity,
        )

    @property
    def open_part(self) -> FloatArray:
        """`loose`, zeros where nothing is left open."""
        return np.zeros_like(self.errors) if self.loose is None else self.loose

    @classmethod
    def listed(
        cls, errors: Sequence[FloatArray] | FloatArray, remedies: Sequence[Remedy], shares: Sequence[float] = ()
    ) -> Candidates:
        """Of lists; all equally frequent, or in the proportion of `shares`."""
        weights = np.array(shares or [1.0] * len(remedies))
        return cls(np.array(errors), weights / weights.sum(), lambda place, error: remedies[place])

    @classmethod
    def together(cls, parts: Sequence[Candidates | None]) -> Candidates | None:
        """The candidates of several entries, each entry as frequent as the next."""
        filled = [part for part in parts if part is not None and len(part)]
        if len(filled) < 2:
            return filled[0] if filled else None
        starts = np.cumsum([0, *map(len, filled)])

        def remedy(place: int, error: FloatArray) -> Remedy:
            part = int(np.searchsorted(starts, place, side="right")) - 1
            return filled[part].remedy(place - int(starts[part]), error)

        loose = None
        if any(part.loose is not None for part in filled):
            loose = np.concatenate([part.open_part for part in filled])
        return cls(
            np.concatenate([part.errors for part in filled]),
            np.concatenate([part.shares for part in filled]) / len(filled),
            remedy,
            loose,
            min(part.rarity for part in filled),
        )


class Mistake(Protocol):
    """One mistake of the catalogue."""

    @property
    def name(self) -> str:
        """Its name in the table of priors."""
        ...

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The errors it could have made of a suspect; None or nothing where it could not have been made."""
        ...

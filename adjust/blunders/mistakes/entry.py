"""One number of the book that a suspect rests on, and what other numbers in its place would have meant."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.context import Correction
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.notation import Notation
from adjust.field_book.written import Cell
from adjust.observations import Observations


@dataclass(frozen=True)
class Entry:
    """One number of the book that the suspect rests on.

    `source` is its file and line, `name` the plain name of its column. `error_of` says for other values (k,) of it,
    metres or radians, by how much (k, q) the written one is wrong if they are right; `replaced` gives the row with
    another value where that is not just another observed value.
    """

    source: str
    name: str
    cell: Cell
    error_of: Callable[[FloatArray], FloatArray]
    replaced: Callable[[float], Observations] | None = None

    @cached_property
    def notation(self) -> Notation:
        """How it is written."""
        return Notation.of(self.cell)

    @property
    def value(self) -> float:
        """What is written, metres or radians; NaN for a blank cell."""
        return self.notation.number

    def correction(self, text: str) -> Correction:
        """The entry with another text."""
        return Correction(self.source, self.cell.title, text)

    def remedy(self, what: str, text: str, value: float) -> Remedy:
        """Another text, with what would have happened to it."""
        detail = f"{text} in place of {self.cell.text or 'a blank'}"
        return Remedy(what, detail, (self.correction(text),), None if self.replaced is None else self.replaced(value))

    def candidates(self, texts: list[str], whats: list[str], shares: list[float] | None = None) -> Candidates | None:
        """Of other texts, those that could stand in the cell; each with what would have happened to it."""
        values = np.array([self.notation.read(text) for text in texts])
        sound = np.flatnonzero(~np.isnan(values) & (values != self.value))
        if not len(sound):
            return None
        weights = np.ones(len(texts)) if shares is None else np.array(shares)

        def remedy(place: int, error: FloatArray) -> Remedy:
            chosen = int(sound[place])
            return self.remedy(whats[chosen], texts[chosen], float(values[chosen]))

        return Candidates(self.error_of(values[sound]), weights[sound] / weights[sound].sum(), remedy)

    def valued(self, values: FloatArray, what: Callable[[int], str], shares: FloatArray | None = None) -> Candidates:
        """Of other values (k,), metres or radians, written as the cell writes."""
        weights = np.ones(len(values)) if shares is None else shares

        def remedy(place: int, error: FloatArray) -> Remedy:
            return self.remedy(what(place), self.notation.write(float(values[place])), float(values[place]))

        return Candidates(self.error_of(values), weights / weights.sum(), remedy)

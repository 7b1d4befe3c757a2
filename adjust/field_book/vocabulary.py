"""Names as numbers: marks, setups and instruments are looked up once, and live as indices from then on."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from functools import cached_property

import numpy as np

from adjust.arrays import IntArray
from adjust.field_book.mistakes import Likeness
from adjust.units import shown

NO_NAME = -1
"""Index of a blank cell, and of a name that a closed vocabulary does not know."""


class _Numbers(dict[str, int]):
    """Numbers of names; unknown names have none."""

    def __missing__(self, name: str) -> int:
        return NO_NAME


class Vocabulary:
    """Names and their numbers in the order in which they were met.

    An open vocabulary takes in every new name; a closed one knows only `names`, and says of others that they are not
    `described` ("a mark of marks.csv").
    """

    def __init__(self, described: str, names: Iterable[str] | None = None) -> None:
        self.described = described
        self._open = names is None
        self._index = _Numbers((name, number) for number, name in enumerate(names or ()))

    @property
    def names(self) -> tuple[str, ...]:
        """All names, in the order of their numbers."""
        return tuple(self._index)

    def numbers(self, cells: Sequence[str]) -> IntArray:
        """Numbers (rows,) of a column of names."""
        if self._open:
            for name in dict.fromkeys(cells):
                if name:
                    self._index.setdefault(name, len(self._index))
        return np.fromiter(map(self._index.__getitem__, cells), np.int64, len(cells))

    def may_be_unknown(self, name: str) -> bool:
        """Whether a name that is not known may stand all the same."""
        return False

    def complaint(self, name: str) -> str:
        """What to say of a name that a closed vocabulary does not know."""
        return f"read {shown(name)}, which is not {self.described}{self._likeness.suggestion(name)}"

    @cached_property
    def _likeness(self) -> Likeness:
        return Likeness(self._index)


class StaffPoints(Vocabulary):
    """The points of a level book: marks, and turning points, which have no name of their own or one that says so."""

    TURNING_POINT = "TP"

    def may_be_unknown(self, name: str) -> bool:
        """`TP`, `TP4`, `tp 12`: the staff on a turning point."""
        return name.upper().startswith(self.TURNING_POINT)

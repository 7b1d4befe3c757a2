"""What goes wrong when the columns are not independent."""

from __future__ import annotations

from adjust.arrays import FloatArray, IntArray
from adjust.errors import HubtackError


class RankDefect(HubtackError):
    """The columns are dependent to working accuracy: some motion of the unknowns changes no row.

    `motion` (columns,) is such a motion, largest component 1; `columns` are those that it moves.
    """

    def __init__(self, columns: IntArray, motion: FloatArray) -> None:
        self.columns = columns
        self.motion = motion
        super().__init__(f"the rows do not determine {len(columns)} of the {len(motion)} columns")

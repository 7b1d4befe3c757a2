"""What a reader may choose of an export."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Table = Literal["marks", "lines", "observations"]


@dataclass(frozen=True)
class Options:
    """`exaggeration` of ellipses, None: what suits the format; `table` is that of a csv."""

    exaggeration: float | None = None
    table: Table = "marks"

"""A table of the page: columns of finished text, so that the page's script has nothing to round."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, Literal

ROWS_IN_PAGE = 200
"""A table up to this long stands whole in the page; of a longer one, so many rows, the script turning its leaves."""

ROWS_AT_ONCE = 100
"""Rows of a leaf of a long table."""

SEPARATORS = ";|~^"
"""One that no cell contains joins the cells of a column; without such a one they travel as a list."""

Nature = Literal["number", "dms", "text", "choice", "marks", "source"]
"""number: decimal digits. dms: degrees-minutes-seconds, or metres. choice: one of few words, offered as a filter.
marks: one to three marks. source: file and line."""


@dataclass(frozen=True)
class Heading:
    """The head of a column: its name, unit ("" for none), what it holds, and its formula in words."""

    key: str
    name: str
    unit: str = ""
    nature: Nature = "number"
    formula: str = ""

    @property
    def style(self) -> str:
        """Its class in the page: figures stand right."""
        return "c n" if self.nature in ("number", "dms") else "c"


@dataclass(frozen=True)
class PageTable:
    """Rows of text by columns, in the order in which the page first shows them.

    `marks` names for each row one to three marks, as indices of the job's marks, which link the row to the map;
    a column of the nature `marks` shows them. `flagged` are the rows that call for attention.
    """

    name: str
    title: str
    headings: tuple[Heading, ...]
    columns: tuple[Sequence[str], ...]
    marks: Sequence[tuple[int, ...]]
    flagged: frozenset[int] = frozenset()
    flag: str = ""
    """What a flagged row is, in a word; it is offered as a filter."""
    about: str = ""
    order: str = ""
    left_out: int = 0
    """Rows that did not come into the page; the page says so."""
    kept: tuple[int, ...] = field(init=False)

    def __post_init__(self) -> None:
        """Columns that are empty in every row are left out."""
        kept = [place for place, column in enumerate(self.columns) if any(column)]
        object.__setattr__(self, "kept", tuple(kept))

    def __len__(self) -> int:
        return len(self.marks)

    @property
    def shown(self) -> list[Heading]:
        """The headings of the columns that hold anything."""
        return [self.headings[place] for place in self.kept]

    @property
    def first_rows(self) -> list[tuple[int, list[tuple[str, str]]]]:
        """The rows that stand in the page itself: their number, and the style and text of their cells."""
        most = len(self) if len(self) <= ROWS_IN_PAGE else ROWS_AT_ONCE
        styles = [heading.style for heading in self.shown]
        rows = zip(*(self.columns[place][:most] for place in self.kept), strict=True)
        return [(row, list(zip(styles, cells, strict=True))) for row, cells in enumerate(rows)]

    def data(self) -> dict[str, Any]:
        """The whole table for the script."""
        return {
            "headings": [
                {"key": heading.key, "name": heading.name, "unit": heading.unit, "nature": heading.nature}
                for heading in self.shown
            ],
            "columns": [
                "" if heading.nature == "marks" else packed(self.columns[place], heading.nature)
                for heading, place in zip(self.shown, self.kept, strict=True)
            ],
            "marks": packed([" ".join(map(str, marks)) for marks in self.marks], "text"),
            "flagged": sorted(self.flagged),
            "rows": len(self),
        }


def packed(cells: Sequence[str], nature: Nature) -> Any:
    """A column in few characters: joined to one text, its words numbered where they are few, files where they are many.

    `{"by": separator, "text": …}`, with `words` where cells are numbers of words; sources are `file number:line`.
    """
    if nature == "choice":
        words = list(dict.fromkeys(cells))
        number = {word: str(place) for place, word in enumerate(words)}
        return {"words": words, "by": ";", "text": ";".join(number[cell] for cell in cells)}
    if nature == "source":
        parts = [cell.rpartition(":") for cell in cells]
        words = list(dict.fromkeys(file for file, _, _ in parts))
        number = {word: str(place) for place, word in enumerate(words)}
        return {"words": words, "by": ";", "text": ";".join(f"{number[file]}:{line}" for file, _, line in parts)}
    everything = "".join(cells)
    for separator in SEPARATORS:
        if separator not in everything:
            return {"by": separator, "text": separator.join(cells)}
    return list(cells)

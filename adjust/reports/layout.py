"""Plain text a hundred columns wide: headings, paragraphs, facts and tables."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

WIDTH = 100
"""Characters in a line: one screen, and one portrait page in small print."""

GAP = "  "
SHORTEST = 6
"""A text cell is never cut below this."""


@dataclass(frozen=True)
class Column:
    """One column of a table: its heading, its unit ("" for none), and whether its cells are text, not numbers.

    Text that has to be shortened loses its end, or its beginning where `ending` says that the end tells more.
    """

    heading: str
    unit: str = ""
    text: bool = False
    ending: bool = False


def title(text: str) -> list[str]:
    """A heading with a blank line ahead of it."""
    return ["", text, "─" * len(text)]


def paragraph(text: str, indent: str = "") -> list[str]:
    """Text broken into lines."""
    return textwrap.wrap(text, WIDTH, initial_indent=indent, subsequent_indent=indent, break_on_hyphens=False)


def facts(pairs: Sequence[tuple[str, str]]) -> list[str]:
    """Names and what they are, the latter aligned and wrapped."""
    margin = max((len(name) for name, _ in pairs), default=0) + len(GAP)
    lines: list[str] = []
    for name, value in pairs:
        wrapped = textwrap.wrap(value, WIDTH - margin, break_on_hyphens=False) or [""]
        lines.append(name.ljust(margin) + wrapped[0])
        lines += [" " * margin + line for line in wrapped[1:]]
    return lines


def table(columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> list[str]:
    """A table with its units in a line of their own; numbers stand right, text left, empty columns are left out.

    Text cells are shortened, the longest columns first, until the table fits the width.
    """
    kept = [index for index in range(len(columns)) if any(row[index] for row in rows)]
    chosen = [columns[index] for index in kept]
    heads = [head for head in zip(*((column.heading, column.unit) for column in chosen), strict=True) if any(head)]
    cells = [[*(head[place] for head in heads), *(row[index] for row in rows)] for place, index in enumerate(kept)]
    widths = _fit(chosen, [max(map(len, column)) for column in cells])
    return [GAP.join(line).rstrip() for line in zip(*map(_aligned, chosen, widths, cells), strict=True)]


def _fit(columns: Sequence[Column], widths: list[int]) -> list[int]:
    """Narrow text columns until all fit."""
    flexible = [place for place, column in enumerate(columns) if column.text]
    while sum(widths) + len(GAP) * (len(widths) - 1) > WIDTH:
        widest = max(flexible, key=lambda place: widths[place], default=None)
        if widest is None or widths[widest] <= SHORTEST:
            break
        widths[widest] -= 1
    return widths


def _aligned(column: Column, width: int, cells: Sequence[str]) -> list[str]:
    """The cells of a column in its width."""
    if column.text:
        return [shortened(cell, width, column.ending).ljust(width) for cell in cells]
    return [cell.rjust(width) for cell in cells]


def shortened(text: str, width: int, ending: bool = False) -> str:
    """Text cut to `width` with a mark where it was cut."""
    if len(text) <= width:
        return text
    return "…" + text[len(text) - width + 1 :] if ending else text[: width - 1] + "…"


def shown_of(shown: int, total: int, choice: str, file: str) -> list[str]:
    """The sentence under a table that has fewer rows than there are: what is shown, and where the rest is."""
    if shown == total:
        return []
    return paragraph(f"Shown are {shown} of {total}: {choice}. All of them stand in {file}.")

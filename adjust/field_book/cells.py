"""Numbers as the cells of a table: units, decimals, and the text of a whole table."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from itertools import repeat

import numpy as np

from adjust.angles import FULL_TURN
from adjust.arrays import FloatArray, IntArray
from adjust.units import ANGLE_ENDINGS, LENGTH_ENDINGS, format_dms

Table = dict[str, list[str]]
"""Cells of a table column by column, under the titles of the header row; all columns of one length."""


FULL_SECONDS = 9
"""Decimals of a second of arc, 5e-15 rad, about what double precision holds of an angle of one radian."""


@dataclass(frozen=True)
class Style:
    """How numbers are written: to the last digit, unless `decimals` rounds a column.

    `decimals` is keyed by the column's name without its unit ending. `sexagesimal` writes angles as 123-45-06.7
    in place of degrees; `grid` writes eastings and northings for a projected CRS in place of latitudes and longitudes;
    `correlations` writes sds and correlations of vectors in place of covariances.
    """

    decimals: Mapping[str, int] = field(default_factory=dict)
    sexagesimal: bool = False
    grid: bool = False
    correlations: bool = False

    def length(self, name: str, metres: FloatArray, ending: str = "m") -> Table:
        """One column of lengths (rows,); blank where NaN."""
        return {f"{name}_{ending}": self.numbers(name, metres, LENGTH_ENDINGS[ending])}

    def angle(self, name: str, radians: FloatArray, *, full_circle: bool = False) -> Table:
        """One column of angles (rows,); blank where NaN.

        With `full_circle` what rounds up to a whole turn is written 0.
        """
        unit = ANGLE_ENDINGS["arcsec" if self.sexagesimal else "deg"]
        if full_circle and name in self.decimals:
            step = unit / 10 ** self.decimals[name]
            radians = np.round(radians / step) % round(FULL_TURN / step) * step
        if not self.sexagesimal:
            return {f"{name}_deg": self.numbers(name, radians, unit)}
        decimals = self.decimals.get(name, FULL_SECONDS)
        cells = ["" if angle != angle else format_dms(angle, decimals) for angle in radians.tolist()]
        return {f"{name}_dms": cells}

    def small_angle(self, name: str, radians: FloatArray) -> Table:
        """One column of small angles (rows,) in seconds of arc; blank where NaN."""
        return {f"{name}_arcsec": self.numbers(name, radians, ANGLE_ENDINGS["arcsec"])}

    def numbers(self, name: str, values: FloatArray, unit: float = 1.0) -> list[str]:
        """Cells of numbers (rows,) in a unit; blank where NaN."""
        decimals = self.decimals.get(name)
        if decimals is None:
            written = _exact(values, unit)
        else:
            written = list(map(format, (values / unit).tolist(), repeat(f".{decimals}f")))
        return ["" if cell == "nan" else cell for cell in written]


def _exact(values: FloatArray, unit: float) -> list[str]:
    """Numbers in a unit, in 15 digits where these come back as the same double, else in as many as that takes.

    0.3 mm, divided and printed in full, would read 0.29999999999999999.
    """
    converted = values / unit
    short = list(map(format, converted.tolist(), repeat(".15g")))
    lossy = np.flatnonzero(np.array(short, dtype=np.float64) * unit != values)
    for row, value in zip(lossy.tolist(), converted[lossy].tolist(), strict=True):
        short[row] = repr(value)
    return short


EXACT = Style()
"""Every number to the last digit."""


def without_blank_columns(table: Table) -> Table:
    """The table without the columns that are blank in every row."""
    return {title: cells for title, cells in table.items() if any(cells)}


def joined(tables: Sequence[Table]) -> Table:
    """Tables below each other; blank cells where one lacks a column of another."""
    titles = dict.fromkeys(title for table in tables for title in table)
    rows = [len(next(iter(table.values()))) for table in tables]
    return {
        title: [cell for table, count in zip(tables, rows, strict=True) for cell in table.get(title, [""] * count)]
        for title in titles
    }


def table_text(table: Table, comments: Sequence[str] = (), separator: str = ",") -> str:
    """A table as CSV text, `comments` above the header row."""
    lines = [*(f"# {comment}" for comment in comments), separator.join(table)]
    lines += map(separator.join, zip(*(_quoted(cells, separator) for cells in table.values()), strict=True))
    return "\n".join(lines) + "\n"


def _quoted(cells: list[str], separator: str) -> list[str]:
    """Cells in quotation marks where their own characters would cut the row or make it a comment."""
    signs = {separator, '"', "#"}
    if signs.isdisjoint("".join(cells)):
        return cells
    return [cell if signs.isdisjoint(cell) else '"' + cell.replace('"', '""') + '"' for cell in cells]


def names_of(numbers: IntArray, names: Sequence[str]) -> list[str]:
    """Names (rows,) by their numbers."""
    found: list[str] = np.array(names, dtype=object)[numbers].tolist()
    return found

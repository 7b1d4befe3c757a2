"""Numbers as they stand in one cell of the book: its unit, its separators, its decimals, and its digits."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from adjust.field_book.written import Cell
from adjust.units import ANGLE_ENDINGS, LENGTH_ENDINGS, format_dms, parse_angle, parse_length

_PARTS = re.compile(r"(-?)(\d+)(\D+)(\d+)(\D+)(\d+)(?:[.,](\d*))?(\D*)")
"""Sign, degrees, separator, minutes, separator, seconds, decimals, separator."""

MILLIMETRES = 3
"""Decimals of a metre for a height that nobody wrote down."""


@dataclass(frozen=True)
class Notation:
    """How one cell writes its number: `ending` is the unit of its column, `text` what stands there."""

    ending: str
    text: str

    @classmethod
    def of(cls, cell: Cell) -> Notation:
        """The notation of a cell whose title ends in its unit."""
        return cls(cell.title.rpartition("_")[2], cell.text)

    @property
    def unit(self) -> float:
        """Metres or radians in one unit (`dms`: in one degree)."""
        return {**LENGTH_ENDINGS, **ANGLE_ENDINGS}[self.ending]

    @property
    def sexagesimal(self) -> bool:
        """Whether it writes degrees, minutes and seconds."""
        return self.ending == "dms"

    @property
    def number(self) -> float:
        """What stands in the cell, metres or radians; NaN where it is no number."""
        return self.read(self.text)

    def read(self, text: str) -> float:
        """What a cell of the same column would mean, metres or radians; NaN where it could not stand there."""
        plain = text.replace(",", ".")
        try:
            return parse_angle(plain, self.ending) if self.ending in ANGLE_ENDINGS else parse_length(plain, self.ending)
        except ValueError:
            return math.nan

    @property
    def decimals(self) -> int:
        """Digits behind the point; of degrees, minutes and seconds those of the seconds; in a blank cell 3."""
        if not self.text:
            return MILLIMETRES
        _, point, behind = self.text.replace(",", ".").rpartition(".")
        return len(re.match(r"\d*", behind)[0]) if point else 0  # type: ignore[index]

    def write(self, value: float) -> str:
        """Metres or radians as this cell would write them."""
        if not self.sexagesimal:
            return self._pointed(f"{value / self.unit:.{self.decimals}f}")
        written = _PARTS.fullmatch(format_dms(value, self.decimals))
        like = _PARTS.fullmatch(self.text)
        if written is None or like is None:
            return format_dms(value, self.decimals)
        sign, degrees, _, minutes, _, seconds, decimals, _ = written.groups()
        degrees = degrees.zfill(len(like[2])) if like[2].startswith("0") else degrees
        behind = f".{decimals}" if decimals else ""
        return self._pointed(f"{sign}{degrees}{like[3]}{minutes}{like[5]}{seconds}{behind}{like[8]}")

    def _pointed(self, text: str) -> str:
        """With the decimal sign of the cell."""
        return text.replace(".", ",") if "," in self.text else text

    def digits(self) -> list[int]:
        """Where its digits stand in the text."""
        return [place for place, sign in enumerate(self.text) if sign.isdigit()]

"""The words and digits in which listings print figures: millimetres, arcseconds, degrees-minutes-seconds."""

from __future__ import annotations

import math

from adjust.reports.records import MILLIMETRES, Record
from adjust.units import format_dms

SHORT_NAMES = {
    "slope_distance": "slope",
    "horizontal_distance": "horizontal",
    "zenith": "zenith",
    "height_difference": "rise",
    "control": "control",
}
"""In a table's row, where the kind has a shorter name."""

_AXES = {"easting": "E", "northing": "N", "height": "H"}

ARCSECONDS = 3600.0
"""In a degree."""


def decimals(value: float | None, places: int, *, signed: bool = False) -> str:
    """A number with so many decimals, "" where there is none; what rounds to nothing has no sign."""
    if value is None or not math.isfinite(value):
        return ""
    text = f"{value:.{places}f}"
    if not text.strip("-0."):
        return text.lstrip("-")
    return f"+{text}" if signed and value > 0.0 else text


def dms(degrees: float | None, places: int) -> str:
    """Degrees printed as in the field book, 123-45-06.7."""
    return "" if degrees is None else format_dms(math.radians(degrees), places)


def small(record: Record, key: str, *, signed: bool = False) -> str:
    """A residual, sd or bias in millimetres or arcseconds."""
    value = record[key]
    scale = MILLIMETRES if record["unit"] == "m" else ARCSECONDS
    return decimals(None if value is None else value * scale, 2, signed=signed)


def small_unit(record: Record) -> str:
    """The unit of `small`."""
    return "mm" if record["unit"] == "m" else '"'


def observed(record: Record) -> str:
    """The value observed: metres, or degrees-minutes-seconds."""
    return decimals(record["observed"], 4) if record["unit"] == "m" else dms(record["observed"], 1)


def what(record: Record) -> str:
    """The kind, with its component."""
    kind: str = record["kind"]
    name = SHORT_NAMES.get(kind, kind)
    return name if record["component"] is None else f"{name} {_AXES.get(record['component'], record['component'])}"


def between(record: Record) -> str:
    """The marks: `A → B`, `S: A → B` for an angle, `A` for control."""
    at, start, end = record["at"], record["from"], record["to"]
    if at is not None and start is not None:
        return f"{at}: {start} → {end}"
    first = at if at is not None else start
    return first if end is None else f"{first} → {end}"


def counted(number: int, singular: str, plural: str) -> str:
    """`1 mark`, `12 marks`."""
    return f"{number} {singular if number == 1 else plural}"

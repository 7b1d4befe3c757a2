"""Units: what the endings of a column name mean, how numbers and angles are read, and how they are printed.

Inside the program everything is metres and radians. All parsers refuse what is not plainly a number: no NaN, no
infinity, no thousands separators, no stray letters. A blank cell is NaN to the column parsers, never to the others.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence

import numpy as np

from adjust.arrays import FloatArray

INTERNATIONAL_FOOT = 0.3048
"""Metres, exact: international yard and pound agreement of 1959 (NIST SP 811, 2008, appendix B.6; from memory)."""
US_SURVEY_FOOT = 1200 / 3937
"""Metres, exact: Mendenhall order of 1893 (NIST SP 811, 2008, appendix B.6; from memory)."""
DEGREE = math.pi / 180
"""Radians, exact by definition (SI brochure, 9th edition, table 8)."""
ARCMINUTE = math.pi / 10_800
"""Radians, exact by definition (SI brochure, 9th edition, table 8)."""
ARCSEC = math.pi / 648_000
"""Radians, exact by definition (SI brochure, 9th edition, table 8)."""
GON = math.pi / 200
"""Radians: 400 gon make a full circle (NIST SP 811, 2008, appendix B.8; from memory)."""

LENGTH_ENDINGS: dict[str, float] = {
    "m": 1.0,
    "mm": 1e-3,
    "km": 1e3,
    "ft": INTERNATIONAL_FOOT,
    "usft": US_SURVEY_FOOT,
}
"""Metres in one unit of each ending of a length column."""

ANGLE_ENDINGS: dict[str, float] = {
    "dms": DEGREE,
    "deg": DEGREE,
    "gon": GON,
    "rad": 1.0,
    "arcsec": ARCSEC,
    "mgon": GON / 1000,
}
"""Radians in one unit of each ending of an angle column (`dms`: of its degrees)."""

_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_NUMBER_CHARACTERS = frozenset("0123456789+-.eE")
_SECONDS = r"[0-9]{1,2}(?:\.[0-9]*)?"
_DMS = (
    rf"-?[0-9]{{1,3}}(?:-[0-9]{{1,2}}-{_SECONDS}| +[0-9]{{1,2}} +{_SECONDS}"
    rf"| ?° ?[0-9]{{1,2}} ?['′’] ?{_SECONDS} ?(?:[\"″”]|''))"
)
_DMS_CELL = re.compile(_DMS)
_DMS_COLUMN = re.compile(rf"(?:\n{_DMS})*")
_DMS_SEPARATORS = str.maketrans("-°'′’\"″”", "        ")
_SHOWN_CHARACTERS = 40


def shown(text: str) -> str:
    """Quote what was read for a message: control characters escaped, cut when it is long."""
    return repr(text) if len(text) <= _SHOWN_CHARACTERS else f"{text[:_SHOWN_CHARACTERS]!r}…"


def parse_number(text: str) -> float:
    """Read one finite number.

    Raises ValueError with a message that says what was read and what is expected.
    """
    if not _NUMBER.fullmatch(text):
        raise ValueError(f"read {shown(text)}, expected {_number_hint(text)}")
    value = float(text)
    if not math.isfinite(value):
        raise ValueError(f"read {shown(text)}, which is too large for a number; check the exponent")
    return value


def _number_hint(text: str) -> str:
    if text.strip("+-").lower() in ("nan", "inf", "infinity"):
        return "a finite number; leave the cell blank where there is no value"
    if "," in text:
        return (
            "a number without commas: no thousands separators, and decimal commas only in files separated by semicolons"
        )
    if "\N{MINUS SIGN}" in text or "\N{EN DASH}" in text:
        return "the plain minus '-' of the keyboard before a number"
    if re.search(r"[0-9] [0-9]", text):
        return "a number without spaces between its digits"
    return "a number such as 12.345; digits, a point and a leading sign only"


def parse_dms(text: str) -> float:
    """Read degrees, minutes and seconds in one of three notations; degrees, a leading '-' holds for the whole angle.

    `123-45-06.7`, `123 45 06.7` and `123°45'06.7"` are the same angle. Raises ValueError as `parse_number` does.
    """
    if not _DMS_CELL.fullmatch(text):
        raise ValueError(
            f"read {shown(text)}, expected degrees, minutes and seconds: 123-45-06.7, 123 45 06.7 or 123°45'06.7\""
        )
    degrees, minutes, seconds = map(float, text.translate(_DMS_SEPARATORS).split())
    if minutes >= 60:
        raise ValueError(f"read {shown(text)} with {minutes:g} minutes; minutes of arc stay below 60")
    if seconds >= 60:
        raise ValueError(f"read {shown(text)} with {seconds:g} seconds; seconds of arc stay below 60")
    magnitude = degrees + (minutes * 60 + seconds) / 3600
    return -magnitude if text.startswith("-") else magnitude


def parse_length(text: str, ending: str) -> float:
    """Read one length in the unit of `ending` (a key of `LENGTH_ENDINGS`); metres. Raises ValueError."""
    return parse_number(text) * LENGTH_ENDINGS[ending]


def parse_angle(text: str, ending: str) -> float:
    """Read one angle in the unit of `ending` (a key of `ANGLE_ENDINGS`); radians. Raises ValueError."""
    return (parse_dms(text) if ending == "dms" else parse_number(text)) * ANGLE_ENDINGS[ending]


def parse_numbers(cells: Sequence[str]) -> FloatArray:
    """Read a column of numbers (rows,) at once; NaN where a cell is blank.

    Raises ValueError when any cell is not a finite number; `parse_number` then finds which.
    """
    if not _NUMBER_CHARACTERS.issuperset("".join(cells)):
        raise ValueError("a cell holds more than digits")
    values = np.fromiter(map(float, [cell or "nan" for cell in cells]), np.float64, len(cells))
    if np.any(np.isinf(values)):
        raise ValueError("a number is too large")
    return values


def parse_dms_column(cells: Sequence[str]) -> FloatArray:
    """Read a column of degrees, minutes and seconds (rows,), degrees; NaN where a cell is blank.

    Raises ValueError when any cell is not such an angle; `parse_dms` then finds which.
    """
    text = "".join([f"\n{cell or '0-0-0'}" for cell in cells])
    if not _DMS_COLUMN.fullmatch(text):
        raise ValueError("a cell is not an angle in degrees, minutes and seconds")
    numbers = text.translate(_DMS_SEPARATORS).split()
    parts = np.fromiter(map(float, numbers), np.float64, len(numbers)).reshape(-1, 3)
    if np.any(parts[:, 1:] >= 60):
        raise ValueError("minutes or seconds reach 60")
    magnitude = parts[:, 0] + (parts[:, 1] * 60 + parts[:, 2]) / 3600
    factor = [np.nan if not cell else -1.0 if cell[0] == "-" else 1.0 for cell in cells]
    return np.array(factor) * magnitude


def parse_lengths(cells: Sequence[str], ending: str) -> FloatArray:
    """Read a column of lengths (rows,), metres; NaN where blank. Raises ValueError as `parse_numbers` does.

    A number that only its unit makes too large comes out infinite, for the caller's bounds to refuse.
    """
    with np.errstate(over="ignore"):
        return parse_numbers(cells) * LENGTH_ENDINGS[ending]


def parse_angles(cells: Sequence[str], ending: str) -> FloatArray:
    """Read a column of angles (rows,), radians; NaN where blank. Raises ValueError as `parse_numbers` does."""
    return (parse_dms_column(cells) if ending == "dms" else parse_numbers(cells)) * ANGLE_ENDINGS[ending]


def format_dms(angle: float, decimals: int = 1) -> str:
    """Print an angle in radians as `123-45-06.7` with so many decimals of the seconds.

    Rounds once, so that seconds never print as 60; an angle that rounds to nothing has no sign.
    Raises ValueError when the angle is not finite.
    """
    if not math.isfinite(angle):
        raise ValueError(f"{angle} is not an angle that can be printed")
    scale = 10**decimals
    ticks = round(abs(angle) / ARCSEC * scale)
    minutes, second_ticks = divmod(ticks, 60 * scale)
    degrees, minutes = divmod(minutes, 60)
    seconds, fraction = divmod(second_ticks, scale)
    sign = "-" if angle < 0 and ticks else ""
    tail = f".{fraction:0{decimals}d}" if decimals else ""
    return f"{sign}{degrees}-{minutes:02d}-{seconds:02d}{tail}"

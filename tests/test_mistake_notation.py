"""Numbers in the notation of one cell: read, written again, and left alone where they are none."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.blunders.mistakes.degrees_and_gon import decimal_of, sexagesimal_of
from adjust.blunders.mistakes.digits_exchanged import neighbours
from adjust.blunders.mistakes.notation import Notation
from adjust.field_book.written import Cell
from adjust.units import ARCSEC, DEGREE, GON

TEXTS = [
    ("slope_m", "187.654", 187.654),
    ("slope_mm", "187654", 187.654),
    ("rise_ft", "-1.250", -0.381),
    ("slope_m", "187,654", 187.654),
    ("direction_dms", "123-45-06.7", (123 + 45 / 60 + 6.7 / 3600) * DEGREE),
    ("direction_dms", "003 05 06", (3 + 5 / 60 + 6 / 3600) * DEGREE),
    ("direction_dms", "123°45'06,7\"", (123 + 45 / 60 + 6.7 / 3600) * DEGREE),
    ("zenith_gon", "99.9876", 99.9876 * GON),
]


@pytest.mark.parametrize(("title", "text", "value"), TEXTS)
def test_cells_are_read_and_written_as_they_stand(title: str, text: str, value: float) -> None:
    notation = Notation.of(Cell(title, text))
    assert notation.number == pytest.approx(value, rel=0, abs=1e-12)  # m or rad: rounding of the conversion
    assert notation.write(notation.number) == text


@given(st.integers(0, 359), st.integers(0, 59), st.integers(0, 599))
def test_any_angle_comes_back(degrees: int, minutes: int, tenths: int) -> None:
    text = f"{degrees}-{minutes:02d}-{tenths // 10:02d}.{tenths % 10}"
    notation = Notation("dms", "0-00-00.0")
    assert notation.write(notation.read(text)) == text


def test_what_cannot_stand_in_a_cell_is_no_number() -> None:
    assert math.isnan(Notation("dms", "1-00-00").read("1-60-00"))
    assert math.isnan(Notation("m", "1.0").read("1.0.0"))
    assert math.isnan(Notation("m", "").number)


def test_a_blank_cell_is_filled_to_the_millimetre() -> None:
    assert Notation("m", "").write(1.60749) == "1.607"


def test_digits_change_places_with_their_neighbours_only() -> None:
    def pairs(title: str, text: str) -> set[str]:
        return {text[i] + text[j] for i, j in neighbours(Notation.of(Cell(title, text)))}

    assert pairs("slope_m", "18.554") == {"18", "85", "54"}  # 8 and 5 across the point, 5 and 5 not at all
    assert pairs("direction_dms", "12-34-05.6") == {"12", "34", "05", "56"}  # not from degrees to minutes


def test_sexagesimal_digits_as_decimals_and_back() -> None:
    assert decimal_of("123-45-06.7") == 123.45067
    assert sexagesimal_of(123.45067) == pytest.approx((123 + 45 / 60 + 6.7 / 3600) * DEGREE, rel=0, abs=1e-6 * ARCSEC)
    assert np.isnan(sexagesimal_of(123.67))
    assert np.isnan(decimal_of("123.45"))

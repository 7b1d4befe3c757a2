"""Units are read exactly and strictly, and angles print as they are read."""

from __future__ import annotations

import math
import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.units import (
    ANGLE_ENDINGS,
    ARCMINUTE,
    ARCSEC,
    DEGREE,
    GON,
    INTERNATIONAL_FOOT,
    LENGTH_ENDINGS,
    US_SURVEY_FOOT,
    format_dms,
    parse_angle,
    parse_angles,
    parse_dms,
    parse_dms_column,
    parse_length,
    parse_lengths,
    parse_number,
    parse_numbers,
    shown,
)

ROUNDING = 1e-15
"""rad: a few units in the last place of an angle below one radian."""


def test_feet_as_published() -> None:
    # NIST Special Publication 811 (2008), appendix B.8, from memory: foot 3.048 E-01 m (exact), US survey foot
    # 3.048 006 E-01 m.
    assert parse_length("1", "ft") == 0.3048
    assert parse_length("1", "usft") == pytest.approx(0.3048006, rel=0, abs=5e-8)  # m: the printed digits
    assert parse_length("3937", "usft") == pytest.approx(1200.0, rel=0, abs=1e-12)  # m: rounding
    assert INTERNATIONAL_FOOT < US_SURVEY_FOOT


def test_angle_units_as_published() -> None:
    # NIST Special Publication 811 (2008), appendix B.8, from memory: a gon is 9.0 E-01 degree,
    # a degree 1.745 329 E-02 rad, a second 4.848 137 E-06 rad.
    assert parse_angle("1", "gon") == pytest.approx(parse_angle("0.9", "deg"), rel=0, abs=ROUNDING)
    assert parse_angle("1", "deg") == pytest.approx(1.745329e-2, rel=0, abs=5e-9)  # rad: the printed digits
    assert parse_angle("1", "arcsec") == pytest.approx(4.848137e-6, rel=0, abs=5e-13)  # rad: the printed digits
    for sum_of_parts, whole in ((60 * ARCSEC, ARCMINUTE), (60 * ARCMINUTE, DEGREE), (200 * GON, math.pi)):
        assert sum_of_parts == pytest.approx(whole, rel=1e-15)


@pytest.mark.parametrize(
    ("ending", "text"),
    [
        ("deg", "123.7518611111111"),
        ("gon", "137.5020679012346"),
        ("rad", "2.159877431"),
        ("arcsec", "445506.7"),
        ("mgon", "137502.0679012346"),
    ],
)
def test_one_angle_in_every_unit(ending: str, text: str) -> None:
    assert parse_angle(text, ending) == pytest.approx(parse_angle("123-45-06.7", "dms"), rel=0, abs=1e-9)  # rad: digits


@pytest.mark.parametrize(
    ("ending", "text"), [("m", "1234.5"), ("mm", "1234500"), ("km", "1.2345"), ("ft", "4050.19685")]
)
def test_one_length_in_every_unit(ending: str, text: str) -> None:
    assert parse_length(text, ending) == pytest.approx(1234.5, rel=0, abs=1e-6)  # m: the digits written


NOTATIONS = [
    "123-45-06.7",
    "123 45 06.7",
    "123°45'06.7\"",
    "123° 45' 06.7\"",
    "123°45′06.7″",
    "123  45  6.7",
    "123°45'06.7''",
]


@pytest.mark.parametrize("text", NOTATIONS)
def test_notations_of_degrees_minutes_and_seconds(text: str) -> None:
    expected = 123 + 45 / 60 + 6.7 / 3600
    assert parse_dms(text) == pytest.approx(expected, rel=0, abs=1e-13)  # degrees: rounding
    assert parse_dms(f"-{text}") == -parse_dms(text)


def test_minus_holds_for_the_whole_angle() -> None:
    assert parse_dms("-0-00-30") == pytest.approx(-30 / 3600, rel=0, abs=1e-18)  # degrees: rounding
    np.testing.assert_array_equal(parse_dms_column(["-0-00-30", "-1 30 00"]), [-30 / 3600, -1.5])


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("12-60-00", "60 minutes"),
        ("12-61-00", "61 minutes"),
        ("12-00-60", "60 seconds"),
        ("12-00-99.9", "99.9 seconds"),
        ("12.5", "expected degrees, minutes and seconds"),
        ("12-30", "expected degrees, minutes and seconds"),
        ("12-30 15", "expected degrees, minutes and seconds"),
        ("12--30-15", "expected degrees, minutes and seconds"),
        ("12-30-1e1", "expected degrees, minutes and seconds"),
        ("+12-30-15", "expected degrees, minutes and seconds"),
        ("12-30-15S", "expected degrees, minutes and seconds"),
        ("1234-30-15", "expected degrees, minutes and seconds"),
        ("12-30-१५", "expected degrees, minutes and seconds"),
        ("", "expected degrees, minutes and seconds"),
    ],
)
def test_angles_that_are_none(text: str, reason: str) -> None:
    with pytest.raises(ValueError, match=re.escape(reason)):
        parse_dms(text)


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("nan", "finite"),
        ("-inf", "finite"),
        ("Infinity", "finite"),
        ("1e400", "too large"),
        ("1,234.5", "commas"),
        ("12,5", "commas"),
        ("1 234", "spaces"),
        ("1_000", "digits"),
        ("12.3m", "digits"),
        ("1.2.3", "digits"),
        ("0x10", "digits"),
        ("१२", "digits"),
        ("−5", "minus"),
        ("--5", "digits"),
        ("1e", "digits"),
        (".", "digits"),
        ("", "digits"),
    ],
)
def test_numbers_that_are_none(text: str, reason: str) -> None:
    with pytest.raises(ValueError, match=reason) as caught:
        parse_number(text)
    assert shown(text) in str(caught.value)


@given(st.lists(st.text(alphabet="0123456789+-.eE", max_size=8).filter(bool), max_size=4))
def test_columns_and_cells_accept_the_same_numbers(cells: list[str]) -> None:
    try:
        singly = [parse_number(cell) for cell in cells]
    except ValueError:
        with pytest.raises(ValueError, match=r"cell|number|float"):
            parse_numbers(cells)
    else:
        np.testing.assert_array_equal(parse_numbers(cells), singly)


@given(st.lists(st.text(alphabet="0123456789- °'\".", max_size=11).filter(bool), max_size=3))
def test_columns_and_cells_accept_the_same_angles(cells: list[str]) -> None:
    try:
        singly = [parse_dms(cell) for cell in cells]
    except ValueError:
        with pytest.raises(ValueError, match=r"cell|minutes"):
            parse_dms_column(cells)
    else:
        np.testing.assert_array_equal(parse_dms_column(cells), singly)


@given(st.floats(-400, 400, allow_nan=False), st.integers(0, 6))
def test_printed_angles_read_back(degrees: float, decimals: int) -> None:
    angle = math.radians(degrees)
    printed = format_dms(angle, decimals)
    half_a_digit = 0.5 * ARCSEC / 10**decimals
    assert parse_angle(printed, "dms") == pytest.approx(angle, rel=0, abs=half_a_digit + 1e-14)  # rad: rounding of 400°
    assert format_dms(parse_angle(printed, "dms"), decimals) == printed


@given(st.floats(-1e8, 1e8, allow_nan=False), st.sampled_from(sorted(LENGTH_ENDINGS)))
def test_lengths_read_back_in_every_unit(metres: float, ending: str) -> None:
    written = repr(metres / LENGTH_ENDINGS[ending])
    assert parse_lengths([written], ending)[0] == pytest.approx(metres, rel=1e-15, abs=1e-300)


@given(st.floats(-7, 7, allow_nan=False), st.sampled_from(sorted(set(ANGLE_ENDINGS) - {"dms"})))
def test_angles_read_back_in_every_unit(radians: float, ending: str) -> None:
    written = repr(radians / ANGLE_ENDINGS[ending])
    assert parse_angles([written], ending)[0] == pytest.approx(radians, rel=1e-15, abs=1e-300)


@pytest.mark.parametrize(
    ("angle", "decimals", "text"),
    [
        (parse_angle("59-59-59.96", "dms"), 1, "60-00-00.0"),
        (-0.04 * ARCSEC, 1, "0-00-00.0"),
        (-0.06 * ARCSEC, 1, "-0-00-00.1"),
        (parse_angle("1-02-03.4", "dms"), 0, "1-02-03"),
        (0.0, 3, "0-00-00.000"),
    ],
)
def test_printing_rounds_once(angle: float, decimals: int, text: str) -> None:
    assert format_dms(angle, decimals) == text


@pytest.mark.parametrize("angle", [math.nan, math.inf])
def test_only_angles_are_printed(angle: float) -> None:
    with pytest.raises(ValueError, match="not an angle"):
        format_dms(angle)


def test_blank_cells_are_nan() -> None:
    np.testing.assert_array_equal(parse_numbers(["", "1"]), [np.nan, 1.0])
    np.testing.assert_array_equal(parse_dms_column(["", "1-30-00"]), [np.nan, 1.5])
    assert len(parse_dms_column([])) == len(parse_numbers([])) == 0


def test_what_was_read_is_cut_when_it_is_long() -> None:
    assert len(shown("x" * 1000)) < 50
    assert shown("a\tb") == "'a\\tb'"

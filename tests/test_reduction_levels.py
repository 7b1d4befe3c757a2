"""Level books: published pages, simulated walks, and books that cannot be."""

import json
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.reductions.level_book import TURNING_POINT, StaffRows, arithmetic_check, faults_of, reduce_levels
from adjust.units import ARCSEC

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "reductions.json").read_text("utf-8"))}
"""Each entry names its source."""
READING = 1e-11
"""Metres: rounding of running sums of staff readings."""


def book(rows, line=None, collimation=0.0):
    """Rows (mark, backsight, intermediate, foresight[, backsight distance, foresight distance]); None: not read."""
    table = np.array([[*row[1:], *[None] * (6 - len(row))] for row in rows], dtype=float)
    return StaffRows(
        np.array(line if line is not None else [0] * len(rows)),
        np.array([row[0] for row in rows]),
        *table.T,
        np.full(len(rows), collimation),
    )


def test_level_book_lb1():
    entry = ENTRIES["LB1"]
    rows = [(number, *row[1:]) for number, row in enumerate(entry["inputs"]["rows"])]
    levels = book(rows)
    assert faults_of(levels) == []
    sections = reduce_levels(levels)
    heights = {0: entry["inputs"]["benchmark"]}
    for start, end, rise in zip(sections.start, sections.end, sections.rise, strict=True):
        heights[int(levels.mark[end])] = heights[int(levels.mark[start])] + rise
    printed = entry["check"]
    np.testing.assert_allclose([heights[n] for n in range(7)], printed["heights"], rtol=0, atol=READING)
    check = arithmetic_check(levels, sections, 1)
    assert check.backsights[0] == pytest.approx(printed["sum_backsights"], rel=0, abs=READING)
    assert check.foresights[0] == pytest.approx(printed["sum_foresights"], rel=0, abs=READING)
    assert check.backsights[0] - check.foresights[0] == pytest.approx(printed["difference"], rel=0, abs=READING)
    assert abs(check.difference[0]) < READING


def test_turning_points_sum_to_one_section():
    sections = reduce_levels(
        book([(4, 1.5, None, None, 30, None), (TURNING_POINT, 2.0, None, 0.5, 40, 35), (9, None, None, 0.25, None, 45)])
    )
    assert (sections.start.tolist(), sections.end.tolist(), sections.setups.tolist()) == ([0], [2], [2])
    assert sections.rise[0] == pytest.approx(2.75, rel=0, abs=READING)
    assert sections.length[0] == pytest.approx(150, rel=0, abs=READING)
    assert sections.imbalance[0] == pytest.approx(-10, rel=0, abs=READING)


def test_side_shots_start_at_the_last_mark_passed():
    sections = reduce_levels(
        book(
            [
                (4, 1.5, None, None),
                (TURNING_POINT, 2.0, None, 0.5),
                (7, None, 1.2, None),
                (8, None, 0.7, None),
                (9, None, None, 0.25),
            ]
        )
    )
    assert sections.side.tolist() == [True, True, False]
    np.testing.assert_allclose(sections.rise, [1.8, 2.3, 2.75], rtol=0, atol=READING)
    assert sections.start.tolist() == [0, 0, 0]
    assert np.isnan(sections.length).all()


def test_a_missing_distance_spoils_its_own_section_only():
    sections = reduce_levels(
        book(
            [
                (1, 1.5, None, None, 30, None),
                (2, 2.0, None, 0.5, 40, None),
                (3, None, None, 0.25, None, 45),
                (3, 1.0, None, None, 20, None),
                (4, None, None, 1.0, None, 21),
            ],
            line=[0, 0, 0, 1, 1],
        )
    )
    np.testing.assert_allclose(sections.length, [np.nan, 85, 41], rtol=0, atol=READING)
    np.testing.assert_allclose(sections.imbalance, [np.nan, -5, -1], rtol=0, atol=READING)


READINGS = st.floats(0.2, 3.8)
SIGHTS = st.floats(5, 90)
SETUPS = st.lists(st.tuples(READINGS, READINGS, SIGHTS, SIGHTS, st.booleans()), min_size=1, max_size=12)


@given(SETUPS, st.floats(-20 * ARCSEC, 20 * ARCSEC))
def test_known_collimation_of_unequal_sights_is_taken_out(setups, collimation):
    """A walk with a level whose line of sight rises: the reduced rises are those of a perfect one."""
    true, tilted = [], []
    rows = [*setups, (None, None, None, None, True)]
    for number, (back, _, behind, _, is_mark) in enumerate(rows):
        fore, ahead = setups[number - 1][1:4:2] if number else (None, None)
        mark = number if is_mark or number == 0 else TURNING_POINT
        true.append((mark, back, None, fore, behind, ahead))
        readings = [None if r is None else r + collimation * d for r, d in ((back, behind), (fore, ahead))]
        tilted.append((mark, readings[0], None, readings[1], behind, ahead))
    perfect, corrected = reduce_levels(book(true)), reduce_levels(book(tilted, collimation=collimation))
    np.testing.assert_allclose(corrected.rise, perfect.rise, rtol=0, atol=READING)
    expected = -collimation * perfect.imbalance
    np.testing.assert_allclose(corrected.correction, expected, rtol=0, atol=READING)
    check = arithmetic_check(book(tilted), corrected, 1)
    assert abs(check.difference[0]) < READING


@pytest.mark.parametrize(
    ("rows", "row", "words"),
    [
        ([(1, None, None, 1.0), (2, None, None, 1.0)], 0, "starts with a backsight"),
        ([(1, 1.0, None, None), (2, 1.0, None, 1.0)], 1, "ends with a foresight"),
        ([(TURNING_POINT, 1.0, None, None), (2, None, None, 1.0)], 0, "starts on a mark"),
        ([(1, 1.0, None, None), (TURNING_POINT, None, None, 1.0)], 1, "ends on a mark"),
        ([(1, 1.0, None, None), (2, None, 1.0, 1.0)], 1, "row of its own"),
        ([(1, 1.0, None, None), (2, None, None, None), (3, None, None, 1.0)], 1, "no staff reading"),
        ([(1, 1.0, None, None), (2, None, None, 1.0), (3, None, None, 1.0)], 2, "missing backsight"),
        ([(1, 1.0, None, None), (2, 1.0, None, None), (3, None, None, 1.0)], 1, "missing foresight"),
        ([(1, 1.0, None, None), (TURNING_POINT, None, 1.0, None), (3, None, None, 1.0)], 1, "name the mark"),
    ],
)
def test_books_that_cannot_be(rows, row, words):
    faults = dict(faults_of(book(rows)))
    assert words in faults[row]


def test_faults_of_one_line_do_not_spread_to_the_next():
    rows = [
        (1, 1.0, None, None),
        (2, None, None, 1.0),
        (3, None, None, 0.9),
        (1, 1.0, None, None),
        (2, None, None, 1.0),
    ]
    assert [row for row, _ in faults_of(book(rows, line=[0, 0, 0, 1, 1]))] == [2]

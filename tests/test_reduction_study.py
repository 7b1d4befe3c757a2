"""A small run of the study of raw books; docs/reductions.md has the large one."""

import numpy as np
import pytest

from tests.studies.raw_readings import CIRCUMSTANCES, PAGE, compared, report, verdicts

BOOKS = 12


@pytest.fixture(scope="module")
def found():
    return list(verdicts(BOOKS))


def test_readings_come_back_within_their_stated_sds(found):
    """χ² within bounds that hold 998 times in 1000, for every kind under all circumstances."""
    kinds = {verdict.kind for verdict in found}
    assert kinds == {"direction", "slope_distance", "zenith", "height_difference"}
    assert len(found) == len(CIRCUMSTANCES) * len(kinds)
    assert [v for v in found if not v.holds] == []


def test_a_gross_error_would_show():
    """The same comparison, with every stated sd half of what it should be, misses its bounds."""
    book = compared(CIRCUMSTANCES[0], 0)["direction"]
    assert 4 * book.statistic / book.freedom > 2


def test_reduction_is_the_same_for_the_same_seed():
    first, again = (compared(CIRCUMSTANCES[1], 5)["direction"].standardised for _ in range(2))
    np.testing.assert_array_equal(first, again)


def test_table_has_a_row_for_every_verdict(found):
    assert report(found).count("\n") == len(found) + 2
    page = PAGE.read_text("utf-8")
    for circumstances in CIRCUMSTANCES:
        assert circumstances.title in page

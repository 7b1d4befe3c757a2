"""listing.txt: fits a screen, the verdict first, the figures of the results, and honest about what it leaves out."""

import re
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.job import Statistics
from adjust.reports import layout
from adjust.reports.layout import Column, shortened, table
from adjust.reports.listing import STANDING_CAUTION, datum_words, listing
from adjust.reports.records import mark_figures, observation_figures, records
from adjust.reports.selection import worst_first
from adjust.reports.verdict import cautions, digits_left, verdict
from tests.adjusted_networks import JOBS, adjusted


@pytest.mark.parametrize("order", ["worst", "book"])
@pytest.mark.parametrize("name", list(JOBS))
def test_no_line_is_wider_than_a_screen(name, order):
    lines = listing(adjusted(name), order)
    assert max(map(len, lines)) <= layout.WIDTH
    assert all(line == line.rstrip() for line in lines)


def test_long_names_are_shortened_rather_than_the_screen_widened():
    adjustment = adjusted("blunder")
    names = tuple(f"{name} at the north-eastern corner of the upper reservoir" for name in adjustment.job.marks.names)
    renamed = replace(adjustment, job=replace(adjustment.job, marks=replace(adjustment.job.marks, names=names)))
    lines = listing(renamed)
    assert max(map(len, lines)) <= layout.WIDTH
    assert any("…" in line for line in lines)


@pytest.mark.parametrize("name", list(JOBS))
def test_title_and_verdict_come_first(name):
    adjustment = adjusted(name)
    lines = listing(adjustment)
    assert lines[0] == adjustment.job.title
    assert " ".join(lines[2:4]).startswith(verdict(adjustment)[:90])


def rows_of(chunks):
    return [record for figures in chunks for record in records(figures)]


def section(lines, heading):
    """The lines under a heading, up to the next blank line."""
    first = next(place for place, line in enumerate(lines) if line.startswith(heading)) + 2
    last = lines.index("", first) if "" in lines[first:] else len(lines)
    return lines[first:last]


@pytest.mark.parametrize("name", ["total station", "gnss"])
def test_coordinates_are_printed_to_a_tenth_of_a_millimetre(name):
    adjustment = adjusted(name)
    lines = section(listing(adjustment), "Coordinates")
    for record in rows_of(mark_figures(adjustment)):
        line = next(line for line in lines if line.split()[0] == record["mark"])
        figures = [float(cell) for cell in line.split()[1:]]
        expected = [record[key] for key in ("easting_m", "northing_m", "height_m")]
        np.testing.assert_allclose(figures[:3], expected, rtol=0, atol=0.51e-4)  # m
        keys = ("sd_easting_mm", "sd_northing_mm", "sd_height_mm", "horizontal_95_mm", "height_95_mm")
        np.testing.assert_allclose(figures[3:], [record[key] for key in keys], rtol=0, atol=0.0051)  # mm


def observation_lines(lines):
    return [line for line in section(lines, "Observations,") if re.search(r"\.csv:\d+$", line)]


@pytest.mark.parametrize("name", ["blunder", "mixed"])
def test_worst_order_goes_by_size_and_book_order_by_line(name):
    adjustment = adjusted(name)
    sizes = [abs(float(line.split()[0].rstrip("!"))) for line in observation_lines(listing(adjustment, "worst"))]
    assert sizes == sorted(sizes, reverse=True)
    sources = [line.split()[-1] for line in observation_lines(listing(adjustment, "book"))]
    assert sources == [record["source"] for record in rows_of(observation_figures(adjustment))]


def test_residuals_are_millimetres_and_arcseconds():
    adjustment = adjusted("blunder")
    records = rows_of(observation_figures(adjustment))
    for line, record in zip(observation_lines(listing(adjustment, "book")), records, strict=True):
        scale, unit = (1000, "mm") if record["unit"] == "m" else (3600, '"')
        cells = line.split()
        assert float(cells[1]) == pytest.approx(record["residual"] * scale, rel=0, abs=0.0051)
        assert float(cells[2]) == pytest.approx(record["sd"] * scale, rel=0, abs=0.0051)
        assert cells[4] == unit
        assert cells[0].endswith("!") == record["suspect"]


def test_suspects_say_what_they_are_off_by():
    """The blunder planted is 60 arcseconds; the estimate is good to a few sds of 2 or 3 arcseconds."""
    line = section(listing(adjusted("blunder")), "Suspect observations")[1]
    assert line.startswith("directions.csv:20")
    assert float(line.split()[-2]) == pytest.approx(60, rel=0, abs=12)


def test_cautions_and_notes_end_the_listing():
    adjustment = replace(adjusted("blunder"), notes=("Marks without a height stand on the mean height.",))
    lines = listing(adjustment)
    assert "Marks without a height stand on the mean height." in section(lines, "Notes")
    assert " ".join(section(lines, "Cautions")) == " ".join([*cautions(adjustment), STANDING_CAUTION])


def test_every_listing_ends_with_the_standing_caution():
    assert cautions(adjusted("levelling")) == ()
    assert " ".join(section(listing(adjusted("levelling")), "Cautions")) == STANDING_CAUTION


def test_large_tables_are_thinned_and_say_so():
    adjustment = adjusted("mixed")
    whole = [line.split()[-1] for line in observation_lines(listing(adjustment))]
    lines = listing(adjustment, most=5)
    assert [line.split()[-1] for line in observation_lines(lines)] == whole[:5]
    text = " ".join(lines)
    assert f"Shown are 5 of {adjustment.solution.observations}: those that fit worst." in text
    assert f"Shown are 5 of {len(adjustment.job.marks)}: the least certain, in the book's order." in text
    assert f"Shown are 5 of {len(adjustment.lines)}: the least certain for their length." in text
    shown = section(lines, "Coordinates")[2:7]
    radii = np.fmax(adjustment.horizontal_95, adjustment.height_95)
    worst = sorted(np.argsort(-np.nan_to_num(radii), kind="stable")[:5])
    assert [line.split()[0] for line in shown] == [adjustment.job.marks.names[mark] for mark in worst]


def test_thinned_book_order_keeps_the_worst():
    adjustment = adjusted("mixed")
    worst = observation_lines(listing(adjustment, "worst", most=7))
    book = observation_lines(listing(adjustment, "book", most=7))
    assert sorted(worst) == sorted(book)
    assert worst != book


@given(st.lists(st.sampled_from([0.0, 1.0, 2.5, np.nan]) | st.floats(0, 10), max_size=40), st.integers(1, 50))
def test_worst_first_is_a_stable_sort_cut_off(figures, most):
    whole = sorted(range(len(figures)), key=lambda place: -np.nan_to_num(figures[place], nan=-np.inf))
    assert worst_first(np.array(figures), most).tolist() == whole[:most]


def test_posterior_basis_tests_with_tau():
    adjustment = adjusted("posterior")
    text = "\n".join(listing(adjustment))
    assert "|τ| beyond" in text
    assert "posterior" in text
    assert section(listing(adjustment), "Observations,")[0].split()[0] == "τ"


def test_posterior_basis_without_degrees_of_freedom_tests_nothing_and_says_so():
    adjustment = adjusted("unchecked")
    job = replace(adjustment.job, statistics=Statistics(sd_basis="posterior"))
    lines = listing(replace(adjustment, job=job, solution=replace(adjustment.solution, sd_basis="posterior")))
    text = " ".join(lines)
    assert "inf" not in text.split()
    assert "nothing is left to test it against" in text
    assert "which does not exist without degrees of freedom" in text


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("levelling", "The observations agree as well as their sds promise"),
        ("blunder", "suspect"),
        ("unchecked", "Nothing checks these coordinates"),
    ],
)
def test_verdict_in_words(name, words):
    assert words in verdict(adjusted(name))


def test_verdict_names_the_worst_observation():
    assert "(directions.csv:20)" in verdict(adjusted("blunder"))


@pytest.mark.parametrize(("statistic", "words"), [(1e4, "disagree more"), (1e-6, "agree better")])
def test_verdict_tells_on_which_side_the_global_test_failed(statistic, words):
    adjustment = adjusted("levelling")
    test = replace(adjustment.solution.global_test, statistic=statistic, passed=False)
    failed = replace(adjustment, solution=replace(adjustment.solution, global_test=test))
    assert words in verdict(failed)
    assert verdict(failed) in cautions(failed)


def test_verdict_never_prints_different_figures_alike():
    """One degree of freedom at 95 %: the lower bound is 0.00098."""
    adjustment = adjusted("levelling")
    test = replace(adjustment.solution.global_test, statistic=4e-5, lower=9.8e-4, upper=5.02, passed=False)
    failed = replace(adjustment, solution=replace(adjustment.solution, global_test=test))
    assert "vᵀPv is 4.0e-05, expected between 9.8e-04 and 5.02." in verdict(failed)


def test_datum_of_a_free_network_in_words():
    free = adjusted("free")
    count = len(free.job.marks)
    assert f"fitted to the given coordinates of {count} marks" in datum_words(free)
    nothing = replace(free.job.marks, given=np.full_like(free.job.marks.given, np.nan))
    assert "no coordinates given" in datum_words(replace(free, job=replace(free.job, marks=nothing)))


def test_nothing_to_warn_of_means_no_caution():
    assert cautions(adjusted("levelling")) == ()


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"condition_number": 1e12}, "nearly undetermined"),
        ({"second_opinion_gap": 1e-3}, "differs by 1.0e-03 m"),
        ({"second_opinion_gap": np.nan}, "do not rely on it"),
        ({"sd_basis": "posterior", "degrees_of_freedom": 4}, "uncertain by about 35 %"),
    ],
)
def test_cautions_about_the_figures_themselves(changes, words):
    adjustment = adjusted("levelling")
    doubtful = replace(adjustment, solution=replace(adjustment.solution, **changes))
    assert any(words in caution for caution in cautions(doubtful))


def test_unchecked_observations_are_named():
    """A benchmark hung on by one line of levels beside a well checked net."""
    adjustment = adjusted("levelling")
    kind = adjustment.residuals[0]
    redundancy = kind.redundancy.copy()
    redundancy[3] = 0.0
    spur = replace(adjustment, residuals=(replace(kind, redundancy=redundancy),))
    source = kind.observations.provenance.label(3)
    assert cautions(spur) == (f"Nothing checks the observation {source}: a blunder in it would go unseen.",)


def test_digits_left_by_the_condition_number():
    assert digits_left(1.0) == pytest.approx(15.65, rel=0, abs=0.01)
    assert digits_left(1e10) == pytest.approx(5.65, rel=0, abs=0.01)
    assert digits_left(1e30) == 0.0


def test_significance_of_the_job_is_the_one_printed():
    adjustment = adjusted("levelling")
    job = replace(adjustment.job, statistics=Statistics(significance=0.05))
    assert "|w| beyond 1.960 is suspect (significance 0.05)" in "\n".join(listing(replace(adjustment, job=job)))


def test_tables_line_up_and_drop_empty_columns():
    columns = (Column("mark", text=True), Column("empty"), Column("height", "m"))
    lines = table(columns, [["A", "", "1.00"], ["Beacon", "", "-10.25"]])
    assert lines == ["mark    height", "             m", "A         1.00", "Beacon  -10.25"]


def test_shortened_text_shows_that_it_was_cut():
    assert shortened("reservoir", 6) == "reser…"
    assert shortened("directions.csv:13", 8, ending=True) == "….csv:13"
    assert shortened("short", 6) == "short"

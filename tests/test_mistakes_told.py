"""What is said of single suspects: the sentence, the corrected entry, what comes to the same, and silence."""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from adjust import Job, read_job
from adjust.blunders import Cell, Context, Correction, Explanation, Hypothesis
from adjust.blunders.cells import cells_of
from adjust.blunders.mistakes import explain
from adjust.blunders.mistakes.explaining import MOST_ODDS
from adjust.simulate import NETWORKS, observe, total_station_net
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_pointings import Habits
from adjust.units import DEGREE
from tests import planting
from tests.planting import Booked, Cells, book, read, retold, with_row
from tests.suspects import suspect_row


def sound_row(shape: str, kind: str, ending: str, row: int = 3) -> Booked:
    """A row of a network, booked in one unit."""
    generator = np.random.default_rng(4)
    plan = NETWORKS[shape](generator)
    job, _ = observe(plan, generator, start_sd=0.3)
    place = [rows.kind for rows in job.observations].index(kind)
    while True:
        booked = book(plan, job, place, row, generator)
        if any(cell.title.endswith(f"_{ending}") for cell in booked.cells.values()):
            return booked


def told(booked: Booked, wrong: Cells) -> tuple[Explanation, ...]:
    return explain(context_of(booked, wrong))


def context_of(booked: Booked, wrong: Cells) -> Context:
    context = suspect_row(with_row(booked, read(booked, wrong)), booked.place, booked.row, wrong)
    assert context is not None
    return context


def source(booked: Booked) -> str:
    return str(booked.itself.provenance.label(0))


def test_digits_are_quoted_as_they_stand_in_the_book() -> None:
    booked = sound_row("triangulation", "horizontal_distance", "m")
    right = booked.cells["horizontal"].text
    wrong = right[1] + right[0] + right[2:]
    (first, *_) = told(booked, retold(booked.cells, "horizontal", wrong))
    assert first.mistake == f"digits {right[0]} and {right[1]} exchanged: {right} in place of {wrong}"
    assert first.names == ("digits exchanged",)
    assert first.corrections == (Correction(source(booked), "horizontal_m", right),)
    assert first.corrected_value is not None
    assert first.corrected_value[0] == pytest.approx(float(right), rel=0, abs=1e-9)  # m: rounding
    assert first.w_after < 3.29


@pytest.mark.parametrize("ending", ["dms", "gon", "deg"])
def test_angles_are_corrected_in_their_own_notation(ending: str) -> None:
    booked = sound_row("total station, plane", "direction", ending)
    wrong = planting.revalued(booked.cells, "direction", lambda value: (value + np.pi) % (2 * np.pi))
    (first, *_) = told(booked, wrong)
    assert first.names[0] == "other face"
    (correction,) = first.corrections
    assert correction.title == f"direction_{ending}"
    assert correction.text == booked.cells["direction"].text


def test_another_mark_is_named() -> None:
    booked = sound_row("triangulation", "direction", "dms")
    right = booked.cells["to"].text
    other = booked.other_marks(np.random.default_rng(1))
    (first, *_) = told(booked, retold(booked.cells, "to", other))
    assert first.mistake == f"another mark: to {right} in place of {other}"
    assert first.corrected_value is None


def test_what_comes_to_the_same_is_told_once() -> None:
    booked = sound_row("levelling", "height_difference", "m")
    (first, *others) = told(booked, planting.sign(booked, np.random.default_rng(1)) or {})
    assert set(first.names) == {"sign", "from and to exchanged"}
    assert first.mistake.count(" in place of ") == 1
    assert all(not {"sign", "from and to exchanged"} & set(other.names) for other in others)


def test_a_missing_height_is_taken_from_the_other_sights() -> None:
    booked = sound_row("total station, plane", "zenith", "m")
    right = booked.cells["instrument_height"].text
    wrong = {name: cell for name, cell in booked.cells.items() if name != "instrument_height"}
    (first, *_) = told(booked, wrong)
    assert first.mistake == f"instrument height not entered: {right} in place of a blank"
    assert first.corrections == (Correction(source(booked), "instrument_height_m", right),)


def test_odds_are_against_everything_else_and_bounded() -> None:
    booked = sound_row("levelling", "height_difference", "m")
    every = told(booked, planting.sign(booked, np.random.default_rng(1)) or {})
    odds = np.array([explanation.odds for explanation in every])
    assert np.all(np.diff(odds) <= 0)
    assert odds[0] <= MOST_ODDS
    assert np.sum(odds / (1 + odds)) <= 1 + 1e-9  # probabilities of what excludes each other


def test_a_small_error_of_no_kind_is_left_unexplained() -> None:
    booked = sound_row("triangulation", "horizontal_distance", "m")
    sd = float(np.sqrt(context_of(booked, booked.cells).error_covariance[0, 0]))
    wrong = planting.revalued(booked.cells, "horizontal", lambda value: value + 8.5 * sd)
    assert told(booked, wrong) == ()


def test_a_misfit_beyond_the_critical_value_is_not_offered() -> None:
    booked = sound_row("levelling", "height_difference", "m")
    context = context_of(booked, planting.sign(booked, np.random.default_rng(1)) or {})
    away = replace(context, estimated_error=context.estimated_error + 5 * np.sqrt(context.error_covariance[0]))
    assert all("sign" not in explanation.names for explanation in explain(away))


@pytest.fixture(scope="module")
def raw() -> tuple[Job, Job, Callable[[int], list[dict[str, Cell]]]]:
    """A job of pointings, sound, and with 10° too much in one of the four readings of one direction."""
    generator = np.random.default_rng(12)
    party = read_by_a_party(total_station_net(generator), generator, Habits(rounds=2, missing=0.0))
    with tempfile.TemporaryDirectory() as name:
        party.folder.write(Path(name))
        sound = read_job(name)
        column = party.folder.tables["pointings"]["circle_deg"]
        column[1] = repr((float(column[1]) + 10.0) % 360.0)
        party.folder.write(Path(name))
        job = read_job(name)
        rows = job.observations[0]
        suspects = [Hypothesis("observation", "", ((0, np.array([row])),), ("",), "rad") for row in range(len(rows))]
        cells = [list(map(dict, lines)) for lines in cells_of(job, suspects, name)]
    return sound, job, cells.__getitem__


def test_one_of_several_readings_shows_with_its_part(
    raw: tuple[Job, Job, Callable[[int], list[dict[str, Cell]]]],
) -> None:
    sound, job, cells = raw
    changed = job.observations[0].observed[:, 0] - sound.observations[0].observed[:, 0]
    row = int(np.argmax(np.abs(changed)))
    lines = cells(row)
    assert len(lines) == 4
    context = suspect_row(job, 0, row, lines[0], tuple(lines[1:]))
    assert context is not None
    assert abs(context.estimated_error[0]) == pytest.approx(10 * DEGREE / 4, rel=0, abs=0.1 * DEGREE)
    (first, *_) = explain(context)
    assert "whole angle miscounted" in first.names
    assert first.mistake.startswith("10° miscounted")
    assert first.corrections == ()  # which of the four, no network can tell

"""The table of decisions: applied while a job is read, every mistake in it named, the book itself never touched."""

from __future__ import annotations

import csv
import hashlib
import io
from contextlib import suppress
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from adjust import FieldDataError, Job, read_job
from adjust.errors import Mistake
from adjust.field_book.writing import write_job
from tests.job_folders import ELLIPSOID, PLANE, RAW, Files, write_folder

HEADER = "source,decision,column,value,reason"


def decided(folder: Path, base: Files, *rows: str, header: str = HEADER) -> Job:
    """A job of `base` read with decisions; the bytes of its folder are as they were afterwards."""
    job = write_folder(folder / "job", base)
    table = folder / "decisions.csv"
    table.write_text("\n".join([header, *rows]) + "\n", "utf-8")
    before = digests(job)
    try:
        return read_job(job, table)
    finally:
        assert digests(job) == before


def digests(folder: Path) -> dict[str, str]:
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in folder.rglob("*")
        if path.is_file()
    }


def mistakes(folder: Path, base: Files, *rows: str, header: str = HEADER) -> tuple[Mistake, ...]:
    with pytest.raises(FieldDataError) as caught:
        decided(folder, base, *rows, header=header)
    return caught.value.mistakes


def rewritten(base: Files, table: str, old: str, new: str) -> Files:
    text = base[table]
    assert isinstance(text, str)
    assert text.count(old) == 1
    return {**base, table: text.replace(old, new)}


def same_job(folder: Path, first: Job, second: Job) -> bool:
    """Whether two jobs hold the same marks and observations, by what they are written as."""
    for name, job in (("one", first), ("other", second)):
        write_job(job, folder / name)
    return digests(folder / "one") == digests(folder / "other")


CORRECTIONS = {
    "the only value of a line": (PLANE, "distances.csv", "316.2346", "361.2346", "distances.csv:3,correct,,361.2346,x"),
    "a named column": (PLANE, "distances.csv", "1.52,", "1.25,", "distances.csv:3,correct,instrument_height_m,1.25,x"),
    "degrees, minutes and seconds": (
        *(PLANE, "directions.csv", "321-20-24.7", "321-20-42.7"),
        "directions.csv:4,correct,direction_dms,321-20-42.7,x",
    ),
    "gon": (PLANE, "angles.csv", "62.5666", "62.5766", "angles.csv:2,correct,,62.5766,x"),
    "another mark": (PLANE, "levels.csv", "A,B,2", "A,002,2", "levels.csv:3,correct,to,002,x"),
    "a coordinate": (PLANE, "marks.csv", "1400.000", "1410.000", "marks.csv:3,correct,easting_m,1410.000,x"),
    "control that is held no longer": (
        *(PLANE, "marks.csv", "52.000,fixed,fixed", "52.000,free,fixed"),
        "marks.csv:3,correct,plan_control,free,x",
    ),
    "a component of a vector": (ELLIPSOID, "vectors.csv", "930.331", "930.313", "vectors.csv:2,correct,dy_m,930.313,x"),
    "a reading of the circle": (
        *(RAW, "pointings.csv", "101-10-20", "101-20-10"),
        "pointings.csv:4,correct,circle_dms,101-20-10,x",
    ),
    "a reading of the staff": (
        RAW,
        "level_book.csv",
        "1.3005",
        "1.2005",
        "level_book.csv:6,correct,foresight_m,1.2005,x",
    ),
    "a cell emptied": (
        *(PLANE, "zeniths.csv", "1.55,1.60", ",1.60"),
        "zeniths.csv:2,correct,instrument_height_m,(blank),x",
    ),
}


@pytest.mark.parametrize("name", CORRECTIONS)
def test_a_correction_reads_as_if_the_book_said_so(name: str, tmp_path: Path) -> None:
    base, table, old, new, row = CORRECTIONS[name]
    job = decided(tmp_path / "decided", base, row)
    assert same_job(tmp_path, job, read_job(write_folder(tmp_path / "rewritten", rewritten(base, table, old, new))))
    (decision,) = job.decisions
    assert (decision.decision, decision.reason) == ("correct", "x")
    assert decision.written
    assert decision.written in old


LEFT_OUT = {
    "an observation": (PLANE, "distances.csv", 3),
    "a pointing": (RAW, "pointings.csv", 10),
    "a reading of a level book": (RAW, "level_book.csv", 5),
}


@pytest.mark.parametrize("name", LEFT_OUT)
def test_a_line_left_out_is_as_if_use_were_no(name: str, tmp_path: Path) -> None:
    base, table, number = LEFT_OUT[name]
    job = decided(tmp_path / "decided", base, f"{table}:{number},leave_out,,,measured to the wrong prism")
    text = base[table]
    assert isinstance(text, str)
    lines = text.splitlines()
    marked = [line + (",use" if not row else ",no" if row + 1 == number else ",") for row, line in enumerate(lines)]
    by_hand = read_job(write_folder(tmp_path / "by_hand", {**base, table: "\n".join(marked) + "\n"}))
    assert same_job(tmp_path, job, by_hand)
    assert [note for note in job.notes if "use = no" in note] == [note for note in by_hand.notes if "use = no" in note]


def test_what_is_kept_changes_nothing_but_the_fingerprint(tmp_path: Path) -> None:
    job = decided(tmp_path, PLANE, "distances.csv:3,keep,,,measured again: it is right")
    plain = read_job(tmp_path / "job")
    assert same_job(tmp_path, job, plain)
    assert job.input_sha256 != plain.input_sha256
    assert job.decisions[0].reason == "measured again: it is right"
    assert job.decisions[0].written == "316.2346"


def test_the_fingerprint_does_not_hang_on_where_the_table_lies(tmp_path: Path) -> None:
    row = "distances.csv:3,leave_out,,,wrong prism"
    first, second = (decided(tmp_path / name, PLANE, row) for name in ("here", "there"))
    other = decided(tmp_path / "other", PLANE, f"{row}!")
    assert first.input_sha256 == second.input_sha256 != other.input_sha256


SEMICOLONS = {
    **PLANE,
    "distances.csv": "at;to;slope_ft;instrument_height_m;target_height_m\n"
    "001;A;1182,929;1,55;1,60\nA;B;1037,515;1,52;1,60\n",
}


def test_books_of_semicolons_decimal_commas_and_feet(tmp_path: Path) -> None:
    quoted = decided(tmp_path / "a", SEMICOLONS, 'distances.csv:3,correct,slope_ft,"1037,551",digits')
    rows = "source;decision;value;reason\ndistances.csv:3;correct;1037,551;digits"
    semicolons = decided(tmp_path / "b", SEMICOLONS, *rows.splitlines()[1:], header=rows.splitlines()[0])
    assert same_job(tmp_path, quoted, semicolons)
    slope = next(rows for rows in quoted.observations if rows.kind == "slope_distance")
    np.testing.assert_allclose(slope.observed[:, 0], [1182.929 * 0.3048, 1037.551 * 0.3048], rtol=0, atol=1e-9)  # m


def test_several_corrections_of_one_line(tmp_path: Path) -> None:
    job = decided(
        tmp_path,
        PLANE,
        "distances.csv:3,correct,instrument_height_m,1.60,exchanged",
        "distances.csv:3,correct,target_height_m,1.52,exchanged",
    )
    slope = next(rows for rows in job.observations if rows.kind == "slope_distance")
    assert slope.heights[1].tolist() == [1.60, 1.52]
    assert [decision.written for decision in job.decisions] == ["1.52", "1.60"]


WRONG = {
    "no source": (",keep,,,", "source", "is blank"),
    "no line": ("distances.csv,keep,,,", "source", "expected file and line, as in distances.csv:13"),
    "a file that is not the job's": ("distance.csv:3,keep,,,", "source", "did you mean 'distances.csv'?"),
    "a file like none": ("zz:3,keep,,,", "source", "the job reads marks.csv"),
    "a line beyond the end": ("distances.csv:9,leave_out,,,x", "source", "those of distances.csv are on lines 2 to 3"),
    "the header row": ("distances.csv:1,leave_out,,,x", "source", "no row stands there"),
    "a mean of readings": ("pointings.csv:3+7,leave_out,,,x", "source", "pointings.csv:3, pointings.csv:7"),
    "another word": ("distances.csv:3,delete,,,x", "decision", "expected 'keep' or 'leave_out' or 'correct'"),
    "a mark left out": ("marks.csv:3,leave_out,,,x", "decision", "plan_control or height_control"),
    "correction without a value": ("distances.csv:3,correct,,,x", "value", "a correction needs the value"),
    "value for keep": ("distances.csv:3,keep,,316.2364,x", "value", "write 'correct', or empty the cell"),
    "value for leave_out": ("distances.csv:3,leave_out,,316.2364,x", "value", "the decision is leave_out"),
    "left out without a reason": ("distances.csv:3,leave_out,,,", "reason", "why this line is left out"),
    "corrected without a reason": ("distances.csv:3,correct,,316.2364,", "reason", "why this line is corrected"),
    "unknown column": ("distances.csv:3,correct,slop,316.2364,x", "column", "did you mean 'slope_m'?"),
    "column without its unit": ("distances.csv:3,keep,slope,,x", "column", "did you mean 'slope_m'?"),
    "column in another unit": ("distances.csv:3,correct,slope_ft,31,x", "column", "has it as 'slope_m'"),
    "column that is ignored": ("distances.csv:3,correct,note,31,x", "column", "which is no column of distances.csv"),
    "column of several not named": (
        "marks.csv:3,correct,,1.0,x",
        "column",
        "'easting_m' or 'northing_m' or 'height_m'",
    ),
    "no number": ("distances.csv:3,correct,,3l6.2364,x", "value", "expected a number"),
    "beyond the rule of the column": ("distances.csv:3,correct,,-316.2,x", "value", "expected a distance above 0"),
    "an angle in another notation": ("directions.csv:4,correct,,321.3456,x", "value", "expected degrees, minutes"),
    "a mark that is not there": (
        "levels.csv:3,correct,to,02x,x",
        "value",
        "did you mean '002'? (for levels.csv:3, to)",
    ),
    "both marks the same": ("levels.csv:3,correct,to,A,x", "value", "an observation joins different marks"),
    "a distance of two kinds": ("distances.csv:3,correct,horizontal_m,316.2,x", None, "both a slope and a horizontal"),
}


@pytest.mark.parametrize("name", WRONG)
def test_every_wrong_row_is_named(name: str, tmp_path: Path) -> None:
    row, column, said = WRONG[name]
    found = mistakes(tmp_path, PLANE, "levels.csv:2,keep,,,", row)
    assert any(said in str(mistake) for mistake in found), found
    mistake = next(mistake for mistake in found if said in str(mistake))
    assert (mistake.file, mistake.line) == (str(tmp_path / "decisions.csv"), 3) or column is None
    assert mistake.column == column or column is None


TWICE = {
    "the same column": ("distances.csv:3,keep,,,", "distances.csv:3,leave_out,,,x"),
    "by another writing of the line": ("distances.csv:3,keep,,,", "./distances.csv:03,keep,,,"),
    "left out and corrected": ("distances.csv:3,leave_out,,,x", "distances.csv:3,correct,target_height_m,1.6,x"),
    "kept and corrected by its title": ("distances.csv:3,keep,,,", "distances.csv:3,correct,slope_m,316.2,x"),
    "the value by its title": ("distances.csv:3,correct,,316.1,x", "distances.csv:3,correct,slope_m,316.2,x"),
}


@pytest.mark.parametrize("name", TWICE)
def test_no_line_is_decided_twice(name: str, tmp_path: Path) -> None:
    found = mistakes(tmp_path, PLANE, *TWICE[name])
    assert {mistake.column for mistake in found} == {"source"}
    assert all("keep one of the two rows" in mistake.message for mistake in found)


def test_a_table_that_is_none_is_named(tmp_path: Path) -> None:
    (unknown,) = mistakes(tmp_path / "a", PLANE, "distances.csv:3,keep", header="source,decison")
    assert "did you mean 'decision'?" in unknown.message
    (missing,) = mistakes(tmp_path / "b", PLANE, "keep,x", header="decision,reason")
    assert missing.column == "source"
    (empty,) = mistakes(tmp_path / "c", PLANE)
    assert "no rows" in empty.message
    with pytest.raises(FieldDataError, match=r"nowhere\.csv: cannot be read"):
        read_job(tmp_path / "a" / "job", tmp_path / "nowhere.csv")


def test_a_book_that_moved_on_is_not_corrected_in_the_wrong_line(tmp_path: Path) -> None:
    """`written` holds what was decided on, whether a spreadsheet dropped its zeros or not."""
    header = "source,decision,value,reason,written"
    sound = decided(tmp_path / "a", PLANE, "distances.csv:3,correct,361.2346,digits,316.23460", header=header)
    assert sound.decisions[0].written == "316.2346"
    (moved,) = mistakes(tmp_path / "b", PLANE, "distances.csv:2,correct,361.2346,digits,316.2346", header=header)
    assert (moved.line, moved.column) == (2, "written")
    assert "distances.csv:2 holds '360.5567' now" in moved.message
    (left,) = mistakes(tmp_path / "c", PLANE, "distances.csv:2,leave_out,,digits,316.2346", header=header)
    assert left.column == "written"


def test_a_proposal_may_stand_beside_keep_until_it_is_edited(tmp_path: Path) -> None:
    header = "source,decision,value,reason,proposal"
    job = decided(tmp_path / "a", PLANE, "distances.csv:3,keep,361.2346,,361.2346", header=header)
    assert job.decisions[0].value == ""
    (edited,) = mistakes(tmp_path / "b", PLANE, "distances.csv:3,keep,361.2347,,361.2346", header=header)
    assert "write 'correct'" in edited.message


def test_a_column_that_the_book_lacks_can_be_filled(tmp_path: Path) -> None:
    base = {**PLANE, "zeniths.csv": "at,to,zenith_deg\n001,A,89.8346\n"}
    job = decided(tmp_path, base, "zeniths.csv:2,correct,target_height_m,1.60,not entered")
    zenith = next(rows for rows in job.observations if rows.kind == "zenith")
    assert zenith.heights.tolist() == [[0.0, 1.60]]
    assert job.decisions[0].written == ""


def test_mistakes_of_the_book_stay_where_they_are(tmp_path: Path) -> None:
    base = rewritten(PLANE, "distances.csv", "316.2346", "3l6.2346")
    found = mistakes(tmp_path, base, "distances.csv:2,correct,,360.1,x", "levels.csv:3,keep,,,")
    assert [(mistake.file, mistake.line, mistake.column) for mistake in found] == [("distances.csv", 3, "slope_m")]


def test_a_correction_mends_a_cell_that_could_not_be_read(tmp_path: Path) -> None:
    base = rewritten(PLANE, "distances.csv", "316.2346", "3l6.2346")
    job = decided(tmp_path, base, "distances.csv:3,correct,slope_m,316.2346,an l for a 1")
    assert job.decisions[0].written == "3l6.2346"
    assert same_job(tmp_path, job, read_job(write_folder(tmp_path / "sound", PLANE)))


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    rows=st.lists(
        st.tuples(
            st.sampled_from(["distances.csv:3", "levels.csv:2", "marks.csv:3", "x.csv:1", "distances.csv", ":", ""]),
            st.sampled_from(["keep", "leave_out", "correct", "no", ""]),
            st.sampled_from(["", "slope_m", "to", "use", "rise_m", "plan_control", "sd_mm", "x"]),
            st.one_of(st.sampled_from(["1.0", "free", "A", "no", "(blank)", "", "-1"]), st.text(max_size=8)),
            st.sampled_from(["", "because"]),
        ),
        max_size=4,
    )
)
def test_any_table_is_carried_out_or_refused_in_words(tmp_path: Path, rows: list[tuple[str, ...]]) -> None:
    table = io.StringIO()
    csv.writer(table, lineterminator="\n").writerows([HEADER.split(","), *rows])
    folder = write_folder(tmp_path / "job", PLANE)
    before = digests(folder)
    (tmp_path / "decisions.csv").write_text(table.getvalue(), "utf-8", newline="")
    with suppress(FieldDataError):
        job = read_job(folder, tmp_path / "decisions.csv")
        assert all(decision.reason or decision.decision == "keep" for decision in job.decisions)
    assert digests(folder) == before


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(content=st.binary(max_size=200))
def test_what_is_no_table_is_refused_in_words(tmp_path: Path, content: bytes) -> None:
    folder = write_folder(tmp_path / "job", PLANE)
    (tmp_path / "decisions.csv").write_bytes(content)
    with pytest.raises(FieldDataError):
        read_job(folder, tmp_path / "decisions.csv")


def test_the_table_itself_is_no_unread_table_of_the_job(tmp_path: Path) -> None:
    folder = write_folder(tmp_path, PLANE)
    (folder / "decisions.csv").write_text(f"{HEADER}\nlevels.csv:2,keep,,,\n", "utf-8")
    assert not [note for note in read_job(folder, folder / "decisions.csv").notes if "not read" in note]
    assert [note for note in read_job(folder).notes if "decisions.csv" in note]

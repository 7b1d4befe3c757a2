"""Whatever stands in a job folder, reading it ends in a job or in a FieldDataError."""

from __future__ import annotations

import tempfile
from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from adjust import HubtackError, Job, read_job
from adjust.field_book.schema import TABLES
from tests.job_folders import ELLIPSOID, PLANE, RAW, Files, write_folder

BASES = dict.fromkeys(TABLES, PLANE) | {"vectors": ELLIPSOID, "pointings": RAW, "level_book": RAW}
HOSTILE = [
    "", " ", ",", ";", '"', "'", "#", "\n", "\r", "\t", "\x00", "\ufeff", "\u2028", "\xa0", "\x0c", "=", "[",
    "]", "{", "}", "\\", "nan", "inf", "-inf", "1e400", "1e-400", "1e308", "-1", "0", "-0", "00", "1_0", "+1",
    "1,5", "1.5.2", "0x1F", "１２", "1-2-3", "-0-00-00.1", "12-60-00", '1°2\'3"', "360", "400",
    "999999999999999999999", "fixed", "weighted", "yes", "no", "001", "A", "P1", "TS1", "NA2", "mark", "use",
    "note", "x_", "sd_m", "true", "𝔘", "é", "..", "/", "C:\\x", "a" * 300,
]  # fmt: skip
"""Pieces that have broken readers before."""

pieces = st.one_of(st.sampled_from(HOSTILE), st.text(max_size=6), st.floats().map(repr), st.integers().map(str))
quickly = settings(max_examples=25, deadline=None)


def read(files: Files) -> Job | None:
    """The job, or None where it is refused as bad input should be; any other exception is a defect."""
    with tempfile.TemporaryDirectory() as folder:
        try:
            return read_job(write_folder(Path(folder), files))
        except HubtackError:
            return None


@st.composite
def mangled(draw: st.DrawFn, text: str) -> str:
    """A text with a few spans replaced by hostile pieces."""
    for _ in range(draw(st.integers(1, 4))):
        start = draw(st.integers(0, len(text)))
        end = draw(st.integers(start, min(len(text), start + 12)))
        text = text[:start] + draw(pieces) + text[end:]
    return text


@st.composite
def with_odd_cells(draw: st.DrawFn, text: str) -> str:
    """A table in which some cells hold hostile pieces, each in its own place."""
    rows = [line.split(",") for line in text.splitlines()]
    for _ in range(draw(st.integers(1, 5))):
        row = draw(st.integers(0, len(rows) - 1))
        rows[row][draw(st.integers(0, len(rows[row]) - 1))] = draw(pieces)
    return "\n".join(map(",".join, rows))


@st.composite
def invented_tables(draw: st.DrawFn, name: str) -> str:
    """A table of the schema's own columns in any choice, order and unit, filled with anything."""
    titles = [title for column in TABLES[name].columns for title in column.titles]
    header = draw(st.lists(st.sampled_from(titles), min_size=1, max_size=12))
    cells = st.lists(pieces, min_size=len(header), max_size=len(header))
    separator = draw(st.sampled_from([",", ";"]))
    return "\n".join(separator.join(row) for row in [header, *draw(st.lists(cells, max_size=4))])


@pytest.mark.parametrize("name", TABLES)
@quickly
@given(data=st.data())
def test_mangled_tables(name: str, data: st.DataObject) -> None:
    base = BASES[name]
    file = f"{name}.csv"
    read({**base, file: data.draw(mangled(base[file]))})


@pytest.mark.parametrize("name", TABLES)
@quickly
@given(data=st.data())
def test_odd_cells(name: str, data: st.DataObject) -> None:
    base = BASES[name]
    file = f"{name}.csv"
    read({**base, file: data.draw(with_odd_cells(base[file]))})


@pytest.mark.parametrize("name", TABLES)
@quickly
@given(data=st.data())
def test_invented_tables(name: str, data: st.DataObject) -> None:
    read({**BASES[name], f"{name}.csv": data.draw(invented_tables(name))})


@pytest.mark.parametrize("name", TABLES)
@quickly
@given(content=st.binary(max_size=200))
@example(content=b"\xef\xbb\xbf\xef\xbb\xbfmark\n1\n")
def test_bytes_for_a_table(name: str, content: bytes) -> None:
    read({**BASES[name], f"{name}.csv": content})

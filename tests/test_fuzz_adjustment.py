"""Whatever stands in a job folder, the command ends with one of four statuses, and its results hold only numbers."""

from __future__ import annotations

import json
import tempfile
from pathlib import Path
from typing import NoReturn

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cli.main import run
from tests.job_folders import ELLIPSOID, PLANE, Files, write_folder

BASES = {"plane": PLANE, "ellipsoid": ELLIPSOID}
NUMBERS = [
    *("0", "-0", "1", "-1", "0.001", "1e-6", "89.9999", "90", "180", "359.9999", "360", "1000", "2000"),
    *("1e5", "-1e7", "1e9", "1e-12", ""),
]
WORDS = ["001", "002", "A", "B", "P1", "P2", "S1", "fixed", "free", "weighted", "", "yes", "no", "TS1", "NA2"]


def refuse(constant: str) -> NoReturn:
    raise AssertionError(f"results.json holds {constant}")


def assert_handled(files: Files) -> None:
    """One of the four statuses, and results that a strict reader of JSON takes. Any exception is a defect."""
    with tempfile.TemporaryDirectory() as name:
        folder = write_folder(Path(name), files)
        status = run(["adjust", str(folder)])
        results = folder / "out" / "results.json"
        assert status in (0, 1, 2, 3)
        assert results.exists() == (status in (0, 1))
        if results.exists():
            json.loads(results.read_text(encoding="utf-8"), parse_constant=refuse)


@st.composite
def with_plausible_cells(draw: st.DrawFn, text: str) -> str:
    """A table in which some cells are swapped for others that a field book might hold; rows may go or come twice."""
    rows = [line.split(",") for line in text.splitlines()]
    for _ in range(draw(st.integers(1, 4))):
        row = draw(st.integers(1, len(rows) - 1))
        column = draw(st.integers(0, len(rows[row]) - 1))
        others = [other[column] for other in rows[1:] if column < len(other)]
        rows[row][column] = draw(st.sampled_from(others + NUMBERS + WORDS))
    order = draw(st.lists(st.integers(1, len(rows) - 1), min_size=1, max_size=len(rows) + 1))
    return "\n".join(",".join(rows[row]) for row in [0, *order])


@pytest.mark.parametrize("base", BASES)
@settings(max_examples=50, deadline=None)
@given(data=st.data())
def test_plausible_tables(base: str, data: st.DataObject) -> None:
    files = dict(BASES[base])
    tables = [name for name in files if name.endswith(".csv")]
    for name in data.draw(st.lists(st.sampled_from(tables), min_size=1, max_size=3, unique=True)):
        files[name] = data.draw(with_plausible_cells(files[name]))
    gone = data.draw(st.lists(st.sampled_from(tables), max_size=4, unique=True))
    assert_handled({name: text for name, text in files.items() if name not in gone})

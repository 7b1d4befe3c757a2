"""`Adjustment.to_frame`: the reports' tables in pandas."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from adjust.errors import OutputError
from adjust.reports.tables import write_coordinates, write_residuals
from tests.exported import ALL, adjustment_of, plain_of


@pytest.mark.parametrize("name", ALL)
def test_frames_are_the_tables_that_are_written(name: str, tmp_path: Path) -> None:
    result = adjustment_of(name)
    write_coordinates(result, (), tmp_path / "marks.csv")
    write_residuals(result, (), tmp_path / "observations.csv")
    for table, index in (("marks", "mark"), ("observations", "source")):
        written = pd.read_csv(tmp_path / f"{table}.csv", dtype=str, index_col=index)
        frame = result.to_frame(table)  # type: ignore[arg-type]
        assert list(frame.columns) == list(written.columns)
        assert list(frame.index) == list(written.index)
        for column in frame.columns:
            if frame[column].dtype == float:
                np.testing.assert_array_equal(frame[column], written[column].astype(float))


@pytest.mark.parametrize("name", ALL)
def test_types(name: str) -> None:
    """Figures are floats, truth is bool, and text stays text, also where a column is empty."""
    observations = adjustment_of(name).to_frame("observations")
    assert observations["suspect"].dtype == bool
    assert all(observations[column].dtype == float for column in ("residual_m", "residual_deg", "w", "redundancy"))
    marks = adjustment_of(name).to_frame()
    assert all(isinstance(mark, str) for mark in marks.index)
    assert marks["easting_m"].dtype == marks["latitude_deg"].dtype == float


def test_lines_are_indexed_by_both_ends() -> None:
    lines = adjustment_of("dam_control").to_frame("lines")
    for line in plain_of("dam_control")["relative"]:
        row = lines.loc[(line["from"], line["to"])]
        assert row["distance_m"] == line["distance_m"] or (line["distance_m"] is None and np.isnan(row["distance_m"]))
    assert len(lines) == len(plain_of("dam_control")["relative"])


def test_title_and_cautions_travel_along() -> None:
    frame = adjustment_of("town_traverse").to_frame()
    assert frame.attrs["title"] == "Street control, Cobble Row and Tanner Lane"
    assert frame.attrs["cautions"] == tuple(plain_of("town_traverse")["cautions"])


def test_without_pandas_the_cure_is_named(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "pandas", None)
    with pytest.raises(OutputError, match=r"pip install 'hubtack\[notebook\]'"):
        adjustment_of("dam_control").to_frame()

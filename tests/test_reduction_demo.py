"""The demonstration of raw readings shows what its page says."""

from __future__ import annotations

import csv
import shutil
from pathlib import Path

import numpy as np
import pytest

from adjust import Adjustment, adjust, read_job
from adjust.reports.reduced_job import write_reduced_job
from adjust.reports.reduction_text import wider_than_stated
from adjust.units import ARCSEC

DEMO = Path(__file__).parent.parent / "field_data" / "quarry_raw"


@pytest.fixture(scope="module")
def result() -> Adjustment:
    return adjust(read_job(DEMO))


def test_it_is_accepted_inside_the_setups_and_between_them(result: Adjustment) -> None:
    assert result.accepted
    assert result.job.reduction.pointings is not None
    assert wider_than_stated(result.job, result.job.reduction.pointings) == []


def test_targets_are_missing_from_later_rounds(result: Adjustment) -> None:
    directions = next(rows for rows in result.job.observations if rows.kind == "direction")
    assert directions.provenance.further is not None
    assert len({len(further) for further in directions.provenance.further}) > 2


def test_pairs_give_the_errors_of_the_instrument(result: Adjustment) -> None:
    """Means over all pairs, within four standard errors; the eccentric circle adds 6″/√2 to each horizontal pair."""
    pointings = result.job.reduction.pointings
    assert pointings is not None
    for errors, true, scatter in (
        (pointings.directions.errors.error, 9.0, np.hypot(1.5, 6 / np.sqrt(2))),
        (pointings.zeniths.errors.error, -14.0, 2.0),
    ):
        assert np.mean(errors) / ARCSEC == pytest.approx(true, rel=0, abs=4 * scatter / np.sqrt(len(errors)))


def test_distances_agree_from_both_ends(result: Adjustment) -> None:
    """Ten lines between five pillars; differences within three of their sds, and no shift common to them."""
    pointings = result.job.reduction.pointings
    assert pointings is not None
    ends = pointings.both_ends
    off = ends.difference / np.sqrt(ends.difference_variance)
    assert len(off) == 10
    assert np.max(np.abs(off)) < 3
    assert abs(np.mean(off)) < 3 / np.sqrt(10)


def test_without_weather_the_global_test_fails(tmp_path: Path) -> None:
    shutil.copytree(DEMO, tmp_path / "job")
    place = tmp_path / "job" / "pointings.csv"
    rows = list(csv.reader(place.read_text("utf-8").splitlines()[1:]))
    kept = [
        column
        for column, title in enumerate(rows[0])
        if title not in ("temperature_c", "pressure_hpa", "humidity_percent")
    ]
    place.write_text("\n".join(",".join(row[column] for column in kept) for row in rows) + "\n", encoding="utf-8")
    assert adjust(read_job(tmp_path / "job")).solution.global_test.passed is False


def test_reduced_tables_adjust_to_the_same_coordinates(result: Adjustment, tmp_path: Path) -> None:
    write_reduced_job(result.job, tmp_path)
    reduced = adjust(read_job(tmp_path))
    there, here = (adjustment.job.frame.grid_coordinates(adjustment.coordinates) for adjustment in (reduced, result))
    np.testing.assert_allclose(there, here, rtol=0, atol=1e-6)  # m
    np.testing.assert_allclose(reduced.coordinates[:, 2], result.coordinates[:, 2], rtol=0, atol=1e-6)  # m

"""Geoid heights from vertical grids that PROJ reads, against the plane they were written from."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from adjust.frames import GeoidGrid
from tests.grids import NO_DATA, write_geotiff, write_gtx

SOUTH, WEST, STEP = 47.0, 8.0, 0.25
WRITERS = {"geoid.gtx": write_gtx, "geoid.tif": write_geotiff}
SINGLE_PRECISION = 4e-6  # m: a float32 of 48 m is rounded to 2 µm; a corner node may be read twice


def slope(longitude: np.ndarray, latitude: np.ndarray) -> np.ndarray:
    """An invented geoid that bilinear interpolation reproduces, degrees to metres."""
    return 40.0 + 2.0 * (latitude - SOUTH) + 3.0 * (longitude - WEST)


def nodes(west: float = WEST) -> np.ndarray:
    latitude = SOUTH + STEP * np.arange(5)[:, None]
    return slope(WEST + STEP * np.arange(7), latitude)


@pytest.mark.parametrize("name", WRITERS)
def test_heights_between_nodes_are_bilinear_in_both_formats(tmp_path: Path, name: str) -> None:
    grid = GeoidGrid(WRITERS[name](tmp_path / name, SOUTH, WEST, STEP, nodes()))
    degrees = np.array([[8.3, 47.4], [9.49, 47.99], [8.0001, 47.0001], [8.75, 47.5]])
    np.testing.assert_allclose(grid.heights(np.radians(degrees)), slope(*degrees.T), rtol=0, atol=SINGLE_PRECISION)


@pytest.mark.parametrize("name", WRITERS)
def test_outside_the_grid_there_is_no_height_and_other_marks_keep_theirs(tmp_path: Path, name: str) -> None:
    grid = GeoidGrid(WRITERS[name](tmp_path / name, SOUTH, WEST, STEP, nodes()))
    degrees = np.array([[7.9, 47.4], [8.3, 47.4], [8.3, 49.0], [np.nan, np.nan], [-171.7, 47.4]])
    heights = grid.heights(np.radians(degrees))
    np.testing.assert_array_equal(np.isnan(heights), [True, False, True, True, True])
    assert heights[1] == pytest.approx(slope(8.3, 47.4), rel=0, abs=SINGLE_PRECISION)


def test_a_grid_across_the_antimeridian_serves_both_sides(tmp_path: Path) -> None:
    grid = GeoidGrid(write_gtx(tmp_path / "pacific.gtx", SOUTH, 179.5, STEP, nodes()))
    degrees = np.array([[179.6, 47.4], [180.0, 47.4], [-179.9, 47.4]])
    expected = slope(WEST + np.array([0.1, 0.5, 0.6]), degrees[:, 1])
    np.testing.assert_allclose(grid.heights(np.radians(degrees)), expected, rtol=0, atol=SINGLE_PRECISION)


def test_a_cell_without_data_gives_no_height(tmp_path: Path) -> None:
    heights = nodes()
    heights[:2, :2] = NO_DATA
    grid = GeoidGrid(write_gtx(tmp_path / "holes.gtx", SOUTH, WEST, STEP, heights))
    np.testing.assert_array_equal(np.isnan(grid.heights(np.radians([[8.1, 47.1], [8.6, 47.6]]))), [True, False])


def test_a_path_with_blanks_and_a_relative_path_are_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "job with blanks"
    folder.mkdir()
    write_gtx(folder / "geoid.gtx", SOUTH, WEST, STEP, nodes())
    monkeypatch.chdir(folder)
    at = np.radians([[8.3, 47.4]])
    assert GeoidGrid(Path("geoid.gtx")).heights(at) == GeoidGrid(folder / "geoid.gtx").heights(at)


def test_no_marks_need_no_heights(tmp_path: Path) -> None:
    grid = GeoidGrid(write_gtx(tmp_path / "geoid.gtx", SOUTH, WEST, STEP, nodes()))
    assert grid.heights(np.empty((0, 2))).shape == (0,)


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("missing.gtx", None, "there is no geoid grid"),
        ("letter.gtx", b"Dear surveyor", "no vertical grid that PROJ can read"),
        ("letter.tif", b"Dear surveyor", "no vertical grid that PROJ can read"),
        ("empty.gtx", b"", "no vertical grid that PROJ can read"),
        ("north,south.gtx", b"", "comma"),
    ],
)
def test_an_unusable_file_is_refused_in_words(tmp_path: Path, name: str, content: bytes | None, message: str) -> None:
    if content is not None:
        (tmp_path / name).write_bytes(content)
    with pytest.raises(ValueError, match=message):
        GeoidGrid(tmp_path / name).heights(np.zeros((1, 2)))

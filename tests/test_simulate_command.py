"""`python -m adjust.simulate`: grids as job folders, for benchmarks through the command line."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from click.testing import CliRunner

from adjust import read_job
from adjust.simulate import observe, triangulation_grid
from adjust.simulate.__main__ import main
from adjust.simulate.demos import DEMOS
from adjust.units import ARCSEC


def test_a_grid_of_five_hundred_marks(tmp_path: Path) -> None:
    result = CliRunner().invoke(main, ["grid", str(tmp_path / "grid"), "--seed", "3"])
    assert result.exit_code == 0, result.output
    read = read_job(tmp_path / "grid")
    generator = np.random.default_rng(3)
    job, _ = observe(triangulation_grid(generator, 20, 25), generator)
    assert len(read.marks) == 500
    for rows, again, rounding in zip(job.observations, read.observations, (0.05 * ARCSEC, 5e-5), strict=True):
        np.testing.assert_allclose(again.observed, rows.observed, rtol=0, atol=rounding * (1 + 1e-9))


def test_starts_are_given_on_request(tmp_path: Path) -> None:
    sizes = ["--rows", "3", "--columns", "4", "--start-sd", "0.5"]
    result = CliRunner().invoke(main, ["grid", str(tmp_path / "grid"), *sizes])
    assert result.exit_code == 0, result.output
    assert np.isfinite(read_job(tmp_path / "grid").marks.given[:, :2]).all()


def test_demonstrations_go_into_folders_of_their_own(tmp_path: Path) -> None:
    result = CliRunner().invoke(main, ["demos", str(tmp_path)])
    assert result.exit_code == 0, result.output
    assert {path.name for path in tmp_path.iterdir()} == set(DEMOS)


def test_help_shows_an_example() -> None:
    result = CliRunner().invoke(main, ["--help"])
    assert "For example: python -m adjust.simulate grid" in result.output

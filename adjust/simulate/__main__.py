"""`python -m adjust.simulate`: write the demonstrations, or a grid of any size as a job folder."""

from __future__ import annotations

from pathlib import Path

import click
import numpy as np

from adjust.field_book.cells import Style
from adjust.field_book.writing import write_job
from adjust.simulate.demos import write_demos
from adjust.simulate.networks import triangulation_grid
from adjust.simulate.observing import observe

FOLDER = click.Path(file_okay=False, path_type=Path)


@click.group()
def main() -> None:
    """Write invented jobs.

    For example: python -m adjust.simulate grid /tmp/grid --rows 20 --columns 25
    """


@main.command()
@click.argument("parent", type=FOLDER)
def demos(parent: Path) -> None:
    """Write every demonstration job into a folder of its own below PARENT."""
    write_demos(parent)


@main.command()
@click.argument("folder", type=FOLDER)
@click.option("--rows", type=click.IntRange(2), default=20, show_default=True, help="Marks from south to north.")
@click.option("--columns", type=click.IntRange(2), default=25, show_default=True, help="Marks from west to east.")
@click.option("--seed", type=int, default=1, show_default=True, help="Seed of ground and errors.")
@click.option("--start-sd", type=float, help="Give start coordinates, off by so many metres (1σ).")
def grid(folder: Path, rows: int, columns: int, seed: int, start_sd: float | None) -> None:
    """Write a plan grid of directions and distances into FOLDER, rounded as a surveyor would: 0.1″ and 0.1 mm."""
    generator = np.random.default_rng(seed)
    job, _ = observe(triangulation_grid(generator, rows, columns), generator, start_sd=start_sd)
    decimals = {"direction": 1, "horizontal": 4, "easting": 4, "northing": 4}
    write_job(job, folder, Style(decimals, sexagesimal=True))


if __name__ == "__main__":
    main()

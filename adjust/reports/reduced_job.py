"""A raw job as a reduced one: tables of reduced observations, and what the reduction found."""

from __future__ import annotations

import shutil
from pathlib import Path

from adjust.errors import OutputError
from adjust.field_book.schema import TABLES
from adjust.field_book.writing import describe_job
from adjust.job import Job
from adjust.reports.publish import Writer, publish
from adjust.reports.reduction import write_reduction
from adjust.reports.reduction_text import write_reduction_text

REDUCTION_REPORTS = ("reduction.txt", "reduction.json")


def write_reduced_job(job: Job, folder: Path) -> tuple[str, ...]:
    """Write the job's observations as a job folder that reads back the same, with `REDUCTION_REPORTS` beside it.

    All files or none; returns their names. Raises OutputError where the folder cannot be written, or holds a table
    that would be read as part of the reduced job without being one of its own.
    """
    texts = describe_job(job).texts()
    foreign = [f"{name}.csv" for name in TABLES if f"{name}.csv" not in texts and (folder / f"{name}.csv").exists()]
    if foreign:
        raise OutputError(
            f"{folder / foreign[0]} would be read as part of the reduced job; choose an empty folder with --out"
        )
    writers: dict[str, Writer] = {name: _text_writer(text) for name, text in texts.items()}
    writers["reduction.txt"] = lambda path: write_reduction_text(job, path)
    writers["reduction.json"] = lambda path: write_reduction(job, path)
    if job.geoid_grid is not None:
        grid = job.geoid_grid.path
        writers[grid.name] = lambda path: _copy(grid, path)
    publish(folder, writers)
    return tuple(writers)


def _text_writer(text: str) -> Writer:
    def write(path: Path) -> None:
        path.write_text(text, encoding="utf-8", newline="\n")

    return write


def _copy(source: Path, path: Path) -> None:
    shutil.copyfile(source, path)

"""From a job to a job folder: the tables and the job file that read back as the same job."""

from __future__ import annotations

import shutil
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np

from adjust.arrays import FloatArray
from adjust.field_book.cells import EXACT, Style, Table, joined, names_of, table_text, without_blank_columns
from adjust.field_book.folder import JOB_FILE
from adjust.field_book.instrument_book import InstrumentBook, InstrumentKeys
from adjust.field_book.schema import AXES, TABLES
from adjust.field_book.specification import specification_keys
from adjust.field_book.tolerances import tolerance_keys
from adjust.field_book.toml_text import toml_text
from adjust.frames import EllipsoidFrame, PlaneFrame
from adjust.job import Control, Job, Statistics
from adjust.observations import HeightDifferences, Observations, SlopeDistances, Vectors, ZenithAngles
from adjust.observations.sighted import SightedObservations

VALUE_COLUMNS = {
    "direction": "direction",
    "angle": "angle",
    "azimuth": "azimuth",
    "slope_distance": "slope",
    "horizontal_distance": "horizontal",
    "zenith": "zenith",
    "height_difference": "rise",
}
"""The column that holds the observed value of each kind of one component."""


@dataclass(frozen=True)
class JobFolder:
    """A job folder in words: `job_file` is the content of job.toml, `tables` its tables by name, both to be amended."""

    job_file: dict[str, Any]
    tables: dict[str, Table]

    def write(self, folder: str | Path, comments: Mapping[str, Sequence[str]] | None = None) -> None:
        """Write all files, `comments` by table above the header rows; files of the same names are overwritten.

        Raises FileExistsError when the folder holds a table that is not part of this job.
        """
        folder = Path(folder)
        foreign = [name for name in TABLES if name not in self.tables and (folder / f"{name}.csv").exists()]
        if foreign:
            raise FileExistsError(
                f"{folder} holds {foreign[0]}.csv, which would be read as part of this job; take it away"
            )
        folder.mkdir(parents=True, exist_ok=True)
        for name, text in self.texts(comments).items():
            (folder / name).write_text(text, encoding="utf-8", newline="\n")

    def texts(self, comments: Mapping[str, Sequence[str]] | None = None) -> dict[str, str]:
        """The text of each file by its name, `comments` by table above the header rows."""
        tables = {
            f"{name}.csv": table_text(table, (comments or {}).get(name, ())) for name, table in self.tables.items()
        }
        return {JOB_FILE: toml_text(self.job_file)} | tables


def write_job(job: Job, folder: str | Path, style: Style = EXACT) -> None:
    """Write a job as a folder that `read_job` reads back as the same job, to the last digit unless `style` rounds.

    Rows that state an sd keep it; those on an instrument's model name an instrument of the job file that is written
    for them. Raises FileExistsError when the folder holds a table that is not part of this job.
    """
    describe_job(job, style).write(folder)
    if job.geoid_grid is not None:
        source, target = job.geoid_grid.path, Path(folder) / job.geoid_grid.path.name
        if source.resolve() != target.resolve():
            shutil.copyfile(source, target)


def describe_job(
    job: Job,
    style: Style = EXACT,
    instruments: Mapping[str, InstrumentKeys] | None = None,
    defaults: Mapping[str, str] | None = None,
) -> JobFolder:
    """A job as the words of its folder.

    Rows on an instrument's model name the one of `instruments` (keys and units as in job.toml) that describes them,
    or one that is added; `defaults` are those of the job file.
    """
    book = InstrumentBook(instruments or {}, defaults or {})
    tables = {"marks": without_blank_columns(_marks_table(job, style))}
    for name in TABLES:
        parts = [(rows, "") for rows in job.observations if rows.table == name and name != "marks"]
        parts += [(rows, "no") for rows in job.left_out if rows.table == name]
        columns = [_rows_table(job, rows, use, style, book) for rows, use in parts if len(rows)]
        if columns:
            tables[name] = without_blank_columns(joined(columns))
    return JobFolder(_job_file(job, book), tables)


def _job_file(job: Job, book: InstrumentBook) -> dict[str, Any]:
    """The content of job.toml; what has its default value is left out."""
    content: dict[str, Any] = {"title": job.title, "date": _date(job.date), "frame": _frame(job)}
    content["datum"] = {"mode": job.datum.mode, "marks": [job.marks.names[mark] for mark in job.datum.marks]}
    content["defaults"], content["instruments"] = book.defaults, book.keys
    usual = Statistics()
    levels = {field.name: getattr(job.statistics, field.name) for field in fields(Statistics)}
    content["statistics"] = {key: value for key, value in levels.items() if value != getattr(usual, key)}
    content["datum"] = {key: value for key, value in content["datum"].items() if value}
    content["tolerances"] = tolerance_keys(job.tolerances)
    content["specification"] = specification_keys(job.specification, job.marks.names)
    return {key: value for key, value in content.items() if value}


def _date(written: str | None) -> str | date | None:
    try:
        return written and date.fromisoformat(written)
    except ValueError:
        return written


def _frame(job: Job) -> dict[str, Any]:
    section: dict[str, Any] = {"kind": job.frame.kind}
    if isinstance(job.frame, EllipsoidFrame):
        section["crs"] = job.frame.crs
        section["heights"] = "orthometric" if job.orthometric else "ellipsoidal"
    if job.geoid_grid is not None:
        section["geoid_grid"] = job.geoid_grid.path.name
    section["refraction_coefficient"] = job.refraction_coefficient
    if isinstance(job.frame, PlaneFrame):
        section["earth_curvature"] = job.frame.earth_curvature
    return section


def _marks_table(job: Job, style: Style) -> Table:
    marks = job.marks
    table: Table = {"mark": list(marks.names)} | _plan(job, style) | style.length("height", marks.given[:, 2])
    for column, part in enumerate(("plan", "height")):
        states = marks.control[:, column]
        words = [Control(state).name.lower() for state in states.tolist()]
        table[f"{part}_control"] = words if np.any(states != Control.FREE) else []
    for column, name in enumerate(("sd_easting", "sd_northing", "sd_height")):
        table |= style.length(name, marks.sd[:, column], "mm")
    if np.any(marks.geoid) and job.geoid_grid is None:
        table |= style.length("geoid", marks.geoid)
    bent = np.count_nonzero(marks.deflection, axis=1) > 0
    deflection = np.where(bent[:, None], marks.deflection, np.nan)
    table |= style.small_angle("deflection_north", deflection[:, 0])
    table |= style.small_angle("deflection_east", deflection[:, 1])
    return table | {"description": list(marks.descriptions)}


def _plan(job: Job, style: Style) -> Table:
    """Eastings and northings, or latitudes and longitudes."""
    if not isinstance(job.frame, EllipsoidFrame) or (style.grid and not job.frame.is_geographic):
        easting, northing = job.frame.grid_coordinates(job.marks.given).T
        return style.length("easting", easting) | style.length("northing", northing)
    longitude, latitude = job.marks.given[:, :2].T
    return style.angle("latitude", latitude) | style.angle("longitude", longitude)


def _rows_table(job: Job, rows: Observations, use: str, style: Style, book: InstrumentBook) -> Table:
    """The rows of one kind."""
    setup = rows.setup
    table: Table = {} if setup is None else {"setup": names_of(setup, job.setups)}
    for place, role in enumerate(rows.roles):
        table[role] = names_of(rows.marks[:, place], job.marks.names)
    if isinstance(rows, Vectors):
        table |= _vector_columns(rows, style)
    else:
        table |= _value_columns(rows, style)
    if isinstance(rows, SightedObservations):
        table["instrument"] = book.cells(rows.table, rows.precision)
    group = rows.provenance.group
    if group is not None:
        table["group"] = names_of(group.number, (*group.names, ""))
    return table | {"use": [use] * len(rows)}


def _value_columns(rows: Observations, style: Style) -> Table:
    """The observed value, the heights of instrument and target, and the row's own sd."""
    name, values = VALUE_COLUMNS[rows.kind], rows.observed[:, 0]
    table = style.length(name, values) if rows.unit == "m" else style.angle(name, values, full_circle=rows.full_circle)
    if isinstance(rows, SlopeDistances | ZenithAngles) and np.any(rows.heights):
        table |= style.length("instrument_height", rows.heights[:, 0])
        table |= style.length("target_height", rows.heights[:, 1])
    if isinstance(rows, SightedObservations | HeightDifferences):
        sd = rows.precision.stated
        if isinstance(rows, HeightDifferences):
            sd = np.where(np.isnan(sd), rows.precision.constant, sd)
            table |= style.length("length", rows.length)
        table |= style.length("sd", sd, "mm") if rows.unit == "m" else style.small_angle("sd", sd)
    return table


def _vector_columns(rows: Vectors, style: Style) -> Table:
    """The components and their precision."""
    table: Table = {}
    for component, axis in enumerate(AXES):
        table |= style.length(f"d{axis}", rows.observed[:, component])
    covariances = rows.covariances
    if not style.correlations:
        pairs = [(i, j) for i in range(3) for j in range(i, 3)]
        return table | {f"cov_{AXES[i]}{AXES[j]}_m2": style.numbers("cov", covariances[:, i, j]) for i, j in pairs}
    sd: FloatArray = np.sqrt(np.einsum("rii->ri", covariances))
    for component, axis in enumerate(AXES):
        table |= style.length(f"sd_{axis}", sd[:, component], "mm")
    for i, j in ((0, 1), (0, 2), (1, 2)):
        correlation = covariances[:, i, j] / (sd[:, i] * sd[:, j])
        table[f"corr_{AXES[i]}{AXES[j]}"] = style.numbers("corr", correlation)
    return table

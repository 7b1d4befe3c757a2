"""From a job folder to a `Job`."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

import numpy as np

from adjust.arrays import IntArray
from adjust.field_book.book import Book, BookReader
from adjust.field_book.builders import Builder, weighted_control
from adjust.field_book.decisions import Decisions, read_decisions
from adjust.field_book.folder import Folder, open_folder
from adjust.field_book.geoid_heights import check_geoid, marks_that_need_geoid
from adjust.field_book.instruments import MILLIMETRE
from adjust.field_book.job_file import JobFile, JobFileReader
from adjust.field_book.marks import MarkReader
from adjust.field_book.mistakes import Likeness, Mistakes
from adjust.field_book.notes import note_control, note_frame, note_left_out, note_unread
from adjust.field_book.raw_tables import RawTables
from adjust.field_book.settings import SettingsReader
from adjust.field_book.specification import read_specification
from adjust.field_book.tolerances import read_tolerances
from adjust.frames import Frame
from adjust.job import Datum, Job, Marks, Statistics
from adjust.observations import KINDS, Directions, Observations, concatenated


def read_job(path: str | Path, decisions: str | Path | None = None) -> Job:
    """Read a job: `path` is a job folder or its `job.toml` (docs/job-folder.md describes both).

    `decisions` is a table of what the surveyor decided of single lines (docs/decisions.md); the job is then what the
    book says with them. Nothing is written into the folder.

    Raises FieldDataError with every mistake found, files in the order of reading.
    """
    mistakes = Mistakes()
    folder = open_folder(path, mistakes)
    text = folder.text(folder.job_file)
    mistakes.raise_if_any()
    reader = JobFileReader(folder.job_file, text or "", mistakes)
    job_file = reader.read()
    if job_file is None:
        mistakes.raise_if_any()
        raise AssertionError("a job file that cannot be read leaves a mistake behind")
    decided = Decisions(mistakes) if decisions is None else read_decisions(decisions, folder, mistakes)
    return JobReader(folder, job_file, reader, mistakes, decided).read()


class JobReader:
    """Reads the tables of a job and puts the job together."""

    def __init__(
        self,
        folder: Folder,
        job_file: JobFile,
        reader: JobFileReader,
        mistakes: Mistakes,
        decisions: Decisions,
    ) -> None:
        self.decisions = decisions
        mistakes.blame = decisions.blamed
        self.folder = folder
        self.job_file = job_file
        self.reader = reader
        self.mistakes = mistakes
        self.settings = SettingsReader(job_file, reader, folder.path)
        self.tables = BookReader(folder, job_file, reader, mistakes, decisions)
        self.notes: list[str] = []

    def read(self) -> Job:
        """The job. Raises FieldDataError."""
        self.settings.check_names()
        frame, grid = self.settings.frame(), self.settings.geoid_grid()
        tolerances = read_tolerances(self.job_file.tolerances, self.reader)
        book = self.tables.read()
        self.decisions.check_sources()
        marks = self._marks(book, frame)
        in_use, left_out = self._observations(book)
        if frame is None or marks is None:
            self.mistakes.raise_if_any()
            raise AssertionError("a frame or marks that cannot be made leave a mistake behind")
        self._check_frame(frame, in_use + left_out)
        datum = self._datum(marks)
        specification = read_specification(self.job_file.specification, marks.index, self.reader)
        orthometric = frame.kind == "ellipsoid" and self.job_file.frame.heights != "ellipsoidal"
        if not self.mistakes:
            needed = marks_that_need_geoid(frame, orthometric, marks, in_use)
            self.notes += check_geoid(book.marks, marks, needed, grid, self.mistakes)
        self.mistakes.raise_if_any()
        self._take_notes(book, frame, marks, left_out)
        setups, in_use, left_out = _with_setups_in_use(book.setups.names, in_use, left_out)
        control = weighted_control(marks) if datum.mode == "control" else None
        return Job(
            title=self.job_file.title or self.folder.path.resolve().name,
            frame=frame,
            marks=marks,
            observations=in_use if control is None else (*in_use, control),
            setups=setups,
            date=self.job_file.date,
            datum=datum,
            statistics=Statistics(**self.job_file.statistics.model_dump()),
            tolerances=tolerances,
            specification=specification,
            orthometric=orthometric,
            geoid_grid=grid,
            refraction_coefficient=self.job_file.frame.refraction_coefficient,
            target_constants={name: target.constant_mm * MILLIMETRE for name, target in self.job_file.targets.items()},
            left_out=left_out,
            decisions=self.decisions.taken,
            notes=tuple(self.notes),
            reduction=self.raw.reduction,
            input_sha256=self.folder.fingerprint(),
        )

    def _marks(self, book: Book, frame: Frame | None) -> Marks | None:
        if self.mistakes.any_in(*book.marks.provenance.files):
            return None
        reader = MarkReader(book.marks, book.mark_names, book.descriptions, self.mistakes)
        if frame is None:
            reader.check_names()
            return None
        return reader.read(frame)

    def _observations(self, book: Book) -> tuple[tuple[Observations, ...], tuple[Observations, ...]]:
        """Observations in use and left out, each in the order of the registry."""
        precision_mistakes = Mistakes() if self.mistakes.any_in(self.reader.name) else self.mistakes
        self.raw = RawTables(self.job_file, book, self.mistakes, precision_mistakes, self.notes)
        instruments = self.raw.instruments
        words = book.setups, book.names, book.groups
        builder = Builder(instruments, *words, self.mistakes, self.raw, precision_mistakes, self.notes)
        built: tuple[list[Observations], list[Observations]] = ([], [])
        for rows in book.observations:
            if self.mistakes.any_in(*rows.provenance.files):
                continue
            for use, found in enumerate(built):
                chosen = rows.take(rows.indices["use"] == use)
                if use and rows.table.raw and len(chosen):
                    self.raw.note_unused(chosen)
                else:
                    found.extend(builder.build(chosen) if len(chosen) else ())
        if not built[0] and not self.mistakes:
            message = "every observation has use = no; leave at least one in"
            self.mistakes.add(self.reader.name, None, None, message)
        return _in_order(built[0]), _in_order(built[1])

    def _check_frame(self, frame: Frame, observations: Iterable[Observations]) -> None:
        for rows in observations:
            if rows.kind == "vector" and frame.kind == "plane":
                message = 'GNSS vectors need an ellipsoid frame; set kind = "ellipsoid" and a crs in [frame]'
                place = rows.provenance
                self.mistakes.add(place.files[place.file[0]], int(place.line[0]), None, message)

    def _datum(self, marks: Marks) -> Datum:
        section = self.job_file.datum
        numbers = []
        for name in section.marks or ():
            if name not in marks.index:
                guess = Likeness(marks.names).suggestion(name)
                self.reader.complain(("datum", "marks"), f"read {name!r}, which is not a mark of marks.csv{guess}")
            elif marks.index[name] in numbers:
                self.reader.complain(("datum", "marks"), f"read {name!r} twice; name each mark once")
            else:
                numbers.append(marks.index[name])
        return Datum(section.mode, tuple(numbers))

    def _take_notes(self, book: Book, frame: Frame, marks: Marks, left_out: tuple[Observations, ...]) -> None:
        heights_stated = self.job_file.frame.heights is not None
        self.notes += note_frame(frame, book.marks, heights_stated=heights_stated)
        self.notes += note_control(marks, inner=self.job_file.datum.mode == "inner")
        self.notes += note_left_out(left_out)
        self.notes += note_unread([name for name in self._other_tables() if name not in self.tables.files])

    def _other_tables(self) -> list[str]:
        """The CSV files of the folder, but for the table of decisions."""
        decided = None if self.decisions is None else Path(self.decisions.name).resolve()
        return [name for name in self.folder.tables() if (self.folder.path / name).resolve() != decided]


def _in_order(observations: list[Observations]) -> tuple[Observations, ...]:
    """Kinds that have rows, in the order of the registry; those from raw readings join the others of their kind."""
    by_kind = [[rows for rows in observations if isinstance(rows, kind) and len(rows)] for kind in KINDS]
    return tuple(concatenated(parts) for parts in by_kind if parts)


def _with_setups_in_use(
    names: tuple[str, ...], in_use: tuple[Observations, ...], left_out: tuple[Observations, ...]
) -> tuple[tuple[str, ...], tuple[Observations, ...], tuple[Observations, ...]]:
    """Number only the setups that have a direction in use: each is an unknown. Elsewhere the number is −1."""
    numbers = {int(setup) for rows in in_use if isinstance(rows, Directions) for setup in np.unique(rows.setup_index)}
    used = sorted(numbers)
    number: IntArray = np.full(len(names), -1)
    number[used] = np.arange(len(used))

    def renumbered(every: tuple[Observations, ...]) -> tuple[Observations, ...]:
        return tuple(
            replace(rows, setup_index=number[rows.setup_index]) if isinstance(rows, Directions) else rows
            for rows in every
        )

    return tuple(names[setup] for setup in used), renumbered(in_use), renumbered(left_out)

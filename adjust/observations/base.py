"""What all kinds of observation have in common: where rows come from, how precise they are, what they predict."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from itertools import pairwise
from typing import Any, ClassVar, Literal, Self

import numpy as np
from numpy.typing import NDArray

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.frames import Geometry

Rows = IntArray | BoolArray | slice


class Columns:
    """A frozen dataclass whose array fields all have one entry for each row."""

    def take(self, rows: Rows) -> Self:
        """The same columns for a choice of rows (indices, mask or slice)."""
        chosen: dict[str, Any] = {}
        for field in fields(self):  # type: ignore[arg-type]
            value = getattr(self, field.name)
            if isinstance(value, np.ndarray):
                chosen[field.name] = value[rows]
            elif isinstance(value, Columns):
                chosen[field.name] = value.take(rows)
        return replace(self, **chosen)  # type: ignore[type-var]


@dataclass(frozen=True)
class Labels(Columns):
    """A word for each row. `number` (rows,) indexes `names`, −1 where the row has none."""

    names: tuple[str, ...]
    number: IntArray

    def of(self, row: int) -> str:
        """The word of a row, "" where it has none."""
        number = int(self.number[row])
        return self.names[number] if number >= 0 else ""


@dataclass(frozen=True)
class Provenance(Columns):
    """File and line of each row. `file` (rows,) indexes `files`; `line` (rows,) counts from 1."""

    files: tuple[str, ...]
    file: IntArray
    line: IntArray
    further: NDArray[np.object_] | None = None
    """(rows,) of tuples: the lines after `line` that a mean was made of; None where every row is one line."""
    instrument: Labels | None = None
    """What the row was observed with, as the job file names it; None where no row says."""
    group: Labels | None = None
    """The group that the surveyor put the row into; None where no row says."""

    def label(self, row: int) -> str:
        """`levels.csv:3`; of a mean `pointings.csv:3+7+12`."""
        further = "" if self.further is None else "".join(f"+{line}" for line in self.further[row])
        return f"{self.files[self.file[row]]}:{self.line[row]}{further}"

    def gathered(self, group: IntArray, groups: int) -> Provenance:
        """Of means (groups,): all lines of the rows of each group, in the order of the rows; `group` (rows,) numbers
        the groups, none empty and none across two files."""
        order = np.argsort(group, kind="stable")
        starts = np.searchsorted(group[order], np.arange(groups))
        lines, bounds = self.line[order].tolist(), [*starts.tolist(), len(order)]
        further = np.empty(groups, dtype=object)
        further[:] = [tuple(lines[start + 1 : end]) for start, end in pairwise(bounds)]
        return replace(self.take(order[starts]), further=further)


@dataclass(frozen=True)
class Precision(Columns):
    """Where the a-priori standard deviation of each row comes from; all arrays (rows,), SI and radians.

    `stated` is the row's own sd and wins; it is NaN where the instrument's model holds:
    sd² = constant² + (proportional · observed)² + what centring and height measuring contribute.
    `centring` and `target_centring` are metres along each horizontal axis, `heights` metres for measuring an
    instrument or a target height (0 where none was measured).
    """

    stated: FloatArray
    constant: FloatArray
    proportional: FloatArray
    centring: FloatArray
    target_centring: FloatArray
    heights: FloatArray

    @classmethod
    def of_sd(cls, sd: FloatArray) -> Precision:
        """Rows that all state their own sd (rows,)."""
        nothing = np.zeros_like(sd)
        return cls(sd, nothing, nothing, nothing, nothing, nothing)


@dataclass(frozen=True, kw_only=True)
class Observations(Columns, ABC):
    """All rows of one kind of observation, as columns.

    `marks` (rows, roles) indexes the job's marks in the order of `roles`; `observed` is (rows, components) in metres
    or radians. A scalar kind has one component.
    """

    kind: ClassVar[str]
    """The name in results: direction, slope_distance, …"""
    table: ClassVar[str]
    """The field-book table that holds it, without `.csv`."""
    roles: ClassVar[tuple[str, ...]]
    """The columns that name marks: `at`, `to`; or `at`, `from`, `to`; or `from`, `to`."""
    components: ClassVar[tuple[str, ...]] = ("",)
    unit: ClassVar[Literal["m", "rad"]]
    full_circle: ClassVar[bool] = False
    """Whether an angle runs round the whole circle, so that values a full turn apart are the same."""
    determines_plan: ClassVar[bool]
    """Whether it can fix a plan coordinate: it makes its marks' east and north unknowns."""
    determines_height: ClassVar[bool]
    """Whether it can fix a height: it makes its marks' heights unknowns."""

    marks: IntArray
    observed: FloatArray
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.observed)

    @property
    def setup(self) -> IntArray | None:
        """Index (rows,) of the setup whose orientation is subtracted from the prediction, for kinds that have one."""
        return None

    @abstractmethod
    def predict(self, geometry: Geometry) -> FloatArray:
        """Predicted values (rows, components) without the setup's orientation, m or rad."""

    @abstractmethod
    def differentiate(self, geometry: Geometry) -> FloatArray:
        """Derivatives (rows, components, roles, 3) by metres east, north and up at each mark of the row."""

    def linearise(self, geometry: Geometry) -> tuple[FloatArray, FloatArray]:
        """`predict` and `differentiate` at once; kinds for which that saves work share it."""
        return self.predict(geometry), self.differentiate(geometry)

    @abstractmethod
    def covariance(self, geometry: Geometry) -> FloatArray:
        """A-priori covariance (rows, components, components), m² or rad²."""


def concatenated(parts: Sequence[Observations]) -> Observations:
    """The rows of observations of one kind, one after the other."""
    whole: Observations = parts[0] if len(parts) == 1 else _joined(parts)
    return whole


def _joined(parts: Sequence[Any]) -> Any:
    """Columns below each other, nested ones too; files of provenances are numbered anew."""
    if isinstance(parts[0], Provenance):
        return _joined_provenance(parts)
    columns = {}
    for field in fields(parts[0]):
        values = [getattr(part, field.name) for part in parts]
        columns[field.name] = np.concatenate(values) if isinstance(values[0], np.ndarray) else _joined(values)
    return replace(parts[0], **columns)


def _joined_provenance(parts: Sequence[Provenance]) -> Provenance:
    files = tuple(dict.fromkeys(file for part in parts for file in part.files))
    number = [np.array([files.index(file) for file in part.files], dtype=np.int64) for part in parts]
    further = None
    if any(part.further is not None for part in parts):
        further = np.concatenate([_lines_after_the_first(part) for part in parts])
    rows = [len(part.line) for part in parts]
    return Provenance(
        files,
        np.concatenate([place[part.file] for place, part in zip(number, parts, strict=True)]),
        np.concatenate([part.line for part in parts]),
        further,
        _joined_labels([part.instrument for part in parts], rows),
        _joined_labels([part.group for part in parts], rows),
    )


def _joined_labels(parts: Sequence[Labels | None], rows: Sequence[int]) -> Labels | None:
    """Words below each other, numbered anew; None where no part has any."""
    given = [Labels((), np.full(count, -1)) if part is None else part for part, count in zip(parts, rows, strict=True)]
    names = tuple(dict.fromkeys(name for part in given for name in part.names))
    if not names:
        return None
    number = [np.array([*(names.index(name) for name in part.names), -1], dtype=np.int64) for part in given]
    return Labels(names, np.concatenate([place[part.number] for place, part in zip(number, given, strict=True)]))


def _lines_after_the_first(part: Provenance) -> NDArray[np.object_]:
    if part.further is not None:
        return part.further
    nothing = np.empty(len(part.line), dtype=object)
    nothing[:] = [()] * len(part.line)
    return nothing

"""What all kinds of observation have in common: where rows come from, how precise they are, what they predict."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass, fields, replace
from typing import Any, ClassVar, Literal, Self

import numpy as np

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
class Provenance(Columns):
    """File and line of each row. `file` (rows,) indexes `files`; `line` (rows,) counts from 1."""

    files: tuple[str, ...]
    file: IntArray
    line: IntArray

    def label(self, row: int) -> str:
        """`levels.csv:3`."""
        return f"{self.files[self.file[row]]}:{self.line[row]}"


@dataclass(frozen=True)
class Precision(Columns):
    """Where the a-priori standard deviation of each row comes from; all arrays (rows,), SI and radians.

    `stated` is the row's own sd and wins; it is NaN where the instrument's model holds:
    sd² = constant² + (proportional · observed)² + what centring and height measuring contribute.
    `centring` and `target_centring` are metres along each horizontal axis, `heights` metres for measuring an
    instrument or a target height.
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

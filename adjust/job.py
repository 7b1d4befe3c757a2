"""A job as read from the field: marks, observations of every kind, and what the job file says of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import IntEnum
from functools import cached_property
from typing import Literal

from adjust.arrays import FloatArray, IntArray
from adjust.frames import Frame, GeoidGrid
from adjust.observations import Observations, Provenance
from adjust.reductions.outcome import Reduction
from adjust.standards import Specification
from adjust.tolerances import Tolerances


class Control(IntEnum):
    """How a mark's given coordinates count."""

    FREE = 0
    """Only a start, if given at all."""
    WEIGHTED = 1
    """An observation with the sd given."""
    FIXED = 2
    """Not an unknown."""


@dataclass(frozen=True)
class Marks:
    """The marks of a job in the order of `marks.csv`; arrays have one row for each mark.

    `given` (n, 3) holds the frame's coordinates, NaN where none were given: easting, northing, height in a plane
    frame; longitude, latitude (radians) and height in an ellipsoid frame, the height in the job's own height system.
    `control` (n, 2) holds a `Control` for plan and for height. `sd` (n, 3) is metres
    along the grid's east, north and up, NaN where none is stated. `geoid` (n,) is the geoid's height above the
    ellipsoid, `deflection` (n, 2) the north and east components, astronomic minus geodetic, radians; 0 where unknown.
    """

    names: tuple[str, ...]
    given: FloatArray
    control: IntArray
    sd: FloatArray
    geoid: FloatArray
    deflection: FloatArray
    descriptions: tuple[str, ...]
    provenance: Provenance

    def __len__(self) -> int:
        return len(self.names)

    @cached_property
    def index(self) -> dict[str, int]:
        """Row of each mark by its name."""
        return {name: row for row, name in enumerate(self.names)}


@dataclass(frozen=True)
class Datum:
    """What carries the datum: the control of `marks.csv`, or inner constraints over `marks` (indices; empty: all)."""

    mode: Literal["control", "inner"] = "control"
    marks: tuple[int, ...] = ()


@dataclass(frozen=True)
class Statistics:
    """The test levels of a job. Defaults: common practice, no source; 0.001 and 0.80 as in Baarda (1968)."""

    confidence: float = 0.95
    significance: float = 0.001
    power: float = 0.80
    sd_basis: Literal["prior", "posterior"] = "prior"


@dataclass(frozen=True)
class Decision:
    """What the surveyor decided of one line of the field book, and why.

    `source` is its file and line. A correction replaces what was `written` under the title `column` by `value`, both as
    the book writes. Of a line that is kept or left out `column` may be blank; `written` is then its observed value, or
    blank where it has several.
    """

    source: str
    decision: Literal["keep", "leave_out", "correct"]
    column: str
    written: str
    value: str
    reason: str


@dataclass(frozen=True)
class Job:
    """Everything one adjustment starts from. Nothing mutates it."""

    title: str
    frame: Frame
    marks: Marks
    observations: tuple[Observations, ...]
    """One entry for each kind that has rows in use, in the order of the registry."""
    setups: tuple[str, ...] = ()
    """Names of the setups of directions; `Directions.setup` indexes them."""
    date: str | None = None
    datum: Datum = field(default_factory=Datum)
    statistics: Statistics = field(default_factory=Statistics)
    tolerances: Tolerances = field(default_factory=Tolerances)
    """What closures may miss by before anything is adjusted."""
    specification: Specification = field(default_factory=Specification)
    """What the adjusted coordinates have to be good for."""
    orthometric: bool = False
    """What heights mean in an ellipsoid frame: above the geoid, or above the ellipsoid."""
    geoid_grid: GeoidGrid | None = None
    """Gives geoid heights at the marks' present positions, in place of `marks.geoid`."""
    refraction_coefficient: float = 0.13
    target_constants: Mapping[str, float] = field(default_factory=dict)
    """Metres added to distances to each target that the job file names."""
    left_out: tuple[Observations, ...] = ()
    """Rows with `use = no`: kept in the books, not adjusted."""
    reduction: Reduction = field(default_factory=Reduction)
    """What the raw readings said of themselves when they were made into observations."""
    decisions: tuple[Decision, ...] = ()
    """What the surveyor decided of single lines; observations and marks are as they read with it."""
    notes: tuple[str, ...] = ()
    """What reading decided for the surveyor and has to be said in the listing."""
    input_sha256: str = ""

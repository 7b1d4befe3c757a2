"""What could be wrong: one observation, one correlated observation as a whole, or what a group of rows shares."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from adjust.arrays import IntArray
from adjust.job import Job
from adjust.observations import ControlCoordinates
from adjust.unknowns import AXES

Nature = Literal[
    "observation",
    "vector",
    "control",
    "instrument height",
    "target height",
    "station",
    "target",
    "distance constant",
    "distance scale",
    "staff scale",
]
"""observation: one value, or one component of a vector. vector: all its components. control: a mark's held coordinates.
station: the instrument stood beside the mark. target: the target of all sights to a mark did. The rest names itself."""


@dataclass(frozen=True)
class Hypothesis:
    """An error of `components` unknown sizes that enters one or many rows in a known way.

    `rows` pairs the place of a kind in `job.observations` with the rows of that kind that the error enters. `mark` is
    the mark that a group belongs to, as an index of the job's marks. Errors are metres, radians or, for a scale, a
    ratio (`unit` "1"); positive where what was written is too large.
    """

    nature: Nature
    name: str
    """In words: `distances.csv:13`, `instrument height at S1, 1.612 m`."""
    rows: tuple[tuple[int, IntArray], ...]
    components: tuple[str, ...]
    """("",) for a scalar; of a vector `x`, `y`, `z` or one of them; of control and stations `east`, `north`, `up`."""
    unit: Literal["m", "rad", "1"]
    mark: int | None = None

    @property
    def single(self) -> bool:
        """Whether it concerns one row of the field book, not a group."""
        return self.nature in ("observation", "vector")

    def given_axes(self, job: Job) -> tuple[int, ...]:
        """The axes (east 0, north 1, up 2) of the given coordinates, fixed or weighted, that it is about; none where it
        is about anything observed."""
        if self.nature == "control":
            return tuple(map(AXES.index, self.components))
        kind, rows = self.rows[0]
        observations = job.observations[kind]
        weighted = self.single and isinstance(observations, ControlCoordinates)
        return (int(observations.component[rows[0]]),) if weighted else ()  # type: ignore[attr-defined]

"""Errors that many observations share: what was set up, read or held once and used often.

Each is a group of rows and the derivatives of their values by the error, in columns (rows, q), not yet whitened.
An error of a height or of a held coordinate is what was written minus the truth; of a station or a target it is where
it stood minus the mark.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from adjust.adjusting import grid_axes
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.blunders.hypothesis import Hypothesis, Nature
from adjust.blunders.system import System
from adjust.job import Control
from adjust.observations import ControlCoordinates, Directions, Observations
from adjust.observations.sighted import HeightedSight
from adjust.unknowns import AXES

FEWEST_ROWS = 2
"""A group of one row is that row's own error under another name."""

PLAN = AXES[:2]
COORDINATES = dict(zip(AXES, ("easting", "northing", "height"), strict=True))

HEIGHT_LIMITS, CONSTANT_LIMITS, SCALE_LIMITS = (-5.0, 5.0), (-1.0, 1.0), (-0.9, 9.0)
LIMITS: Mapping[Nature, tuple[float, float]] = {
    "instrument height": HEIGHT_LIMITS,
    "target height": HEIGHT_LIMITS,
    "distance constant": CONSTANT_LIMITS,
    "distance scale": SCALE_LIMITS,
    "staff scale": SCALE_LIMITS,
}
"""Errors that can be: no tripod or pole is out by five metres, no constant by one, no length is a tenth or ten times
what it was (feet for metres are a ratio of 3.3); common practice, no source. Without limits they explain anything."""


@dataclass(frozen=True)
class Entries:
    """Rows of one kind and the effect (rows, components, q) that an error has on each, m or rad by the error's unit.

    `key` (rows,) says which error of the sort it is.
    """

    table: int
    rows: IntArray
    key: IntArray
    effect: FloatArray


@dataclass(frozen=True)
class Group:
    """One shared error: its hypothesis and the effect (rows, components, q) for each pair of its `rows`."""

    hypothesis: Hypothesis
    effects: tuple[FloatArray, ...]

    @property
    def width(self) -> int:
        """Number q of its columns."""
        return len(self.hypothesis.components)

    @property
    def limits(self) -> tuple[float, float]:
        """The least and the largest error that it can be, metres or a ratio."""
        return LIMITS.get(self.hypothesis.nature, (-np.inf, np.inf))


def control_name(mark: str, components: Sequence[str]) -> str:
    """What an error of some held coordinates of a mark is called."""
    what = "position" if len(components) > 1 else COORDINATES[components[0]]
    return f"{what} of control mark {mark}"


def find_groups(system: System, interesting: BoolArray | None = None) -> Iterator[Group]:
    """Every shared error of a job; with `interesting` (system rows,), only those that enter such a row."""
    finder = _Finder(system, interesting)
    yield from finder.stations()
    yield from finder.targets()
    yield from finder.heights()
    yield from finder.instruments()
    yield from finder.held_control()
    yield from finder.weighted_control()


class _Finder:
    def __init__(self, system: System, interesting: BoolArray | None) -> None:
        self.system, self.job = system, system.job
        self.names = self.job.marks.names
        self.kinds: tuple[Observations, ...] = tuple(block.observations for block in system.model.blocks)
        self.derivatives = [self._derivatives(place) for place in range(len(self.kinds))]
        self.interesting = interesting

    def _derivatives(self, place: int) -> FloatArray:
        """(rows, components, roles, 3) by metres east, north, up."""
        block = self.system.model.blocks[place]
        rows, roles = block.observations.marks.shape
        entries = block.linearise(self.system.state)[1]
        return entries[:, :, : 3 * roles].reshape(rows, block.components, roles, 3)

    def _sighted(self) -> Iterator[tuple[int, Observations]]:
        for place, rows in enumerate(self.kinds):
            if rows.roles[0] == "at" and not isinstance(rows, ControlCoordinates):
                yield place, rows

    def stations(self) -> Iterator[Group]:
        """An instrument that stood beside its mark. A mark with several rounds has as many stations."""
        count = len(self.names)
        several = self._marks_with_several_setups()
        entries = []
        for place, rows in self._sighted():
            at = rows.marks[:, 0]
            stood = np.where(several[at], count + rows.setup, at) if rows.setup is not None else at
            entries.append(Entries(place, np.arange(len(rows)), stood, self.derivatives[place][:, :, 0, :2]))
        stations: list[int] = self._station_of_setup().tolist()
        for key, parts in self._gathered(entries):
            mark = key if key < count else stations[key - count]
            of = f", setup {self.job.setups[key - count]}" if key >= count else ""
            yield self._group("station", f"position of the instrument at {self.names[mark]}{of}", parts, PLAN, mark)

    def _station_of_setup(self) -> IntArray:
        station = np.zeros(len(self.job.setups), dtype=np.int64)
        for rows in self.kinds:
            if isinstance(rows, Directions):
                station[rows.setup] = rows.marks[:, 0]
        return station

    def _marks_with_several_setups(self) -> BoolArray:
        several: BoolArray = np.bincount(self._station_of_setup(), minlength=len(self.names)) > 1
        return several

    def targets(self) -> Iterator[Group]:
        """A target that stood beside its mark for all who sighted it."""
        entries = [
            Entries(place, np.arange(len(rows)), rows.marks[:, role], self.derivatives[place][:, :, role, :2])
            for place, rows in self._sighted()
            for role in range(1, len(rows.roles))
        ]
        for mark, parts in self._gathered(entries):
            yield self._group("target", f"position of the target at {self.names[mark]}", parts, PLAN, mark)

    def heights(self) -> Iterator[Group]:
        """An instrument or target height that several sights share: the same figure at the same mark."""
        heighted = [(place, rows) for place, rows in enumerate(self.kinds) if isinstance(rows, HeightedSight)]
        if not any(np.any(rows.heights) for _, rows in heighted):
            return
        natures: tuple[Nature, Nature] = ("instrument height", "target height")
        for role, nature in enumerate(natures):
            marks = np.concatenate([rows.marks[:, role] for _, rows in heighted])
            figures = np.concatenate([rows.heights[:, role] for _, rows in heighted])
            pairs, number = np.unique(np.column_stack([marks, figures]), axis=0, return_inverse=True)
            cuts = np.cumsum([len(rows) for _, rows in heighted])[:-1]
            entries = [
                Entries(place, np.arange(len(rows)), key, -self.derivatives[place][:, :, role, 2:])
                for (place, rows), key in zip(heighted, np.split(number.ravel(), cuts), strict=True)
            ]
            for key, parts in self._gathered(entries):
                mark = int(pairs[key, 0])
                name = f"{nature} {pairs[key, 1]:.3f} m at {self.names[mark]}"
                yield self._group(nature, name, parts, ("",), mark)

    def instruments(self) -> Iterator[Group]:
        """A constant or a scale of all distances of a file, a scale of the staves of all levels of a file."""
        distances = [place for place, rows in enumerate(self.kinds) if rows.table == "distances"]
        levels = [place for place, rows in enumerate(self.kinds) if rows.table == "levels"]
        sorts: tuple[tuple[Nature, str, Sequence[int]], ...] = (
            ("distance constant", "constant of the distances", distances),
            ("distance scale", "scale of the distances", distances),
            ("staff scale", "scale of the staves", levels),
        )
        for nature, words, places in sorts:
            for file in sorted({file for place in places for file in self.kinds[place].provenance.files}):
                yield from self._of_file(nature, f"{words} of {file}", places, file)

    def _of_file(self, nature: Nature, name: str, places: Sequence[int], file: str) -> Iterator[Group]:
        entries = []
        for place in places:
            rows = self.kinds[place]
            files = rows.provenance.files
            here = np.flatnonzero(rows.provenance.file == files.index(file)) if file in files else np.arange(0)
            # Not the values observed: with a blunder among them, a scale would explain it.
            expected = rows.take(here).predict(self.system.state.geometry)[:, :, None]
            effect = np.ones((len(here), 1, 1)) if nature == "distance constant" else expected
            entries.append(Entries(place, here, np.zeros(len(here), dtype=np.int64), effect))
        for _, parts in self._gathered(entries):
            yield self._group(nature, name, parts, ("",), None)

    def held_control(self) -> Iterator[Group]:
        """Fixed coordinates along the grid's axes: each, and easting and northing together."""
        if self.job.datum.mode == "inner":
            return
        axes = grid_axes(self.system.state.geometry)
        fixed = self.job.marks.control == Control.FIXED
        for part, components in ((0, PLAN), (1, ("up",))):
            entries = []
            for place, rows in enumerate(self.kinds):
                for role in range(len(rows.roles)):
                    at = rows.marks[:, role]
                    here = np.flatnonzero(fixed[at, part])
                    along = np.einsum("rcj,rij->rci", self.derivatives[place][here, :, role], axes[at[here]])
                    chosen = along[:, :, :2] if part == 0 else along[:, :, 2:]
                    entries.append(Entries(place, here, at[here], -chosen))
            for mark, parts in self._gathered(entries):
                yield from self._coordinates(mark, parts, components)

    def _coordinates(self, mark: int, parts: list[Entries], components: Sequence[str]) -> Iterator[Group]:
        name = self.names[mark]
        for number, component in enumerate(components):
            single = [Entries(p.table, p.rows, p.key, p.effect[:, :, number : number + 1]) for p in parts]
            yield self._group("control", control_name(name, (component,)), single, (component,), mark)
        if len(components) > 1:
            yield self._group("control", control_name(name, components), parts, components, mark)

    def weighted_control(self) -> Iterator[Group]:
        """All coordinates of a weighted mark together; each by itself is an observation."""
        for place, rows in enumerate(self.kinds):
            if not isinstance(rows, ControlCoordinates):
                continue
            for mark in np.unique(rows.marks[:, 0]).tolist():
                here = np.flatnonzero(rows.marks[:, 0] == mark)
                if len(here) > 1 and self._concerned(place, here):
                    components = tuple(AXES[component] for component in rows.component[here])
                    effect = np.eye(len(here))[:, None, :]
                    part = Entries(place, here, np.full(len(here), mark), effect)
                    yield self._group(
                        "control", f"coordinates of control mark {self.names[mark]}", [part], components, mark
                    )

    def _concerned(self, place: int, rows: IntArray) -> bool:
        return bool(self._mask(place)[rows].any())

    def _mask(self, place: int) -> BoolArray:
        """Which rows (rows,) of a kind are interesting."""
        block = self.system.model.blocks[place]
        if self.interesting is None:
            return np.ones(len(block.observations), dtype=bool)
        mask = self.interesting[block.system_rows].reshape(-1, block.components)
        return np.asarray(mask.any(axis=1), dtype=np.bool_)

    def _gathered(self, entries: Sequence[Entries]) -> Iterator[tuple[int, list[Entries]]]:
        """The entries of each key that has enough rows and concerns an interesting one, keys ascending."""
        if not entries:
            return
        keys = np.concatenate([part.key for part in entries])
        counts = np.bincount(keys, minlength=int(keys.max(initial=-1)) + 1)
        wanted = counts >= FEWEST_ROWS
        if self.interesting is not None:
            touched = [part.key[self._mask(part.table)[part.rows]] for part in entries]
            wanted = wanted & np.isin(np.arange(len(wanted)), np.concatenate(touched))
        sorted_parts = [(part, *_sorted_by_key(part.key)) for part in entries]
        for key in np.flatnonzero(wanted).tolist():
            chosen = []
            for part, order, ordered in sorted_parts:
                first, last = np.searchsorted(ordered, [key, key + 1])
                if last > first:
                    here = order[first:last]
                    chosen.append(Entries(part.table, part.rows[here], part.key[here], part.effect[here]))
            yield key, chosen

    def _group(
        self, nature: Nature, name: str, parts: Sequence[Entries], components: Sequence[str], mark: int | None
    ) -> Group:
        unit = "1" if nature in ("distance scale", "staff scale") else "m"
        rows = tuple((part.table, part.rows) for part in parts)
        hypothesis = Hypothesis(nature, name, rows, tuple(components), unit, mark)  # type: ignore[arg-type]
        return Group(hypothesis, tuple(part.effect for part in parts))


def _sorted_by_key(key: IntArray) -> tuple[IntArray, IntArray]:
    order = np.argsort(key, kind="stable")
    return order, key[order]

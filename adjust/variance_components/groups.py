"""Which observations are judged together: those of one kind that share a `group`, or else an instrument and a file.

A job that keeps one file for each day is thereby judged by days. Groups that too little checks are put together with
the others of their kind in the same case; where even these together are too few, their sds stay as stated.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.observations import KIND_NAMES, Labels, Observations

LEAST_REDUNDANCY_OF_GROUP = 3.0
"""Sum of redundancy numbers below which a group says too little by itself: with three degrees of freedom the 95 %
interval of the factor reaches from 0.57 to 3.7 already (χ² distribution), and it opens quickly below."""


@dataclass(frozen=True)
class Group:
    """Rows of one kind; words as in `VarianceComponent`."""

    name: str
    kind: str
    components: int
    rows: IntArray
    """Places among all observations of the job, kind after kind."""
    instrument: str | None = None
    file: str | None = None
    group: str | None = None
    merged: tuple[str, ...] = ()


def find_groups(kinds: Sequence[Observations], redundancy: FloatArray) -> tuple[Group, ...]:
    """The groups of a job, kinds in their order; `redundancy` (observations,) says how well each row is checked."""
    groups: list[Group] = []
    first = 0
    for rows in kinds:
        cells = [replace(cell, rows=cell.rows + first) for cell in _cells(rows)]
        groups += _merged(cells, redundancy)
        first += len(rows)
    return tuple(groups)


def _cells(rows: Observations) -> Iterator[Group]:
    """The finest groups of one kind, in the order in which their first rows stand in the book."""
    provenance, count = rows.provenance, len(rows)
    group, instrument = _numbers(provenance.group, count), _numbers(provenance.instrument, count)
    grouped = group >= 0
    keys = np.column_stack(
        [group, np.where(grouped, -1, instrument), np.where(grouped, -1, provenance.file)]  # a group crosses files
    )
    _, opening, number = np.unique(keys, axis=0, return_index=True, return_inverse=True)
    several_instruments, several_files = (_several(values[~grouped]) for values in (instrument, provenance.file))
    for cell in np.argsort(opening).tolist():
        row = int(opening[cell])
        own = not grouped[row]
        word = None if own or provenance.group is None else provenance.group.of(row)
        used = provenance.instrument.of(row) if provenance.instrument is not None else ""
        instrument_of = (used or "no instrument") if own and several_instruments else None
        file_of = provenance.files[provenance.file[row]] if own and several_files else None
        parts = (f"group {word}" if word is not None else None, instrument_of, file_of)
        name = ", ".join([KIND_NAMES[rows.kind][1], *(part for part in parts if part)])
        here = np.flatnonzero(number.ravel() == cell)
        yield Group(name, rows.kind, len(rows.components), here, instrument_of, file_of, word)


def _numbers(labels: Labels | None, count: int) -> IntArray:
    return np.full(count, -1) if labels is None else labels.number


def _several(values: IntArray) -> bool:
    return len(np.unique(values)) > 1


def _merged(cells: Sequence[Group], redundancy: FloatArray) -> list[Group]:
    """The cells of one kind, those that too little checks put together behind the others."""
    sums = [float(np.sum(redundancy[cell.rows])) for cell in cells]
    large = [cell for cell, total in zip(cells, sums, strict=True) if total >= LEAST_REDUNDANCY_OF_GROUP]
    small = [cell for cell, total in zip(cells, sums, strict=True) if total < LEAST_REDUNDANCY_OF_GROUP]
    if len(small) < 2:
        return [*large, *small]
    kind = KIND_NAMES[small[0].kind][1]
    rest = Group(
        f"other {kind}" if large else kind,
        small[0].kind,
        small[0].components,
        np.sort(np.concatenate([cell.rows for cell in small])),
        merged=tuple(cell.name for cell in small),
    )
    return [*large, rest]


def enough(groups: Sequence[Group], redundancy: FloatArray) -> BoolArray:
    """Which groups (groups,) are checked well enough to be estimated."""
    sums = [float(np.sum(redundancy[group.rows])) for group in groups]
    return np.array(sums) >= LEAST_REDUNDANCY_OF_GROUP

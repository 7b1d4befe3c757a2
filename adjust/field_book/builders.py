"""From the rows of each table to observations: one builder for each table."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.field_book.columns import TableRows
from adjust.field_book.instruments import Instruments
from adjust.field_book.mistakes import ENOUGH, Mistakes
from adjust.field_book.raw_tables import RawTables
from adjust.field_book.schema import AXES, LARGEST_LENGTH, SMALLEST_SD
from adjust.field_book.vocabulary import NO_NAME, Vocabulary
from adjust.job import Control, Marks
from adjust.observations import (
    Angles,
    Azimuths,
    ControlCoordinates,
    Directions,
    HeightDifferences,
    HorizontalDistances,
    Labels,
    Observations,
    SlopeDistances,
    Vectors,
    ZenithAngles,
)

SMALLEST_DETERMINANT = 1e-12
"""Of a vector's correlation matrix: below it, one component follows from the others to the last digits printed, and
whitening by its Cholesky factor would lose half of what double precision holds."""


@dataclass(frozen=True)
class Builder:
    """What building needs besides the rows."""

    instruments: Instruments
    setups: Vocabulary
    marks: Vocabulary
    groups: Vocabulary
    mistakes: Mistakes
    raw: RawTables
    precision_mistakes: Mistakes
    """Where rows without an sd are noted; to be thrown away when the instruments themselves are mistaken."""
    notes: list[str]

    def build(self, rows: TableRows) -> tuple[Observations, ...]:
        """The observations of a table, in use and not; meaningful only where no mistake was noted."""
        self._check_ends(rows)
        return _BUILDERS[rows.table.name](self, self._with_labels(rows))

    def _with_labels(self, rows: TableRows) -> TableRows:
        """The rows with the instrument and the group of each."""
        group = _labels(self.groups.names, rows.indices["group"])
        used = self.instruments.of_rows(rows) if rows.table.has_instrument else np.full(len(rows), NO_NAME)
        instrument = _labels(self.instruments.names, used)
        return replace(rows, provenance=replace(rows.provenance, instrument=instrument, group=group))

    def _check_ends(self, rows: TableRows) -> None:
        """The marks of a row differ."""
        roles = [name for name in ("at", "from", "to") if name in rows.indices]
        for place, role in enumerate(roles[1:], 1):
            for other in roles[:place]:
                same = (rows.indices[role] == rows.indices[other]) & (rows.indices[role] >= 0)
                for row in np.flatnonzero(same)[:ENOUGH]:
                    name = self.marks.names[rows.indices[role][row]]
                    message = f"read {name!r} in '{other}' and in '{role}'; an observation joins different marks"
                    rows.complain(self.mistakes, int(row), role, message)

    def _common(self, rows: TableRows, kind: type[Observations], value: str) -> dict[str, Any]:
        return {
            "marks": np.column_stack([rows.indices[role] for role in kind.roles]),
            "observed": rows.numbers[value][:, None],
            "provenance": rows.provenance,
            "precision": self.instruments.precision(rows, self.precision_mistakes),
        }

    def directions(self, rows: TableRows) -> tuple[Observations, ...]:
        """Directions; a setup stands on one mark."""
        self.check_setups(rows)
        return (Directions(**self._common(rows, Directions, "direction"), setup_index=rows.indices["setup"]),)

    def check_setups(self, rows: TableRows) -> None:
        """Note setups that stand on more than one mark."""
        setup, at = rows.indices["setup"], rows.indices["at"]
        first_row: IntArray = np.zeros(len(self.setups.names), dtype=np.int64)
        numbers, first = np.unique(setup, return_index=True)
        first_row[numbers] = first
        for row in np.flatnonzero(at != at[first_row[setup]])[:ENOUGH]:
            name, stands = self.setups.names[setup[row]], self.marks.names[at[first_row[setup[row]]]]
            earlier = rows.provenance.label(int(first_row[setup[row]]))
            message = (
                f"read {self.marks.names[at[row]]!r}, but setup {name!r} stands on {stands!r} in {earlier}; "
                "give each occupation its own setup name"
            )
            rows.complain(self.mistakes, int(row), "at", message)

    def angles(self, rows: TableRows) -> tuple[Observations, ...]:
        """Angles."""
        return (Angles(**self._common(rows, Angles, "angle")),)

    def azimuths(self, rows: TableRows) -> tuple[Observations, ...]:
        """Azimuths."""
        return (Azimuths(**self._common(rows, Azimuths, "azimuth")),)

    def distances(self, rows: TableRows) -> tuple[Observations, ...]:
        """Slope and horizontal distances: each row fills one of the two columns."""
        slope, horizontal = (~np.isnan(rows.numbers[name]) for name in ("slope", "horizontal"))
        for row in np.flatnonzero(slope == horizontal)[:ENOUGH]:
            found = "both a slope and a horizontal distance" if slope[row] else "no distance"
            rows.complain(
                self.mistakes, int(row), "slope", f"the row has {found}; fill in exactly one of the two columns"
            )
        sloping = SlopeDistances(**self._common(rows, SlopeDistances, "slope"), heights=self._heights(rows, slope))
        level = HorizontalDistances(**{**_fields(sloping), "observed": rows.numbers["horizontal"][:, None]})
        return sloping.take(slope), level.take(horizontal)

    def _heights(self, rows: TableRows, sloping: BoolArray) -> FloatArray:
        """Instrument and target heights (rows, 2), 0 where none is given; said where other rows do give them."""
        heights = np.column_stack([rows.numbers["instrument_height"], rows.numbers["target_height"]])
        given = ~np.isnan(heights[sloping])
        if given.any() and not given.all():
            lacking = int(np.count_nonzero(~given.all(axis=1)))
            self.notes.append(
                f"{rows.table.name}: {lacking} of {len(given)} rows lack an instrument or target height; 0 is taken"
            )
        return np.nan_to_num(heights)

    def zeniths(self, rows: TableRows) -> tuple[Observations, ...]:
        """Zenith angles."""
        heights = self._heights(rows, np.ones(len(rows), dtype=bool))
        return (ZenithAngles(**self._common(rows, ZenithAngles, "zenith"), heights=heights),)

    def levels(self, rows: TableRows) -> tuple[Observations, ...]:
        """Levelled rises."""
        return (HeightDifferences(**self._common(rows, HeightDifferences, "rise"), length=rows.numbers["length"]),)

    def vectors(self, rows: TableRows) -> tuple[Observations, ...]:
        """GNSS vectors with their covariances."""
        covariances = self._covariances(rows)
        self._check_covariances(rows, covariances)
        return (
            Vectors(
                marks=np.column_stack([rows.indices["from"], rows.indices["to"]]),
                observed=np.column_stack([rows.numbers[f"d{axis}"] for axis in AXES]),
                provenance=rows.provenance,
                covariances=covariances,
            ),
        )

    def pointings(self, rows: TableRows) -> tuple[Observations, ...]:
        """What the pointings reduce to."""
        self.check_setups(rows)
        return self.raw.reduce(rows)

    def level_book(self, rows: TableRows) -> tuple[Observations, ...]:
        """What the level book reduces to."""
        return self.raw.reduce(rows)

    def _covariances(self, rows: TableRows) -> FloatArray:
        """(rows, 3, 3), m², from sds and correlations or as given."""
        matrices = np.empty((len(rows), 3, 3))
        by_sd = ~np.isnan(rows.numbers["sd_x"])
        for i, first in enumerate(AXES):
            for j, second in enumerate(AXES[i:], i):
                given = rows.numbers[f"cov_{first}{second}_m2"]
                product = rows.numbers[f"sd_{first}"] * rows.numbers[f"sd_{second}"]
                if i != j:
                    product = product * np.nan_to_num(rows.numbers[f"corr_{first}{second}"])
                matrices[:, i, j] = matrices[:, j, i] = np.where(by_sd, product, given)
        return matrices

    def _check_covariances(self, rows: TableRows, covariances: FloatArray) -> None:
        """Note vectors whose precision is incomplete or no possible one."""
        missing = np.isnan(covariances).any(axis=(1, 2))
        for row in np.flatnonzero(missing)[:ENOUGH]:
            message = "the row's precision is incomplete; fill in all three sds, or all six covariances"
            rows.complain(self.mistakes, int(row), None, message)
        for row in np.flatnonzero(~missing & ~positive_definite(covariances))[:ENOUGH]:
            message = (
                "the covariance matrix of the vector is not positive definite: its variances and correlations "
                "contradict each other; copy them again from the baseline's solution"
            )
            rows.complain(self.mistakes, int(row), None, message)


def _labels(names: tuple[str, ...], number: IntArray) -> Labels | None:
    return Labels(names, number) if np.any(number >= 0) else None


def _fields(observations: SlopeDistances) -> dict[str, Any]:
    return {name: getattr(observations, name) for name in ("marks", "provenance", "precision")}


def positive_definite(covariances: FloatArray) -> BoolArray:
    """Whether each matrix (rows, 3, 3) is a possible covariance: bounded sds, positive minors of the correlations.

    Sylvester's criterion (Horn & Johnson 2013, *Matrix Analysis*, theorem 7.2.5) on the correlation matrix.
    """
    variances = np.einsum("rii->ri", covariances)
    positive: BoolArray = ((variances >= SMALLEST_SD**2) & (variances <= LARGEST_LENGTH**2)).all(axis=1)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        sd = np.sqrt(variances)
        xy = covariances[:, 0, 1] / (sd[:, 0] * sd[:, 1])
        xz = covariances[:, 0, 2] / (sd[:, 0] * sd[:, 2])
        yz = covariances[:, 1, 2] / (sd[:, 1] * sd[:, 2])
        determinant = 1 + 2 * xy * xz * yz - xy**2 - xz**2 - yz**2
        possible: BoolArray = positive & (np.abs(xy) < 1) & (determinant > SMALLEST_DETERMINANT)
    return possible


_BUILDERS: dict[str, Callable[[Builder, TableRows], tuple[Observations, ...]]] = {
    "directions": Builder.directions,
    "angles": Builder.angles,
    "azimuths": Builder.azimuths,
    "distances": Builder.distances,
    "zeniths": Builder.zeniths,
    "levels": Builder.levels,
    "vectors": Builder.vectors,
    "pointings": Builder.pointings,
    "level_book": Builder.level_book,
}


def weighted_control(marks: Marks) -> ControlCoordinates | None:
    """The weighted coordinates of the marks as observations, or None where there are none."""
    weighted = np.column_stack([marks.control[:, [0, 0]], marks.control[:, 1:]]) == Control.WEIGHTED
    row, component = np.nonzero(weighted)
    if not len(row):
        return None
    return ControlCoordinates(
        marks=row[:, None].astype(np.int64),
        observed=np.zeros((len(row), 1)),
        provenance=marks.provenance.take(row),
        component=component.astype(np.int64),
        given=marks.given[row],
        sd=marks.sd[row, component],
    )

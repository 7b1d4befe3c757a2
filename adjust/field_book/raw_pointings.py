"""From the rows of `pointings.csv` to directions, zenith angles and slope distances."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.field_book.columns import TableRows
from adjust.field_book.instruments import Instruments
from adjust.field_book.mistakes import Mistakes, and_more
from adjust.field_book.notes import counted
from adjust.field_book.raw_instruments import USUAL_HUMIDITY, InstrumentErrors, Targets
from adjust.field_book.vocabulary import NO_NAME, Vocabulary
from adjust.observations import Directions, Observations, Precision, SlopeDistances, ZenithAngles
from adjust.reductions.circle import first_of_groups, number_groups
from adjust.reductions.distance import slope_of
from adjust.reductions.faces import LEFT, RIGHT
from adjust.reductions.outcome import Means, PointingsReduced, Reduced
from adjust.reductions.pointings import Pointings, carried, carried_by_target, faces_of
from adjust.reductions.rounds import (
    closed_horizons,
    compare_both_ends,
    reduce_directions,
    reduce_slopes,
    reduce_zeniths,
)

STATED = {"circle": "direction_arcsec", "zenith": "zenith_arcsec", "slope": "distance_mm or distance_ppm"}
"""The keys of an instrument that give the sd of what each column makes."""


@dataclass(frozen=True)
class PointingsBuilder:
    """Reduces the pointings of a job, noting mistakes."""

    rows: TableRows
    instruments: Instruments
    errors: InstrumentErrors
    targets: Targets
    setups: Vocabulary
    mistakes: Mistakes
    precision_mistakes: Mistakes
    notes: list[str]

    def build(self) -> tuple[tuple[Observations, ...], PointingsReduced | None]:
        """The observations and what the readings say of themselves; nothing where a mistake was noted."""
        noted = len(self.mistakes), len(self.precision_mistakes)
        self._check_setups()
        self._check_readings()
        book = self._book()
        self._check_precision(book)
        if (len(self.mistakes), len(self.precision_mistakes)) != noted or self.mistakes.any_in(
            *self.rows.provenance.files
        ):
            return (), None
        setups = len(self.setups.names)
        zeniths, slopes = reduce_zeniths(book, setups), reduce_slopes(book, setups)
        reduced = PointingsReduced(
            self.setups.names,
            reduce_directions(book, setups),
            zeniths,
            slopes,
            closed_horizons(book),
            compare_both_ends(book, slopes.means, zeniths.means),
            self._velocity()[slopes.means.row],
        )
        self._take_notes(book, reduced)
        return self._observations(book, reduced), reduced

    def _book(self) -> Pointings:
        rows, used = self.rows, self.instruments.of_rows(self.rows)
        setup, to, zenith = rows.indices["setup"], rows.indices["to"], rows.numbers["zenith"]
        instrument_height = carried(rows.numbers["instrument_height"], setup)
        target_height = carried_by_target(rows.numbers["target_height"], setup, to)
        return Pointings(
            setup,
            rows.indices["at"],
            to,
            rows.indices["round"],
            faces_of(rows.indices["face"], zenith),
            rows.numbers["circle"],
            zenith,
            self._slopes(used),
            np.nan_to_num(np.column_stack([instrument_height, target_height])),
            self.errors.collimation[used],
            self.errors.index[used],
            self.instruments.direction[used],
            self.instruments.zenith[used],
            self.instruments.distance[used],
            self.instruments.proportional[used],
            rows.provenance,
        )

    def _slopes(self, used: IntArray) -> FloatArray:
        """Distances (rows,) corrected for air, scale and the target's constant."""
        constant = self.targets.constant[self._target()]
        scale = np.nan_to_num(self.errors.scale[used])
        return slope_of(self.rows.numbers["slope"], self._velocity(), scale, constant)

    def _velocity(self) -> FloatArray:
        """Factor (rows,) of the correction for the air, 1 where nothing is known of it."""
        velocity = self.errors.velocity(self.instruments.of_rows(self.rows), *self._weather())
        return np.where(np.isnan(velocity), 1.0, velocity)

    def _weather(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        numbers, setup = self.rows.numbers, self.rows.indices["setup"]
        celsius, hectopascal, humidity = (
            carried(numbers[name], setup) for name in ("temperature_c", "pressure_hpa", "humidity_percent")
        )
        return celsius, hectopascal, humidity

    def _target(self) -> IntArray:
        own = self.rows.indices["target"]
        return np.where(own == NO_NAME, self.targets.default, own)

    def _check_setups(self) -> None:
        """One setup keeps its instrument, group and file (that it keeps its mark is checked with directions)."""
        rows = self.rows
        setup, setups = number_groups(rows.indices["setup"])
        opening = first_of_groups(setup, setups)[setup]
        used = self.instruments.of_rows(rows)
        for values, column, what in (
            (used, "instrument", "another instrument"),
            (rows.indices["group"], "group", "another group"),
            (rows.provenance.file, None, "another file"),
        ):
            wrong = np.flatnonzero(values != values[opening])
            if len(wrong):
                name = self.setups.names[rows.indices["setup"][wrong[0]]]
                message = f"setup {name!r} has {what} in {rows.provenance.label(int(opening[wrong[0]]))}"
                message += f"; give each occupation its own setup name{and_more(len(wrong) - 1)}"
                rows.complain(self.mistakes, int(wrong[0]), column, message)

    def _check_readings(self) -> None:
        """Rows that say nothing, faces that contradict the vertical circle, weather by halves."""
        numbers, face = self.rows.numbers, self.rows.indices["face"]
        zenith = numbers["zenith"]
        nothing = np.isnan(numbers["circle"]) & np.isnan(zenith) & np.isnan(numbers["slope"])
        self._complain(nothing, None, "the row has no reading; give it one, or take the row out")
        with np.errstate(invalid="ignore"):
            for side, letter, other in ((LEFT, "L", zenith > np.pi), (RIGHT, "R", zenith < np.pi)):
                message = f"read a zenith angle of the other face, expected one of face {letter}; check both"
                self._complain((face == side) & other, "zenith", message)
        celsius, hectopascal, _ = self._weather()
        for lacking, there, name in ((celsius, hectopascal, "temperature_c"), (hectopascal, celsius, "pressure_hpa")):
            message = "the setup gives the other half of the weather and not this one; give both, or neither"
            self._complain(np.isnan(lacking) & ~np.isnan(there), name, message)

    def _check_precision(self, book: Pointings) -> None:
        """Instruments that say nothing of what was read with them."""
        for name, values, sd in (
            ("circle", book.circle, book.direction_sd),
            ("zenith", book.zenith, book.zenith_sd),
            ("slope", book.slope, book.distance_sd),
        ):
            used = self.instruments.of_rows(self.rows)
            lacking = ~np.isnan(values) & np.isnan(sd)
            unnamed = "the row names no instrument; give it one, or set instrument in [defaults] of the job file"
            self._complain(lacking & (used == NO_NAME), "instrument", unnamed, self.precision_mistakes)
            for number in np.unique(used[lacking & (used != NO_NAME)]):
                instrument = self.instruments.names[number]
                message = (
                    f"instrument {instrument!r} says nothing for it; give [instruments.{instrument}] {STATED[name]}"
                )
                self._complain(lacking & (used == number), name, message, self.precision_mistakes)

    def _complain(self, where: BoolArray, column: str | None, message: str, mistakes: Mistakes | None = None) -> None:
        """One mistake, on the first of the rows."""
        rows = np.flatnonzero(where)
        if len(rows):
            place = self.mistakes if mistakes is None else mistakes
            self.rows.complain(place, int(rows[0]), column, message + and_more(len(rows) - 1))

    def _observations(self, book: Pointings, reduced: PointingsReduced) -> tuple[Observations, ...]:
        directions, zeniths, slopes = (part.means for part in (reduced.directions, reduced.zeniths, reduced.slopes))
        return (
            Directions(**self._common(book, directions), setup_index=self._setups_of(book, directions)),
            SlopeDistances(**self._common(book, slopes, book.proportional), heights=book.heights[slopes.row]),
            ZenithAngles(**self._common(book, zeniths), heights=book.heights[zeniths.row]),
        )

    def _common(self, book: Pointings, means: Means, proportional: FloatArray | None = None) -> dict[str, Any]:
        row = means.row
        used, target = self.instruments.of_rows(self.rows)[row], self._target()[row]
        own = self.targets.centring[target]
        nothing = np.zeros(len(row))
        return {
            "marks": np.column_stack([book.at[row], book.to[row]]),
            "observed": means.value[:, None],
            "provenance": means.provenance,
            "precision": Precision(
                np.full(len(row), np.nan),
                means.sd,
                nothing if proportional is None else proportional[row],
                self.instruments.centring[used],
                np.where(np.isnan(own), self.instruments.target_centring[used], own),
                self.instruments.heights[used],
            ),
        }

    def _setups_of(self, book: Pointings, means: Means) -> IntArray:
        """The setup of each direction; a further part of a setup has an orientation of its own."""
        setup = book.setup[means.row].copy()
        for row in np.flatnonzero(means.part > 0):
            setup[row] = self.setups.numbers([f"{self.setups.names[setup[row]]} part {means.part[row] + 1}"])[0]
        return setup

    def _take_notes(self, book: Pointings, reduced: PointingsReduced) -> None:
        """What was taken for granted."""
        used, table = self.instruments.of_rows(self.rows), self.rows.table.name
        for kind, part in (("direction", reduced.directions), ("zenith angle", reduced.zeniths)):
            if part.uncorrected:
                error = "collimation" if kind == "direction" else "index"
                number = counted(part.uncorrected, kind)
                self.notes.append(f"{table}: {number} read on one face with an unknown {error} error, not corrected")
        celsius, _, humidity = self._weather()
        far = ~np.isnan(book.slope) & ~np.isnan(celsius)
        if np.any(far & ~self.errors.knows_its_air()[used]):
            self.notes.append(f"{table}: the weather is not used where the instrument has no edm_… keys")
        if np.any(far & np.isnan(humidity)):
            self.notes.append(f"{table}: a humidity of {USUAL_HUMIDITY:g} % is taken where none was read")
        heights = np.isnan(carried(self.rows.numbers["instrument_height"], book.setup))
        lacking = heights & ~(np.isnan(book.zenith) & np.isnan(book.slope))
        if lacking.any() and not heights.all():
            self.notes.append(f"{table}: {counted(int(lacking.sum()), 'row')} lack an instrument height; 0 is taken")
        self._note_lone_directions(book, reduced.directions)

    def _note_lone_directions(self, book: Pointings, directions: Reduced) -> None:
        observed = np.unique(book.setup[~np.isnan(book.circle)])
        lone = np.setdiff1d(observed, book.setup[directions.means.row])
        if len(lone):
            names = ", ".join(self.setups.names[setup] for setup in lone)
            self.notes.append(f"{self.rows.table.name}: a direction to a single target says nothing (setup {names})")

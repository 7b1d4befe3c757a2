"""From instruments and the rows' own standard deviations to the precision of each row."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.columns import TableRows
from adjust.field_book.job_file import JobFile
from adjust.field_book.mistakes import Mistakes, and_more
from adjust.field_book.schema import SMALLEST_SD, TABLES
from adjust.field_book.vocabulary import NO_NAME
from adjust.observations import Precision
from adjust.units import ARCSEC

MILLIMETRE = 1e-3
PART_PER_MILLION = 1e-6

CONSTANTS: dict[str, tuple[str, ...]] = {
    "directions": ("direction_arcsec",),
    "angles": ("angle_arcsec", "direction_arcsec"),
    "azimuths": ("azimuth_arcsec", "direction_arcsec"),
    "distances": ("distance_mm", "distance_ppm"),
    "zeniths": ("zenith_arcsec",),
    "levels": ("level_mm_per_sqrt_km", "level_mm_per_setup"),
}
"""The keys of an instrument that give the sd of each table's rows; the first that is there counts."""


@dataclass(frozen=True)
class Instruments:
    """The instruments of a job as columns, one entry each and a last one, all NaN, for "no instrument".

    The key's own units are turned into metres and radians; `default` is the instrument (its number) of each table's
    rows that name none, `NO_NAME` where there is no default.
    """

    names: tuple[str, ...]
    direction: FloatArray
    angle: FloatArray
    azimuth: FloatArray
    zenith: FloatArray
    distance: FloatArray
    proportional: FloatArray
    centring: FloatArray
    target_centring: FloatArray
    heights: FloatArray
    level_per_root_metre: FloatArray
    level_per_setup: FloatArray
    default: dict[str, int]

    @classmethod
    def of(cls, job_file: JobFile) -> Instruments:
        """The instruments that a job file describes. An angle is the difference of two directions: direction × √2."""
        names = tuple(job_file.instruments)
        every = [*job_file.instruments.values()]

        def column(key: str, unit: float) -> FloatArray:
            return values_of((getattr(instrument, key) for instrument in every), len(every)) * unit

        direction = column("direction_arcsec", ARCSEC)
        distance, proportional = column("distance_mm", MILLIMETRE), column("distance_ppm", PART_PER_MILLION)
        stated = np.fmax(distance, proportional) >= SMALLEST_SD
        return cls(
            names,
            direction,
            _first(column("angle_arcsec", ARCSEC), direction * np.sqrt(2)),
            _first(column("azimuth_arcsec", ARCSEC), direction),
            column("zenith_arcsec", ARCSEC),
            np.where(stated, np.nan_to_num(distance), np.nan),
            np.nan_to_num(proportional),
            np.nan_to_num(column("centring_mm", MILLIMETRE)),
            np.nan_to_num(column("target_centring_mm", MILLIMETRE)),
            np.nan_to_num(column("height_mm", MILLIMETRE)),
            column("level_mm_per_sqrt_km", MILLIMETRE / np.sqrt(1000.0)),
            column("level_mm_per_setup", MILLIMETRE),
            {table: _number(names, job_file.default_instrument(table)) for table in TABLES},
        )

    def of_rows(self, rows: TableRows) -> IntArray:
        """The instrument (rows,) of each row: its own, or else the default of its table."""
        own = rows.indices["instrument"]
        return np.where(own == NO_NAME, self.default[rows.table.name], own)

    def _constant(self, rows: TableRows, used: IntArray) -> FloatArray:
        if rows.table.name == "levels":
            by_length = self.level_per_root_metre[used] * np.sqrt(rows.numbers["length"])
            return _first(by_length, self.level_per_setup[used] * np.sqrt(rows.numbers["setups"]))
        columns = {
            "directions": self.direction,
            "angles": self.angle,
            "azimuths": self.azimuth,
            "distances": self.distance,
            "zeniths": self.zenith,
        }
        return columns[rows.table.name][used]

    def precision(self, rows: TableRows, mistakes: Mistakes) -> Precision:
        """The precision of each row, after noting the rows for which neither an sd nor an instrument speaks."""
        stated, used = rows.numbers["sd"], self.of_rows(rows)
        constant = self._constant(rows, used)
        self._complain(rows, used, np.flatnonzero(np.isnan(stated) & np.isnan(constant)), mistakes)
        proportional = self.proportional if rows.table.name == "distances" else np.zeros(len(self.names) + 1)
        return Precision(
            stated,
            constant,
            proportional[used],
            self.centring[used],
            self.target_centring[used],
            self.heights[used],
        )

    def _complain(self, rows: TableRows, used: IntArray, lacking: IntArray, mistakes: Mistakes) -> None:
        """One mistake for each instrument that leaves rows without an sd, on the first of those rows."""
        for instrument in np.unique(used[lacking]):
            without = lacking[used[lacking] == instrument]
            message = (
                f"the row has no sd and {self._why(rows, int(instrument), int(without[0]))}{and_more(len(without) - 1)}"
            )
            rows.complain(mistakes, int(without[0]), "sd", message)

    def _why(self, rows: TableRows, instrument: int, row: int) -> str:
        table = rows.table.name
        if instrument == NO_NAME:
            return "names no instrument; give it one of them, or set instrument in [defaults] of the job file"
        name = self.names[instrument]
        if table == "levels" and np.isnan(rows.numbers["length"][row]) and np.isnan(rows.numbers["setups"][row]):
            return f"instrument {name!r} needs its length or its setups; give the row one of these or an sd"
        keys = " or ".join(CONSTANTS[table])
        return f"instrument {name!r} says nothing for it; give the row an sd, or [instruments.{name}] a fitting {keys}"


def values_of(given: Iterable[float | None], count: int) -> FloatArray:
    """Numbers (count + 1,), NaN where there is none and at the end."""
    values = np.full(count + 1, np.nan)
    values[:count] = [np.nan if value is None else value for value in given]
    return values


def _first(values: FloatArray, otherwise: FloatArray) -> FloatArray:
    return np.where(np.isnan(values), otherwise, values)


def _number(names: tuple[str, ...], name: str | None) -> int:
    return names.index(name) if name in names else NO_NAME

"""From the precision of rows back to instruments of a job file that describe it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.instruments import MILLIMETRE, PART_PER_MILLION, Instruments
from adjust.field_book.job_file import Instrument, JobFile
from adjust.observations import Precision
from adjust.units import ARCSEC

InstrumentKeys = Mapping[str, float]
"""The keys of one `[instruments.NAME]`, in their own units."""

_CONSTANTS = {
    "directions": ("direction_arcsec", ARCSEC),
    "angles": ("angle_arcsec", ARCSEC),
    "azimuths": ("azimuth_arcsec", ARCSEC),
    "distances": ("distance_mm", MILLIMETRE),
    "zeniths": ("zenith_arcsec", ARCSEC),
}
_PARTS = (
    ("distance_ppm", PART_PER_MILLION),
    ("centring_mm", MILLIMETRE),
    ("target_centring_mm", MILLIMETRE),
    ("height_mm", MILLIMETRE),
)
_HEIGHTED = ("distances", "zeniths")
"""Tables in which the height of an instrument matters."""

ALIKE = 1e-12
"""Relative difference below which two precisions are one: what conversion between units leaves."""


class InstrumentBook:
    """Instruments that a job file names: those given, and those added for rows that none of them describes."""

    def __init__(self, given: Mapping[str, InstrumentKeys], defaults: Mapping[str, str]) -> None:
        self.keys: dict[str, InstrumentKeys] = dict(given)
        self.defaults = dict(defaults)

    def cells(self, table: str, precision: Precision) -> list[str]:
        """The instrument of each row (rows,) that states no sd; blank where it does, or where the default serves."""
        on_model = np.isnan(precision.stated)
        models = self._models(table, precision)
        distinct, of_row = _distinct(models[on_model])
        names = [self._name(table, model, alone=len(distinct) == 1) for model in distinct]
        default = self._default(table)
        shown = np.array(["" if name == default else name for name in names], dtype=object)
        cells = np.full(len(models), "", dtype=object)
        cells[on_model] = shown[of_row] if names else ""
        written: list[str] = cells.tolist()
        return written

    def _models(self, table: str, precision: Precision) -> FloatArray:
        """Constant, proportional part, centring of instrument and target, heights (rows, 5) as far as they matter."""
        heights = precision.heights * (table in _HEIGHTED)
        proportional = precision.proportional * (table == "distances")
        return np.column_stack(
            [precision.constant, proportional, precision.centring, precision.target_centring, heights]
        )

    def _default(self, table: str) -> str | None:
        return self.defaults.get(f"{table}_instrument", self.defaults.get("instrument"))

    def _name(self, table: str, model: FloatArray, *, alone: bool) -> str:
        """The instrument that describes a model, added to the book where there is none."""
        for name, described in self._described(table).items():
            if np.allclose(described, model, rtol=ALIKE, atol=0.0):
                return name
        key, unit = _CONSTANTS[table]
        units = ((key, unit), *_PARTS)
        keys = {
            key: float(f"{part / unit:.15g}") for part, (key, unit) in zip(model.tolist(), units, strict=True) if part
        }
        name = next(name for number in range(1, len(self.keys) + 2) if (name := f"{table}_{number}") not in self.keys)
        self.keys[name] = keys
        if alone and self._default(table) is None:
            self.defaults[f"{table}_instrument"] = name
        return name

    def _described(self, table: str) -> dict[str, FloatArray]:
        """The model of each instrument for a table, as reading will understand it."""
        read = Instruments.of(
            JobFile(instruments={name: Instrument.model_validate(keys) for name, keys in self.keys.items()})
        )
        constant = {
            "directions": read.direction,
            "angles": read.angle,
            "azimuths": read.azimuth,
            "distances": read.distance,
            "zeniths": read.zenith,
        }[table]
        precision = Precision(constant, constant, read.proportional, read.centring, read.target_centring, read.heights)
        return dict(zip(read.names, self._models(table, precision), strict=False))


def _distinct(models: FloatArray) -> tuple[FloatArray, IntArray]:
    """The different models (m, 5) and which of them each row (rows,) has; quick where there is but one."""
    if len(models) and np.all(models == models[0]):
        return models[:1], np.zeros(len(models), dtype=np.int64)
    distinct, of_row = np.unique(models, axis=0, return_inverse=True)
    return distinct, of_row.ravel()

"""What the job file says of instruments and targets for raw readings: their errors, their light, their constants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.field_book.instruments import MILLIMETRE, PART_PER_MILLION, values_of
from adjust.field_book.job_file import JobFile
from adjust.reductions import ciddor, refractivity
from adjust.reductions.atmosphere import Air
from adjust.reductions.distance import maker_factor, velocity_factor
from adjust.units import ARCSEC

NANOMETRE = 1e-9
USUAL_HUMIDITY = 60.0
"""Per cent, where none was read: common practice, no source. Half of it more or less is 0.3 ppm at 20 °C."""


@dataclass(frozen=True)
class InstrumentErrors:
    """Instruments as columns, one entry each and a last one, all NaN, for "no instrument"; metres and radians."""

    collimation: FloatArray
    index: FloatArray
    level_collimation: FloatArray
    scale: FloatArray
    wavelength: FloatArray
    reference_index: FloatArray
    rigorous: FloatArray
    ppm_constant: FloatArray
    ppm_by_pressure: FloatArray

    @classmethod
    def of(cls, job_file: JobFile) -> InstrumentErrors:
        """The instruments of a job file."""
        every = [*job_file.instruments.values()]

        def column(key: str, unit: float = 1.0) -> FloatArray:
            return values_of((getattr(instrument, key) for instrument in every), len(every)) * unit

        return cls(
            column("collimation_arcsec", ARCSEC),
            column("index_arcsec", ARCSEC),
            column("level_collimation_arcsec", ARCSEC),
            column("edm_scale_ppm", PART_PER_MILLION),
            column("edm_wavelength_nm", NANOMETRE),
            column("edm_reference_index"),
            values_of((float(instrument.edm_formula == "rigorous") for instrument in every), len(every)),
            column("edm_ppm_c"),
            column("edm_ppm_d"),
        )

    def velocity(
        self, used: IntArray, celsius: FloatArray, hectopascal: FloatArray, humidity: FloatArray
    ) -> FloatArray:
        """Factor (rows,) of the first velocity correction; NaN without weather, or where the instrument says nothing.

        `used` (rows,) numbers instruments; humidity is in per cent, `USUAL_HUMIDITY` where it is NaN.
        """
        air = Air.of_readings(celsius, hectopascal, np.where(np.isnan(humidity), USUAL_HUMIDITY, humidity) / 100.0)
        wavelength = self.wavelength[used]
        closed = refractivity.group_refractivity(wavelength, air)
        refractive = np.where(self.rigorous[used] == 1.0, ciddor.group_refractivity(wavelength, air), closed)
        by_index = velocity_factor(self.reference_index[used], refractive)
        by_maker = maker_factor(self.ppm_constant[used], self.ppm_by_pressure[used], air)
        return np.where(np.isnan(by_index), by_maker, by_index)

    def knows_its_air(self) -> BoolArray:
        """Whether each instrument (instruments,) can be corrected for the air."""
        known: BoolArray = ~np.isnan(self.reference_index) | ~np.isnan(self.ppm_constant)
        return known


@dataclass(frozen=True)
class Targets:
    """Targets as columns, one entry each and a last one for "no target": `constant` 0 and `centring` NaN; metres."""

    constant: FloatArray
    centring: FloatArray
    default: int

    @classmethod
    def of(cls, job_file: JobFile) -> Targets:
        """The targets of a job file."""
        names, every = tuple(job_file.targets), [*job_file.targets.values()]
        constant = np.append([target.constant_mm * MILLIMETRE for target in every], 0.0)
        centring = values_of((target.centring_mm for target in every), len(every)) * MILLIMETRE
        default = job_file.defaults.get("target")
        return cls(constant, centring, names.index(default) if default in names else -1)

"""The air along a sight: what was read of it, in kelvins and pascals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray

ICE_POINT = 273.15
"""Kelvins at 0 °C, exact (SI brochure, 9th edition, 2.3.1)."""
HECTOPASCAL = 100.0
SATURATION = (1.2378847e-5, -1.9121316e-2, 33.93711047, -6.3431645e3)
"""A (K⁻²), B (K⁻¹), C, D (K) of the saturation vapour pressure, CIPM equation of state for moist air: Davis (1992),
*Metrologia* 29, 67–70, as used by Ciddor (1996), appendix A; from memory, checked against the
formula of WMO-No. 8 and, through `ciddor`, against the paper's table."""
ENHANCEMENT = (1.00062, 3.14e-8, 5.6e-7)
"""α, β (Pa⁻¹), γ (°C⁻²) of the enhancement factor, same source."""


@dataclass(frozen=True)
class Air:
    """Temperature (rows,) in kelvins, pressure and partial pressure of water vapour (rows,) in pascals."""

    temperature: FloatArray
    pressure: FloatArray
    vapour: FloatArray

    @classmethod
    def of_readings(cls, celsius: FloatArray, hectopascal: FloatArray, humidity: FloatArray) -> Air:
        """Air of temperatures in °C, pressures in hPa and relative humidities 0 … 1, each (rows,)."""
        temperature, pressure = celsius + ICE_POINT, hectopascal * HECTOPASCAL
        return cls(temperature, pressure, vapour_pressure(temperature, pressure, humidity))


def saturation_pressure(temperature: FloatArray) -> FloatArray:
    """Vapour pressure over a surface of water (rows,), pascals, at temperatures (rows,) in kelvins.

    exp(A T² + B T + C + D/T); below freezing over supercooled water, as hygrometers are calibrated.
    Source: `SATURATION`.
    """
    square, linear, constant, inverse = SATURATION
    return np.exp(square * temperature**2 + linear * temperature + constant + inverse / temperature)


def vapour_pressure(temperature: FloatArray, pressure: FloatArray, humidity: FloatArray) -> FloatArray:
    """Partial pressure of water vapour (rows,), pascals: humidity · f · saturation pressure.

    `temperature` in kelvins, `pressure` in pascals, relative `humidity` 0 … 1; f = α + β p + γ t², t in °C, lets water
    evaporate a little more readily into air than into vacuum. Source: `ENHANCEMENT`.
    """
    constant, by_pressure, by_temperature = ENHANCEMENT
    factor = constant + by_pressure * pressure + by_temperature * (temperature - ICE_POINT) ** 2
    return humidity * factor * saturation_pressure(temperature)

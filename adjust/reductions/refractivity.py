"""Group refractivity of air for distance meters, by the closed formula of the IAG (1999)."""

from __future__ import annotations

from adjust.arrays import FloatArray
from adjust.reductions.atmosphere import HECTOPASCAL, ICE_POINT, Air

DISPERSION = (287.6155, 4.88660, 0.06800)
"""A, B (µm²), C (µm⁴) of the group refractivity of dry air at 0 °C, 1013.25 hPa and 375 ppm CO₂, parts per million:
IAG resolution on distance measurement in air, 1999; from memory, checked against Ciddor (1996)."""
NORMAL_PRESSURE = 1013.25 * HECTOPASCAL
BY_VAPOUR = 11.27 / HECTOPASCAL
"""Parts per million · K/Pa, same source."""
MICROMETRE = 1e-6
PART_PER_MILLION = 1e-6


def standard_group_refractivity(wavelength: FloatArray) -> FloatArray:
    """n − 1 (rows,) of dry air at 0 °C and 1013.25 hPa for carrier wavelengths (rows,) in metres: A + B/λ² + C/λ⁴."""
    constant, quadratic, quartic = DISPERSION
    square = (wavelength / MICROMETRE) ** 2
    return (constant + quadratic / square + quartic / square**2) * PART_PER_MILLION


def group_refractivity(wavelength: FloatArray, air: Air) -> FloatArray:
    """n − 1 (rows,) of the group of waves with carrier wavelengths (rows,) in metres, in `air`.

    (273.15/1013.25) · N₀ · p/T − 11.27 · e/T, p and e in hPa: within 0.25 ppm of the rigorous index between −30 °C and
    +45 °C for red and near-infrared light (the resolution's own statement, from memory; `tests/test_reduction_air.py`
    measures it against `ciddor`).
    """
    dry = ICE_POINT / NORMAL_PRESSURE * standard_group_refractivity(wavelength) * air.pressure
    return (dry - BY_VAPOUR * PART_PER_MILLION * air.vapour) / air.temperature

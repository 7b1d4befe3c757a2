"""The refractive index of air after Ciddor, phase and group, for visible and near-infrared light.

Ciddor (1996), *Applied Optics* 35, 1566–1573, appendices A and B; the group index by differentiating its dispersion
terms, as in Ciddor & Hill (1999), *Applied Optics* 38, 1663–1667. Constants from memory, checked against the table of
the paper.
"""

from __future__ import annotations

from typing import TypeVar

import numpy as np

from adjust.arrays import FloatArray
from adjust.reductions.atmosphere import ICE_POINT, Air

Number = TypeVar("Number", float, FloatArray)

AIR_STRENGTHS, AIR_POLES = np.array([5_792_105.0, 167_917.0]), np.array([238.0185, 57.362])
"""kᵢ and sᵢ, µm⁻², of 10⁸ (n − 1) = Σ kᵢ/(sᵢ − σ²): dry air at 15 °C, 101 325 Pa, 450 ppm CO₂."""
VAPOUR_DISPERSION, VAPOUR_POWERS = np.array([295.235, 2.6422, -0.032380, 0.004028]), np.arange(4)
"""wᵢ, µm²ⁱ, of 10⁸ (n − 1) = 1.022 Σ wᵢ σ²ⁱ: water vapour at 20 °C, 1333 Pa."""
VAPOUR_CORRECTION = 1.022
REFERENCE_CARBON_DIOXIDE, BY_CARBON_DIOXIDE = 450e-6, 0.534
"""Molar fraction, and the relative change of n − 1 for a change of it."""
COMPRESSIBILITY = (1.58123e-6, -2.9331e-8, 1.1043e-10, 5.707e-6, -2.051e-8, 1.9898e-4, -2.376e-6, 1.83e-11, -0.765e-8)
"""a₀ a₁ a₂ b₀ b₁ c₀ c₁ d e of the compressibility Z, SI units and °C."""
GAS_CONSTANT = 8.314510
"""J/(mol K), the value of the paper."""
MOLAR_MASS_OF_VAPOUR = 0.018015
"""kg/mol."""
DRY_STANDARD = (15.0 + ICE_POINT, 101_325.0)
VAPOUR_STANDARD = (20.0 + ICE_POINT, 1333.0)
EDM_CARBON_DIOXIDE = 375e-6
"""Molar fraction for which the closed formula of the IAG holds."""
MICROMETRE = 1e-6
DISPERSION_UNIT = 1e-8


def phase_refractivity(wavelength: FloatArray, air: Air, carbon_dioxide: float = EDM_CARBON_DIOXIDE) -> FloatArray:
    """n − 1 (rows,) of the phase for vacuum wavelengths (rows,) in metres; `carbon_dioxide` is a molar fraction."""
    wavenumber = (MICROMETRE / wavelength[:, None]) ** 2
    dry = np.sum(AIR_STRENGTHS / (AIR_POLES - wavenumber), axis=1)
    vapour = np.sum(VAPOUR_DISPERSION * wavenumber**VAPOUR_POWERS, axis=1)
    return _in_moist_air(dry, vapour, air, carbon_dioxide)


def group_refractivity(wavelength: FloatArray, air: Air, carbon_dioxide: float = EDM_CARBON_DIOXIDE) -> FloatArray:
    """n − 1 (rows,) of the group, n + σ dn/dσ, σ the wavenumber; otherwise as `phase_refractivity`."""
    wavenumber = (MICROMETRE / wavelength[:, None]) ** 2
    dry = np.sum(AIR_STRENGTHS * (AIR_POLES + wavenumber) / (AIR_POLES - wavenumber) ** 2, axis=1)
    vapour = np.sum((2 * VAPOUR_POWERS + 1) * VAPOUR_DISPERSION * wavenumber**VAPOUR_POWERS, axis=1)
    return _in_moist_air(dry, vapour, air, carbon_dioxide)


def _in_moist_air(dry: FloatArray, vapour: FloatArray, air: Air, carbon_dioxide: float) -> FloatArray:
    """Lorentz's sum of the components' refractivities, each at its density (equation 5 of the paper)."""
    fraction = air.vapour / air.pressure
    molar_mass = 1e-3 * (28.9635 + 12.011e-6 * (carbon_dioxide * 1e6 - 400.0))
    moles = air.pressure / (compressibility(air.temperature, air.pressure, fraction) * GAS_CONSTANT * air.temperature)
    standard_air = DRY_STANDARD[1] / (compressibility(*DRY_STANDARD, 0.0) * GAS_CONSTANT * DRY_STANDARD[0])
    standard_vapour = VAPOUR_STANDARD[1] / (compressibility(*VAPOUR_STANDARD, 1.0) * GAS_CONSTANT * VAPOUR_STANDARD[0])
    air_share = moles * molar_mass * (1.0 - fraction) / (standard_air * molar_mass)
    vapour_share = moles * MOLAR_MASS_OF_VAPOUR * fraction / (standard_vapour * MOLAR_MASS_OF_VAPOUR)
    by_carbon_dioxide = 1.0 + BY_CARBON_DIOXIDE * (carbon_dioxide - REFERENCE_CARBON_DIOXIDE)
    dry_part = air_share * dry * by_carbon_dioxide
    return DISPERSION_UNIT * (dry_part + vapour_share * VAPOUR_CORRECTION * vapour)


def compressibility(temperature: Number, pressure: Number, fraction: Number) -> Number:
    """Z of moist air: kelvins, pascals, molar `fraction` of water vapour. Davis (1992), as in Ciddor (1996)."""
    a0, a1, a2, b0, b1, c0, c1, d, e = COMPRESSIBILITY
    celsius, ratio = temperature - ICE_POINT, pressure / temperature
    linear = a0 + a1 * celsius + a2 * celsius**2 + (b0 + b1 * celsius) * fraction + (c0 + c1 * celsius) * fraction**2
    return 1.0 - ratio * linear + ratio**2 * (d + e * fraction**2)

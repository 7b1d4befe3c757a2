"""The air of a distance: refractive indices against published tables, the closed formula against the rigorous one."""

import json
from pathlib import Path

import numpy as np
import pytest

from adjust.reductions import ciddor, refractivity
from adjust.reductions.atmosphere import Air, saturation_pressure, vapour_pressure
from adjust.reductions.distance import maker_factor, velocity_factor

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "reductions.json").read_text("utf-8"))}
"""Each entry names its source."""


def air(celsius, hectopascal, humidity):
    return Air.of_readings(
        *np.broadcast_arrays(*(np.atleast_1d(v).astype(float) for v in (celsius, hectopascal, humidity)))
    )


def test_standard_group_refractivity_a01():
    wavelength = float(ENTRIES["A01"]["check"]["inputs"]["lam_um"]) * 1e-6
    ppm = refractivity.standard_group_refractivity(np.array([wavelength]))[0] * 1e6
    printed = float(ENTRIES["A01"]["check"]["output"]["D = N_gL*273.15/1013.25"])
    assert ppm * 273.15 / 1013.25 == pytest.approx(printed, rel=0, abs=5e-5)  # ppm K/hPa: the printed digits


def test_phase_index_a03():
    printed = [float(value) for value in ENTRIES["A03"]["check"]["output"]["n"].split()]
    celsius, kilopascal = np.array([[20, 101.325], [20, 60], [20, 120], [50, 100], [5, 100]]).T
    index = 1 + ciddor.phase_refractivity(np.full(5, 0.633e-6), air(celsius, kilopascal * 10, 0.0), 450e-6)
    np.testing.assert_allclose(index, printed, rtol=0, atol=5e-10)  # the printed digits


def test_group_index_is_derivative_of_phase_index():
    wavelength, step = np.array([0.55e-6, 0.658e-6, 0.85e-6, 0.95e-6]), 1e-10
    moist = air(25, 980, 0.7)
    phase, longer, shorter = (ciddor.phase_refractivity(wavelength + shift, moist) for shift in (0.0, step, -step))
    by_wavelength = (longer - shorter) / (2 * step)
    group = ciddor.group_refractivity(wavelength, moist)
    np.testing.assert_allclose(group, phase - wavelength * by_wavelength, rtol=0, atol=1e-11)  # of differencing


@pytest.mark.parametrize("wavelength", [0.65e-6, 0.85e-6])
def test_closed_formula_keeps_its_promise(wavelength):
    """0.25 ppm from −30 to +45 °C, humid or dry: the resolution's statement, from memory; 0.254 at its hottest, most
    humid corner is what comes out."""
    celsius, humidity = (grid.ravel() for grid in np.meshgrid(np.arange(-30, 46, 5.0), [0.0, 0.5, 1.0]))
    weather = air(celsius, 1013.25, humidity)
    lengths = np.full(len(celsius), wavelength)
    difference = refractivity.group_refractivity(lengths, weather) - ciddor.group_refractivity(lengths, weather)
    np.testing.assert_allclose(difference, 0.0, rtol=0, atol=0.26e-6)


def test_saturation_pressure_against_magnus_formula():
    """WMO-No. 8 (2008), annex 4.B: 6.112 exp(17.62 t / (243.12 + t)) hPa, −45 … 60 °C (from memory)."""
    celsius = np.arange(-10, 46, 5.0)
    magnus = 611.2 * np.exp(17.62 * celsius / (243.12 + celsius))
    np.testing.assert_allclose(saturation_pressure(celsius + 273.15) / magnus, 1.0, rtol=0, atol=4e-3)


def test_enhancement_factor():
    """1.0040 at 20 °C and 101 325 Pa: Davis (1992), table (from memory)."""
    temperature, pressure = np.array([293.15]), np.array([101_325.0])
    factor = vapour_pressure(temperature, pressure, np.array([1.0])) / saturation_pressure(temperature)
    assert factor[0] == pytest.approx(1.0040, rel=0, abs=5e-5)


def test_makers_formula_is_the_closed_formula_linearised():
    """C = N_ref and D = N₀ · 273.15/1013.25: the two corrections differ by products of refractivities."""
    wavelength, weather = np.array([0.85e-6]), air(31.0, 940.0, 0.55)
    reference = 1.0002818
    by_pressure = refractivity.standard_group_refractivity(wavelength) * 1e6 * 273.15 / 1013.25
    maker = maker_factor(np.array([281.8]), by_pressure, weather)
    closed = velocity_factor(np.array([reference]), refractivity.group_refractivity(wavelength, weather))
    np.testing.assert_allclose(maker, closed, rtol=0, atol=2e-8)  # 50 ppm of 280 ppm


def test_a_printed_correction_of_a_maker():
    """281.8 − [0.29065 p/(1 + αt) − 4.126·10⁻⁴ h/(1 + αt) · 10ˣ] ppm, x = 7.5 t/(237.3 + t) + 0.7857, α = 1/273.15,
    as printed in manuals of 850 nm instruments (from memory)."""
    celsius, hectopascal, humidity = 30.0, 900.0, 80.0
    expansion = 1 + celsius / 273.15
    power = 10 ** (7.5 * celsius / (237.3 + celsius) + 0.7857)
    printed = 281.8 - (0.29065 * hectopascal / expansion - 4.126e-4 * humidity / expansion * power)
    weather = air(celsius, hectopascal, humidity / 100)
    ours = maker_factor(np.array([281.8]), np.array([0.29065 * 273.15]), weather)[0] - 1
    assert ours * 1e6 == pytest.approx(printed, rel=0, abs=0.02)  # ppm: another formula for the vapour pressure


def test_a_degree_and_a_hectopascal():
    """Common practice, no source: 1 °C changes a distance by 1 ppm, 3.6 hPa do the same, humidity hardly anything."""
    wavelength = np.full(2, 0.85e-6)
    by_degree = np.diff(refractivity.group_refractivity(wavelength, air([15, 16], 1013.25, 0.6)))
    by_pressure = np.diff(refractivity.group_refractivity(wavelength, air(15, [1013.25, 1016.85], 0.6)))
    assert by_degree[0] == pytest.approx(-1e-6, rel=0, abs=0.1e-6)
    assert by_pressure[0] == pytest.approx(1e-6, rel=0, abs=0.05e-6)

"""A-priori variances: the instrument's model, centring and measured heights, against closed formulas and by lot."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from adjust.arrays import FloatArray, IntArray
from adjust.frames import EllipsoidFrame, Geometry, PlaneFrame
from adjust.observations import (
    Angles,
    Azimuths,
    ControlCoordinates,
    Directions,
    HeightDifferences,
    HorizontalDistances,
    Observations,
    SlopeDistances,
    Vectors,
    ZenithAngles,
)
from adjust.units import ARCSEC
from tests.sightings import observe, precise, scattered_geometry

INSTRUMENT, TARGET, HEIGHT = 0.0004, 0.0007, 0.0005  # m: each axis of the instrument, of a target; a measured height
SIGHTED = (Directions, Angles, Azimuths, SlopeDistances, HorizontalDistances, ZenithAngles)
FRAMES = {
    "plane": (PlaneFrame(earth_curvature=False), np.array([350_000.0, 5_600_000.0, 120.0])),
    "ellipsoid": (EllipsoidFrame("EPSG:25832"), np.array([*np.radians([9.3, 48.7]), 350.0])),
}
PLACES = list(FRAMES)


def net(place: str, rows: int = 30, length: float = 150.0) -> tuple[Geometry, IntArray, np.random.Generator]:
    generator = np.random.default_rng(41)
    return (*scattered_geometry(*FRAMES[place], length, rows, generator), generator)


def variance(rows: Observations, geometry: Geometry) -> FloatArray:
    covariance = rows.covariance(geometry)
    assert covariance.shape == (len(rows), 1, 1)
    return covariance[:, 0, 0]


def set_up(kind: type[Observations], place: str) -> tuple[Observations, Geometry, IntArray]:
    """Rows whose only errors are centring and measured heights."""
    geometry, marks, generator = net(place)
    precision = precise(len(marks), centring=INSTRUMENT, target_centring=TARGET, heights=HEIGHT)
    return observe(kind, geometry, marks, generator, precision), geometry, marks


def plan_distance(geometry: Geometry, start: IntArray, end: IntArray) -> FloatArray:
    return np.hypot(*geometry.sight(start, end).enu[:, :2].T)


@pytest.mark.parametrize("place", PLACES)
def test_centring_of_an_angle(place: str) -> None:
    """Instrument D₃ / (D₁ D₂), targets 1 / D₁ and 1 / D₂, with D₃ from target to target.

    Ghilani & Wolf, *Adjustment Computations*, chapter on error propagation in angles and distances, where σᵢ is radial
    and each axis has σᵢ / √2 (from memory).
    """
    rows, geometry, marks = set_up(Angles, place)
    back, fore, across = (plan_distance(geometry, *marks[:, pair].T) for pair in ([0, 1], [0, 2], [1, 2]))
    expected = (INSTRUMENT * across / (back * fore)) ** 2 + TARGET**2 * (1 / back**2 + 1 / fore**2)
    # relative 2 · 150 m / R of the ellipsoid's curved verticals; sds, so that a part in 10⁴ of a second is meant
    np.testing.assert_allclose(np.sqrt(variance(rows, geometry)), np.sqrt(expected), rtol=2e-4, atol=0)


@pytest.mark.parametrize("place", PLACES)
@pytest.mark.parametrize("kind", [Directions, Azimuths])
def test_centring_of_a_direction(kind: type[Observations], place: str) -> None:
    rows, geometry, marks = set_up(kind, place)
    expected = np.hypot(INSTRUMENT, TARGET) / plan_distance(geometry, marks[:, 0], marks[:, 1])
    np.testing.assert_allclose(np.sqrt(variance(rows, geometry)), expected, rtol=2e-4, atol=0)


@pytest.mark.parametrize("place", PLACES)
def test_centring_and_heights_of_distances_and_zenith_angles(place: str) -> None:
    """Along the sight a horizontal error counts by sin z, a vertical one by cos z; across it the other way, over D."""
    rows, geometry, marks = set_up(SlopeDistances, place)
    enu = geometry.sight(marks[:, 0], marks[:, 1], rows.heights).enu
    slope = np.linalg.norm(enu, axis=1)
    sine, cosine = np.hypot(enu[:, 0], enu[:, 1]) / slope, enu[:, 2] / slope
    centring, heights = INSTRUMENT**2 + TARGET**2, 2 * HEIGHT**2
    expected = np.sqrt(centring * sine**2 + heights * cosine**2)
    np.testing.assert_allclose(np.sqrt(variance(rows, geometry)), expected, rtol=2e-4, atol=0)
    zeniths = replace(set_up(ZenithAngles, place)[0], heights=rows.heights)
    expected = np.sqrt(centring * cosine**2 + heights * sine**2) / slope
    np.testing.assert_allclose(np.sqrt(variance(zeniths, geometry)), expected, rtol=2e-3, atol=0)


@pytest.mark.parametrize("place", PLACES)
def test_heights_are_no_error_of_what_is_horizontal(place: str) -> None:
    """A level distance has the centring along it and nothing else."""
    rows, geometry, _ = set_up(HorizontalDistances, place)
    np.testing.assert_allclose(np.sqrt(variance(rows, geometry)), np.hypot(INSTRUMENT, TARGET), rtol=1e-4, atol=0)


@pytest.mark.parametrize("place", PLACES)
@pytest.mark.parametrize("kind", SIGHTED)
def test_set_up_errors_drawn_by_lot_scatter_as_propagated(kind: type[Observations], place: str) -> None:
    """Instruments and targets are put beside their marks and heights misread; the readings scatter by the variance."""
    draws = 4000
    geometry, marks, generator = net(place, rows=1)
    rows = observe(
        kind, geometry, marks, generator, precise(1, centring=INSTRUMENT, target_centring=TARGET, heights=HEIGHT)
    )
    many = Geometry(
        geometry.frame,
        np.tile(geometry.coordinates, (draws, 1)),
        np.tile(geometry.geoid, draws),
        np.tile(geometry.deflection, (draws, 1)),
        False,
        0.13,
    )
    drawn = rows.take(np.zeros(draws, dtype=np.int64))
    drawn = replace(drawn, marks=rows.marks + 3 * np.arange(draws)[:, None])
    errors = np.zeros_like(many.coordinates)
    for role, name in enumerate(kind.roles):
        sd = INSTRUMENT if name == "at" else TARGET
        errors[drawn.marks[:, role], :2] = generator.normal(0.0, sd, (draws, 2))
    if kind in (SlopeDistances, ZenithAngles):
        drawn = replace(drawn, heights=drawn.heights + generator.normal(0.0, HEIGHT, (draws, 2)))
    scatter = np.std(drawn.predict(many.moved(errors)) - rows.observed, ddof=1)
    expected = np.sqrt(variance(rows, geometry)[0])
    assert scatter == pytest.approx(expected, rel=4 / np.sqrt(2 * draws), abs=0)  # four sds of a sample sd


def test_constant_and_proportional_parts() -> None:
    geometry, marks, generator = net("plane", length=2000.0)
    rows = observe(SlopeDistances, geometry, marks, generator, precise(30, constant=0.001, proportional=1.5e-6))
    expected = np.hypot(0.001, 1.5e-6 * rows.observed[:, 0])
    np.testing.assert_allclose(np.sqrt(variance(rows, geometry)), expected, rtol=0, atol=1e-15)  # m


@pytest.mark.parametrize("kind", [*SIGHTED, HeightDifferences])
def test_the_sd_of_the_row_wins_over_the_instrument(kind: type[Observations]) -> None:
    geometry, marks, generator = net("plane")
    precision = precise(30, constant=1e-3, centring=INSTRUMENT, target_centring=TARGET, heights=HEIGHT)
    precision.stated[::2] = 2 * ARCSEC
    own = variance(observe(kind, geometry, marks, generator, precision), geometry)
    np.testing.assert_array_equal(own[::2], (2 * ARCSEC) ** 2)
    assert (own[1::2] >= 1e-6).all()


def test_levelling_is_not_centred() -> None:
    geometry, marks, generator = net("plane")
    precision = precise(30, constant=0.0007, centring=INSTRUMENT, target_centring=TARGET, heights=HEIGHT)
    rows = observe(HeightDifferences, geometry, marks, generator, precision)
    np.testing.assert_array_equal(variance(rows, geometry), 0.0007**2)


def test_vectors_and_control_carry_their_own() -> None:
    geometry, marks, generator = net("ellipsoid")
    vectors = observe(Vectors, geometry, marks, generator)
    np.testing.assert_array_equal(vectors.covariance(geometry), vectors.covariances)
    control = observe(ControlCoordinates, geometry, marks, generator)
    np.testing.assert_array_equal(variance(control, geometry), control.sd**2)

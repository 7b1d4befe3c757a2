"""How exact the ellipsoid frame is: predictions in double precision against the same equations with forty digits.

The table of docs/methods-observations.md states these bounds by range of input.
"""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

from adjust.arrays import FloatArray
from adjust.frames import EllipsoidFrame
from adjust.frames.ellipsoid_sight import EllipsoidSight

FRAME = EllipsoidFrame("EPSG:4979")
ROWS = 25
LINES = [1.0, 30.0, 1_000.0, 30_000.0, 100_000.0]
LATITUDES = [-89.9, -45.0, 0.0, 60.0, 89.9]
WITHIN = 4e-9  # m: across and along the sight, whatever its length
DIGITS = 40


def exact_position(place: FloatArray) -> mpmath.matrix:
    longitude, latitude, height = map(mpmath.mpf, place.tolist())
    flattening = mpmath.mpf(FRAME.ellipsoid.flattening)
    square = flattening * (2 - flattening)
    radius = mpmath.mpf(FRAME.ellipsoid.semi_major) / mpmath.sqrt(1 - square * mpmath.sin(latitude) ** 2)
    from_axis = (radius + height) * mpmath.cos(latitude)
    along_axis = (radius * (1 - square) + height) * mpmath.sin(latitude)
    return mpmath.matrix([from_axis * mpmath.cos(longitude), from_axis * mpmath.sin(longitude), along_axis])


def exact_sight(start: FloatArray, end: FloatArray) -> list[float]:
    """East, north, up, rounded once at the end."""
    line = exact_position(end) - exact_position(start)
    longitude, latitude = mpmath.mpf(float(start[0])), mpmath.mpf(float(start[1]))
    sine, cosine = mpmath.sin(latitude), mpmath.cos(latitude)
    outward = line[0] * mpmath.cos(longitude) + line[1] * mpmath.sin(longitude)
    east = line[1] * mpmath.cos(longitude) - line[0] * mpmath.sin(longitude)
    return [float(east), float(line[2] * cosine - outward * sine), float(line[2] * sine + outward * cosine)]


def lines(latitude: float, length: float) -> FloatArray:
    """Stations and targets (2 ROWS, 3) all around the Earth, from the sea floor to the highest peaks."""
    generator = np.random.default_rng(51)
    stations = np.column_stack(
        [
            generator.uniform(-np.pi, np.pi, ROWS),
            np.full(ROWS, np.radians(latitude)),
            generator.uniform(-1e4, 9e3, ROWS),
        ]
    )
    direction = generator.standard_normal((ROWS, 3)) * [1, 1, 0.2]
    steps = length * direction / np.linalg.norm(direction, axis=1, keepdims=True)
    return np.vstack([stations, FRAME.moved(stations, steps)])


@pytest.mark.parametrize("latitude", LATITUDES)
@pytest.mark.parametrize("length", LINES)
def test_sights_are_exact_to_nanometres(length: float, latitude: float) -> None:
    places = lines(latitude, length)
    at, to = np.arange(ROWS), np.arange(ROWS) + ROWS
    enu = FRAME.sight(places, at, to, np.zeros((ROWS, 2)), None).enu
    with mpmath.workdps(DIGITS):
        expected = np.array([exact_sight(places[a], places[b]) for a, b in zip(at, to, strict=True)])
    np.testing.assert_allclose(enu, expected, rtol=0, atol=WITHIN)


@pytest.mark.parametrize("distance", [1.0, 100.0, 10_000.0])
def test_derivatives_of_a_slope_stay_exact_near_the_pole(distance: float) -> None:
    """East turns by 1 / distance from the pole, yet a slope does not see the axes turn: what is left is rounding."""
    place = FRAME.moved(np.array([[0.3, np.pi / 2, 100.0]]), np.array([[0.0, -distance, 0.0]]))
    places = np.vstack([place, FRAME.moved(place, np.array([[300.0, 400.0, 5.0]]))])
    sight = FRAME.sight(places, np.array([0]), np.array([1]), np.zeros((1, 2)), None)
    assert isinstance(sight, EllipsoidSight)
    unit = sight.enu / np.linalg.norm(sight.enu)
    np.testing.assert_allclose(sight.differentiate(unit)[0, 0], -unit[0], rtol=0, atol=1e-12)

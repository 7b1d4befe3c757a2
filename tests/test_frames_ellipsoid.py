"""The ellipsoid frame against PROJ and against its own definitions, everywhere on Earth."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj import Transformer

from adjust.frames import EllipsoidFrame
from adjust.frames.reference_ellipsoid import ReferenceEllipsoid

FRAME = EllipsoidFrame("EPSG:4326")
ROUNDING = 5e-9  # m: a double holds geocentric coordinates of 6,400 km to 1 nm, and a few operations follow
AT, TO = np.array([0]), np.array([1])
NO_HEIGHTS = np.zeros((1, 2))

angles = st.floats(-180.0, 180.0)
latitudes = st.one_of(st.floats(-90.0, 90.0), st.sampled_from([-90.0, 0.0, 90.0]))
heights = st.floats(-11_000.0, 9_000.0)
lengths = st.floats(-50_000.0, 50_000.0)
places = st.tuples(angles, latitudes, heights).map(lambda place: np.array([[*np.radians(place[:2]), place[2]]]))
midlatitude_places = st.tuples(angles, st.floats(-89.0, 89.0), heights).map(
    lambda place: np.array([[*np.radians(place[:2]), place[2]]])
)
steps = st.tuples(lengths, lengths, st.floats(-3_000.0, 3_000.0)).map(lambda step: np.array([step]))


def neighbours(place: np.ndarray, step: np.ndarray) -> np.ndarray:
    """The place and the point a step east, north, up of it."""
    return np.vstack([place, FRAME.moved(place, step)])


@pytest.mark.parametrize("name", ["GRS80", "bessel", "clrk66", "airy"])
def test_geocentric_coordinates_are_those_of_proj(name: str) -> None:
    generator = np.random.default_rng(7)
    places = np.column_stack(
        [
            generator.uniform(-np.pi, np.pi, 2000),
            np.arcsin(generator.uniform(-1, 1, 2000)),
            generator.uniform(-11_000, 9_000, 2000),
        ]
    )
    frame = EllipsoidFrame(f"+proj=longlat +ellps={name} +type=crs")
    cartesian = Transformer.from_pipeline(f"+proj=cart +ellps={name}")
    expected = np.column_stack(cartesian.transform(*places.T, radians=True))
    np.testing.assert_allclose(frame.geocentric(places), expected, rtol=0, atol=ROUNDING)
    back = np.column_stack(cartesian.transform(*expected.T, radians=True, direction="INVERSE"))
    # m: PROJ takes one step of the latitude iteration where we take two
    np.testing.assert_allclose(frame.displacement(back, frame.from_geocentric(expected)), 0, rtol=0, atol=2e-6)


@given(place=places)
def test_geodetic_to_geocentric_and_back(place: np.ndarray) -> None:
    geocentric = FRAME.geocentric(place)
    back = FRAME.from_geocentric(geocentric)
    np.testing.assert_allclose(FRAME.geocentric(back), geocentric, rtol=0, atol=ROUNDING)
    assert back[0, 2] == pytest.approx(place[0, 2], rel=0, abs=ROUNDING)
    assert back[0, 1] == pytest.approx(place[0, 1], rel=0, abs=1e-15)  # rad: 6 nm


@pytest.mark.parametrize("height", [-1e6, 0.0, 1e6, 4e7])
@pytest.mark.parametrize("flattening", [0.0, 1 / 298.257, 1 / 293.0])
def test_two_steps_of_the_latitude_iteration_suffice(height: float, flattening: float) -> None:
    ellipsoid = ReferenceEllipsoid(6_378_137.0, flattening)
    latitude = np.radians(np.linspace(-90, 90, 721))
    places = np.column_stack([np.zeros(721), latitude, np.full(721, height)])
    np.testing.assert_allclose(ellipsoid.geodetic(ellipsoid.geocentric(places))[:, 1], latitude, rtol=0, atol=1e-15)


@given(place=midlatitude_places, step=steps)
def test_a_sight_is_the_topocentric_vector_of_proj(place: np.ndarray, step: np.ndarray) -> None:
    ends = neighbours(place, step)
    sight = FRAME.sight(ends, AT, TO, NO_HEIGHTS, None)
    x, y, z = FRAME.geocentric(place)[0].tolist()
    topocentric = Transformer.from_pipeline(f"+proj=topocentric +ellps=WGS84 +X_0={x!r} +Y_0={y!r} +Z_0={z!r}")
    expected = topocentric.transform(*FRAME.geocentric(ends)[1])
    np.testing.assert_allclose(
        sight.enu[0], expected, rtol=0, atol=1e-8 + 2e-13 * np.abs(step).max()
    )  # m: PROJ's latitude
    np.testing.assert_allclose(sight.enu, step, rtol=0, atol=2e-8)


@given(place=places, step=steps, above=st.tuples(st.floats(0, 3), st.floats(0, 30)))
def test_slope_of_a_sight_is_the_geocentric_distance_of_its_ends(place, step, above) -> None:
    ends = neighbours(place, step)
    sight = FRAME.sight(ends, AT, TO, np.array([above]), None)
    ends[:, 2] += above
    expected = np.linalg.norm(np.diff(FRAME.geocentric(ends), axis=0))
    assert np.linalg.norm(sight.enu) == pytest.approx(expected, rel=0, abs=ROUNDING)


@given(place=midlatitude_places, step=steps, deflection=st.tuples(st.floats(-3e-4, 3e-4), st.floats(-3e-4, 3e-4)))
def test_deflection_turns_the_axes_to_astronomic_latitude_and_longitude(place, step, deflection) -> None:
    """Axes of R(Φ, Λ) written out from the definition; the sight is the same vector."""
    ends = neighbours(place, step)
    turned = FRAME.sight(ends, AT, TO, NO_HEIGHTS, np.array([deflection, (0.0, 0.0)])).enu[0]
    north, east = deflection
    latitude, longitude = place[0, 1] + north, place[0, 0] + east / np.cos(place[0, 1])
    up = np.array([np.cos(latitude) * np.cos(longitude), np.cos(latitude) * np.sin(longitude), np.sin(latitude)])
    east_axis = np.cross([0.0, 0.0, 1.0], up) / np.cos(latitude)
    vector = np.diff(FRAME.geocentric(ends), axis=0)[0]
    expected = [east_axis @ vector, np.cross(up, east_axis) @ vector, up @ vector]
    np.testing.assert_allclose(turned, expected, rtol=0, atol=2e-8)  # m: 1/cos φ magnifies rounding at 89°


def test_deflection_north_lowers_a_target_in_the_north() -> None:
    """The zenith leans north: what stands north comes nearer to it, what stands east does not move."""
    ends = np.vstack([neighbours(np.zeros((1, 3)), np.array([[0.0, 1000.0, 0.0]])), np.zeros((1, 3))])
    ends[2] = FRAME.moved(ends[:1], np.array([[1000.0, 0.0, 0.0]]))[0]
    at, to = np.array([0, 0]), np.array([1, 2])
    deflection = np.array([[1e-4, 0.0], [0.0, 0.0], [0.0, 0.0]])
    up = FRAME.sight(ends, at, to, np.zeros((2, 2)), deflection).enu[:, 2]
    np.testing.assert_allclose(up, [0.1, 0.0], rtol=0, atol=1e-6)  # m


@given(place=places, step=steps)
def test_a_move_and_the_displacement_undo_each_other(place: np.ndarray, step: np.ndarray) -> None:
    np.testing.assert_allclose(FRAME.displacement(place, FRAME.moved(place, step)), step, rtol=0, atol=2 * ROUNDING)


@given(place=places, step=steps)
def test_level_distance_is_the_chord_at_the_mean_height(place: np.ndarray, step: np.ndarray) -> None:
    ends = neighbours(place, step)
    distance, _ = FRAME.level_distance(ends, AT, TO)
    ends[:, 2] = ends[:, 2].mean()
    expected = np.linalg.norm(np.diff(FRAME.geocentric(ends), axis=0))
    assert distance[0] == pytest.approx(expected, rel=0, abs=ROUNDING)


def test_level_distance_grows_with_height_by_the_radius() -> None:
    ends = neighbours(np.radians([[10.0, 0.0, 0.0]]), np.array([[1000.0, 0.0, 0.0]]))
    low, _ = FRAME.level_distance(ends, AT, TO)
    ends[:, 2] += 1000.0
    high, _ = FRAME.level_distance(ends, AT, TO)
    assert high[0] / low[0] == pytest.approx(1 + 1000.0 / 6_378_137.0, rel=0, abs=1e-11)


@settings(max_examples=30)
@given(latitude=st.floats(-85, 85), step=steps)
def test_lines_across_the_antimeridian_are_like_those_across_greenwich(latitude: float, step: np.ndarray) -> None:
    predictions = []
    for meridian in (0.0, 180.0):
        ends = neighbours(np.array([[np.radians(meridian), np.radians(latitude), 100.0]]), step)
        sight, level = FRAME.sight(ends, AT, TO, NO_HEIGHTS, None), FRAME.level_distance(ends, AT, TO)
        predictions.append(np.concatenate([sight.enu[0], level[0]]))
        assert abs(ends[1, 0]) <= np.pi
    np.testing.assert_allclose(predictions[0], predictions[1], rtol=0, atol=2 * ROUNDING)


class TestMissingCoordinates:
    """Marks that are only levelled have no plan, marks of a plan job may have no height."""

    COORDINATES = np.array([[0.1, 0.8, 500.0], [np.nan, np.nan, 20.0], [0.1001, 0.8001, np.nan], [np.nan] * 3])
    STEP = np.array([[1.0, 2.0, 3.0]] * 4)

    def test_moved(self) -> None:
        moved = FRAME.moved(self.COORDINATES, self.STEP)
        np.testing.assert_array_equal(np.isnan(moved), np.isnan(self.COORDINATES))
        assert moved[1, 2] == 23.0
        alone = FRAME.moved(self.COORDINATES[:1], self.STEP[:1])
        np.testing.assert_array_equal(moved[0], alone[0])

    def test_a_correction_that_is_not_sought_does_not_spread(self) -> None:
        moved = FRAME.moved(self.COORDINATES[:1], np.array([[1.0, 2.0, np.nan]]))
        assert np.isfinite(moved).all()

    def test_displacement(self) -> None:
        moved = FRAME.moved(self.COORDINATES, self.STEP)
        displacement = FRAME.displacement(self.COORDINATES, moved)
        assert displacement[1, 2] == 3.0
        np.testing.assert_allclose(displacement[0], [1, 2, 3], rtol=0, atol=ROUNDING)
        np.testing.assert_allclose(displacement[2, :2], [1, 2], rtol=0, atol=1e-6)  # m: heights of 0 stood in
        np.testing.assert_array_equal(np.isnan(displacement), np.isnan(self.COORDINATES))

    def test_everything_passes_quietly(self) -> None:
        frame = EllipsoidFrame("EPSG:25832")
        rows = np.array([0, 0, 1]), np.array([2, 1, 3])
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            sight = frame.sight(self.COORDINATES, *rows, np.zeros((3, 2)), np.zeros((4, 2)))
            assert np.isnan(sight.enu[1:]).all()
            sight.differentiate(np.ones((3, 3)))
            frame.level_distance(self.COORDINATES, *rows)
            frame.displacement(self.COORDINATES, self.COORDINATES)
            frame.moved(self.COORDINATES, self.STEP)
            rotation, grid = frame.grid_rotation(self.COORDINATES), frame.grid_coordinates(self.COORDINATES)
        np.testing.assert_array_equal(np.isnan(rotation), [False, True, False, True])
        np.testing.assert_array_equal(np.isnan(grid[:, 0]), [False, True, False, True])

    def test_no_marks_at_all(self) -> None:
        frame, nobody = EllipsoidFrame("EPSG:25832"), np.empty((0, 3))
        rows = np.empty(0, dtype=np.int64)
        assert frame.sight(nobody, rows, rows, np.empty((0, 2)), None).enu.shape == (0, 3)
        assert frame.grid_rotation(nobody).shape == (0,)
        assert frame.grid_coordinates(nobody).shape == (0, 2)
        assert frame.moved(nobody, nobody).shape == (0, 3)

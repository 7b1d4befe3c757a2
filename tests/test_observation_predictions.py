"""What each kind predicts: the equations of the methods page, written out anew, with PROJ doing the geodesy."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import Proj, Transformer

from adjust.arrays import FloatArray
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
from tests.sightings import observe, scattered_geometry

RADIUS = 6_371_000.0  # m: as the methods page fixes it
ROWS = 40
PLANE_ORIGIN = np.array([350_000.0, 5_600_000.0, 120.0])
PLACE = np.array([*np.radians([9.3, 48.7]), 350.0])
ROUNDING = 1e-8  # m: geocentric coordinates through PROJ and back

FRAME = EllipsoidFrame("EPSG:25832")
cartesian = Transformer.from_pipeline("+proj=cart +ellps=GRS80")


def predicted(rows: Observations, geometry: Geometry) -> FloatArray:
    return rows.predict(geometry)[:, 0]


def wrapped(angle: FloatArray) -> FloatArray:
    return angle - 2 * np.pi * np.round(angle / (2 * np.pi))


def geocentric(places: FloatArray) -> FloatArray:
    return np.column_stack(cartesian.transform(*places.T, radians=True))


def plumb_components(geometry: Geometry, rows: Observations, *, plumb: bool) -> FloatArray:
    """East, north, up (rows, 3) from instrument to target by PROJ's topocentric conversion, one station at a time."""
    spatial = geometry.spatial.copy()
    heights = getattr(rows, "heights", np.zeros((len(rows), 2)))
    at, to = rows.marks[:, 0], rows.marks[:, 1]
    ends = [
        geocentric(spatial[mark] + np.column_stack([heights[:, [k]] * [0, 0, 1]])) for k, mark in enumerate((at, to))
    ]
    components = []
    for station, start, end in zip(at, *ends, strict=True):
        longitude, latitude, height = spatial[station]
        north, east = geometry.deflection[station] if plumb else (0.0, 0.0)
        origin = [longitude + east / np.cos(latitude), latitude + north]
        x, y, z = geocentric(np.array([[*origin, height]]))[0]
        turned = Transformer.from_pipeline(
            f"+proj=topocentric +ellps=GRS80 +X_0={float(x)!r} +Y_0={float(y)!r} +Z_0={float(z)!r}"
        )
        components.append(turned.transform(*(np.array([x, y, z]) + end - start)))
    return np.array(components)


class TestPlane:
    @pytest.fixture(params=[True, False], ids=["curved", "flat"])
    def net(self, request: pytest.FixtureRequest):
        generator = np.random.default_rng(31)
        return (*scattered_geometry(PlaneFrame(request.param), PLANE_ORIGIN, 3000.0, ROWS, generator), generator)

    def test_directions_azimuths_and_angles(self, net) -> None:
        geometry, marks, generator = net
        difference = geometry.coordinates[marks[:, 1:]] - geometry.coordinates[marks[:, :1]]
        azimuths = np.arctan2(difference[:, :, 0], difference[:, :, 1])
        for kind in (Directions, Azimuths):
            np.testing.assert_array_equal(
                predicted(observe(kind, geometry, marks, generator), geometry), azimuths[:, 0]
            )
        angles = predicted(observe(Angles, geometry, marks, generator), geometry)
        np.testing.assert_allclose(wrapped(angles - azimuths[:, 1] + azimuths[:, 0]), 0, rtol=0, atol=1e-15)  # rad

    def test_distances(self, net) -> None:
        geometry, marks, generator = net
        slopes = observe(SlopeDistances, geometry, marks, generator)
        ends = geometry.coordinates[marks[:, :2]].copy()
        ends[:, :, 2] += slopes.heights
        expected = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1)
        np.testing.assert_allclose(predicted(slopes, geometry), expected, rtol=0, atol=1e-11)  # m
        level = predicted(observe(HorizontalDistances, geometry, marks, generator), geometry)
        np.testing.assert_allclose(level, np.hypot(*(ends[:, 1] - ends[:, 0])[:, :2].T), rtol=0, atol=1e-11)  # m

    def test_zenith_angles(self, net) -> None:
        geometry, marks, generator = net
        zeniths = observe(ZenithAngles, geometry, marks, generator)
        difference = geometry.coordinates[marks[:, 1]] - geometry.coordinates[marks[:, 0]]
        level = np.hypot(difference[:, 0], difference[:, 1])
        rise = difference[:, 2] + zeniths.heights[:, 1] - zeniths.heights[:, 0]
        if geometry.frame.earth_curvature:
            rise -= (1 - geometry.refraction) * level**2 / (2 * RADIUS)
        np.testing.assert_allclose(predicted(zeniths, geometry), np.arctan2(level, rise), rtol=0, atol=1e-15)  # rad

    def test_height_differences(self, net) -> None:
        geometry, marks, generator = net
        geometry = replace(geometry, geoid=np.zeros(len(geometry.coordinates)))
        rise = geometry.coordinates[marks[:, 1], 2] - geometry.coordinates[marks[:, 0], 2]
        np.testing.assert_array_equal(predicted(observe(HeightDifferences, geometry, marks, generator), geometry), rise)

    def test_control_in_its_own_axes(self, net) -> None:
        geometry, marks, generator = net
        rows = observe(ControlCoordinates, geometry, marks, generator)
        shift = geometry.coordinates[marks[:, 0]] - rows.given
        expected = shift[np.arange(ROWS), rows.component]
        np.testing.assert_allclose(
            predicted(rows, geometry), expected, rtol=0, atol=1e-9
        )  # m: last digit of a northing


class TestEllipsoid:
    @pytest.fixture(params=[True, False], ids=["orthometric", "ellipsoidal"])
    def net(self, request: pytest.FixtureRequest):
        generator = np.random.default_rng(32)
        orthometric = request.param
        return (*scattered_geometry(FRAME, PLACE, 3000.0, ROWS, generator, orthometric=orthometric), generator)

    @pytest.mark.parametrize(("kind", "plumb"), [(Directions, True), (Azimuths, False)])
    def test_directions_follow_the_plumb_line_and_azimuths_the_normal(self, net, kind, plumb: bool) -> None:
        geometry, marks, generator = net
        rows = observe(kind, geometry, marks, generator)
        east, north, _ = plumb_components(geometry, rows, plumb=plumb).T
        across = np.sin(predicted(rows, geometry) - np.arctan2(east, north)) * np.hypot(east, north)
        np.testing.assert_allclose(across, 0, rtol=0, atol=2 * ROUNDING)

    def test_angles_are_differences_of_directions(self, net) -> None:
        geometry, marks, generator = net
        back, fore = (observe(Directions, geometry, marks[:, columns], generator) for columns in ([0, 1], [0, 2]))
        angles = predicted(observe(Angles, geometry, marks, generator), geometry)
        np.testing.assert_array_equal(angles, predicted(fore, geometry) - predicted(back, geometry))

    def test_slope_distances(self, net) -> None:
        geometry, marks, generator = net
        rows = observe(SlopeDistances, geometry, marks, generator)
        expected = np.linalg.norm(plumb_components(geometry, rows, plumb=False), axis=1)
        np.testing.assert_allclose(predicted(rows, geometry), expected, rtol=0, atol=ROUNDING)

    def test_zenith_angles_with_refraction(self, net) -> None:
        geometry, marks, generator = net
        rows = observe(ZenithAngles, geometry, marks, generator)
        components = plumb_components(geometry, rows, plumb=True)
        slope = np.linalg.norm(components, axis=1)
        expected = np.arccos(components[:, 2] / slope) - geometry.refraction * slope / (2 * RADIUS)
        np.testing.assert_allclose((predicted(rows, geometry) - expected) * slope, 0, rtol=0, atol=2 * ROUNDING)

    def test_horizontal_distances(self, net) -> None:
        geometry, marks, generator = net
        ends = geometry.spatial[marks[:, :2]].copy()
        ends[:, :, 2] = ends[:, :, 2].mean(axis=1, keepdims=True)
        expected = np.linalg.norm(geocentric(ends[:, 1]) - geocentric(ends[:, 0]), axis=1)
        rows = observe(HorizontalDistances, geometry, marks, generator)
        np.testing.assert_allclose(predicted(rows, geometry), expected, rtol=0, atol=ROUNDING)

    def test_height_differences_are_orthometric(self, net) -> None:
        geometry, marks, generator = net
        height = geometry.spatial[:, 2] - geometry.geoid
        rows = observe(HeightDifferences, geometry, marks, generator)
        expected = height[marks[:, 1]] - height[marks[:, 0]]
        np.testing.assert_allclose(predicted(rows, geometry), expected, rtol=0, atol=1e-12)  # m

    def test_vectors(self, net) -> None:
        geometry, marks, generator = net
        expected = geocentric(geometry.spatial[marks[:, 1]]) - geocentric(geometry.spatial[marks[:, 0]])
        rows = observe(Vectors, geometry, marks, generator)
        np.testing.assert_allclose(rows.predict(geometry), expected, rtol=0, atol=ROUNDING)

    def test_control_counts_along_the_grid(self, net) -> None:
        """Grid coordinates change by PROJ's point scale times what the row says, carried down to the ellipsoid."""
        geometry, marks, generator = net
        rows = observe(ControlCoordinates, geometry, marks, generator)
        present = geometry.coordinates[marks[:, 0]]
        moved = np.column_stack([FRAME.grid_coordinates(present) - FRAME.grid_coordinates(rows.given), np.zeros(ROWS)])
        moved[:, 2] = present[:, 2] - rows.given[:, 2]
        point_scale = Proj(FRAME.crs).get_factors(*np.degrees(present[:, :2]).T).meridional_scale
        down = RADIUS / (RADIUS + geometry.spatial[marks[:, 0], 2])
        scale = np.where(rows.component == 2, 1.0, point_scale * down)
        expected = moved[np.arange(ROWS), rows.component]
        np.testing.assert_allclose(predicted(rows, geometry) * scale, expected, rtol=0, atol=1e-8)  # m: 10⁻⁷ of 6 cm


def test_control_of_marks_without_plan_or_without_height() -> None:
    given = np.array([[np.nan, np.nan, 20.0], [0.16, 0.85, np.nan], [0.16, 0.85, np.nan]])
    present = np.array([[np.nan, np.nan, 20.01], [0.16, 0.85, 400.0], [0.16, 0.85, 400.0]])
    geometry = Geometry(FRAME, present, np.full(3, 47.0), np.zeros((3, 2)), True, 0.13)
    generator = np.random.default_rng(33)
    rows = observe(ControlCoordinates, geometry, np.arange(3)[:, None], generator)
    rows = replace(rows, given=given, component=np.array([2, 0, 1]))
    np.testing.assert_allclose(predicted(rows, geometry), [0.01, 0.0, 0.0], rtol=0, atol=1e-8)  # m
    assert np.isfinite(rows.differentiate(geometry)).all()


def test_refraction_lifts_a_target_and_curvature_sinks_it() -> None:
    generator = np.random.default_rng(34)
    for frame, origin in ((PlaneFrame(), PLANE_ORIGIN), (FRAME, PLACE)):
        geometry, marks = scattered_geometry(frame, origin, 3000.0, ROWS, generator)
        rows = observe(ZenithAngles, geometry, marks, generator)
        straight, bent = (predicted(rows, replace(geometry, refraction=k)) for k in (0.0, 0.13))
        assert (bent < straight).all()
    plane, marks = scattered_geometry(PlaneFrame(), PLANE_ORIGIN, 3000.0, ROWS, generator)
    rows = observe(ZenithAngles, plane, marks, generator)
    assert (predicted(rows, plane) > predicted(rows, replace(plane, frame=PlaneFrame(False)))).all()


def test_plane_zenith_angles_with_curvature_are_those_of_the_ellipsoid() -> None:
    """Two kilometres of the same terrain in both frames: what the plane frame calls curvature is the ellipsoid's.

    The plane takes R for the local radius (0.3 % of the 32″ of curvature here) and carries heights along parallel
    verticals (1 in 6,000 of the rise), which leaves less than half a second.
    """
    offsets = np.array([[0.0, 0.0, 0.0], [1200.0, 1600.0, 40.0]])
    flat = Geometry(PlaneFrame(), offsets.copy(), np.zeros(2), np.zeros((2, 2)), False, 0.13)
    place = FRAME.moved(PLACE[None], np.array([[1200.0, 1600.0, 0.0]]))[0]
    curved_marks = np.vstack([PLACE, [*place[:2], PLACE[2] + 40.0]])
    curved = Geometry(FRAME, curved_marks, np.zeros(2), np.zeros((2, 2)), False, 0.13)
    generator = np.random.default_rng(35)
    rows = observe(ZenithAngles, flat, np.array([[0, 1]]), generator)
    difference = predicted(rows, flat) - predicted(rows, curved)
    assert abs(difference[0]) < np.radians(0.5 / 3600)
    assert abs(predicted(rows, flat) - predicted(rows, replace(flat, frame=PlaneFrame(False))))[0] > np.radians(
        25 / 3600
    )


@given(
    shift=st.tuples(*[st.floats(-1e5, 1e5)] * 2, st.floats(-1e3, 1e3)),
    turn=st.floats(-np.pi, np.pi),
)
def test_shifting_and_turning_a_plane_network_changes_nothing_but_azimuths(shift, turn: float) -> None:
    """Turned clockwise by an angle, azimuths and the directions before orientation grow by it."""
    generator = np.random.default_rng(36)
    geometry, marks = scattered_geometry(PlaneFrame(), np.zeros(3), 800.0, ROWS, generator)
    sine, cosine = np.sin(turn), np.cos(turn)
    clockwise = np.array([[cosine, sine, 0.0], [-sine, cosine, 0.0], [0.0, 0.0, 1.0]])
    turned = replace(geometry, coordinates=geometry.coordinates @ clockwise.T + np.array(shift))
    for kind in (Directions, Azimuths, Angles, SlopeDistances, HorizontalDistances, ZenithAngles, HeightDifferences):
        rows = observe(kind, geometry, marks, generator)
        change = predicted(rows, turned) - predicted(rows, geometry)
        if kind in (Directions, Azimuths):
            change = change - turn
        change = wrapped(change) if kind.unit == "rad" else change
        np.testing.assert_allclose(change, 0, rtol=0, atol=1e-12 if kind.unit == "rad" else 1e-9)  # rad, m


@given(turn=st.floats(-np.pi, np.pi))
def test_turning_the_earth_changes_nothing_but_vectors(turn: float) -> None:
    """Another longitude is another Greenwich: only what is counted in geocentric axes sees it."""
    generator = np.random.default_rng(37)
    geometry, marks = scattered_geometry(FRAME, PLACE, 800.0, ROWS, generator)
    turned = replace(geometry, coordinates=geometry.coordinates + np.array([turn, 0.0, 0.0]))
    kinds = (Directions, Azimuths, Angles, SlopeDistances, HorizontalDistances, ZenithAngles, HeightDifferences)
    for kind in kinds:
        rows = observe(kind, geometry, marks, generator)
        change = predicted(rows, turned) - predicted(rows, geometry)
        change = wrapped(change) if kind.unit == "rad" else change
        np.testing.assert_allclose(change, 0, rtol=0, atol=1e-10 if kind.unit == "rad" else 1e-8)  # rad, m
    vectors = observe(Vectors, geometry, marks, generator)
    lengths = [np.linalg.norm(vectors.predict(where), axis=1) for where in (geometry, turned)]
    np.testing.assert_allclose(lengths[0], lengths[1], rtol=0, atol=1e-8)  # m

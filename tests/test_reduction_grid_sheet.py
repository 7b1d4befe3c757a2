"""The grid sheet: the published line Flinders Peak – Buninyong, other projections, and what must hold on any map."""

import json
from pathlib import Path

import numpy as np
import pytest
from pyproj import Geod

from adjust.frames import EllipsoidFrame
from adjust.reductions.grid_sheet import line_factors, mark_factors
from adjust.units import ARCSEC, parse_dms

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "reductions.json").read_text("utf-8"))}
"""Each entry names its source."""
FRAME = EllipsoidFrame("EPSG:28355")
FALSE_EASTING = 500_000.0


def angle(text):
    return np.radians(parse_dms(text))


def position(latitude_longitude, height):
    latitude, longitude = latitude_longitude.split(", ")[:2]
    return [angle(longitude), angle(latitude), height]


def ends():
    given = ENTRIES["B01"]["check"]["inputs"]
    return np.array([position(given["Flinders"], 350.948), position(given["Buninyong"], 749.855)])


def line():
    return line_factors(FRAME, ends(), np.array([[0, 1]]))


def test_grid_coordinates_b01():
    printed = ENTRIES["B01"]["check"]["output"]
    expected = [[float(part) for part in printed[name].split()[1::2]] for name in ("Flinders", "Buninyong")]
    np.testing.assert_allclose(mark_factors(FRAME, ends()).grid, expected, rtol=0, atol=5e-4)  # m: the printed digits


@pytest.mark.parametrize("mark", ["Flinders", "Buninyong"])
def test_point_scale_and_convergence_b02(mark):
    """The manual adds γ to an azimuth; ours is the azimuth of grid north, hence the opposite sign."""
    row = ["Flinders", "Buninyong"].index(mark)
    scale, gamma = ENTRIES["B02"]["check"]["output"][mark].removeprefix("k ").split(", gamma ")
    factors = mark_factors(FRAME, ends())
    assert factors.point_scale[row] == pytest.approx(float(scale), rel=0, abs=5e-9)  # the printed digits
    assert -factors.convergence[row] == pytest.approx(angle(gamma), rel=0, abs=0.005 * ARCSEC)
    assert abs(factors.largest_shear[row]) < 1e-7  # a conformal map


def test_line_scale_and_lengths_b03():
    printed = ENTRIES["B03"]["check"]["output"]
    factors = line()
    assert factors.line_scale[0] == pytest.approx(float(printed["K"]), rel=0, abs=5e-9)
    assert factors.ellipsoid[0] == pytest.approx(float(printed["ellipsoidal"][:-2]), rel=0, abs=5e-4)  # m: printed
    assert factors.grid[0] == pytest.approx(float(printed["grid (plane)"][:-2]), rel=0, abs=5e-4)  # m: printed


def arc_to_chord_series(grid, mean_radius_squared):
    """δ₁ and δ₂ of the manual's series for the transverse Mercator projection (B04), radians."""
    first, second = grid[:, 0] - FALSE_EASTING
    north = grid[1, 1] - grid[0, 1]
    sums = second + 2 * first, 2 * second + first
    corrections = [-north * s / (6 * mean_radius_squared) * (1 - s**2 / (27 * mean_radius_squared)) for s in sums]
    return corrections[0], -corrections[1]


def test_arc_to_chord_b04():
    """The printed figures are those of the series; its own last terms are worth 0.01″, which is how far geometry is."""
    printed = ENTRIES["B04"]["check"]["output"]
    latitude = np.array([ends()[:, 1].mean()])
    radii = FRAME.ellipsoid.meridian_radius(latitude) * FRAME.ellipsoid.prime_vertical_radius(latitude)
    series = arc_to_chord_series(mark_factors(FRAME, ends()).grid, radii[0] * 0.9996**2)
    factors = line()
    found = factors.arc_to_chord[0], factors.arc_to_chord_back[0]
    for by_series, by_geometry, key in zip(series, found, ("d1", "d2"), strict=True):
        assert by_series / ARCSEC == pytest.approx(float(printed[key].split()[0]), rel=0, abs=0.006)  # arcsec: printed
        assert by_geometry / ARCSEC == pytest.approx(by_series / ARCSEC, rel=0, abs=0.01)  # arcsec: of the series


def test_azimuth_to_plane_bearing_b05():
    """Grid bearings are printed 0.01″ off their own sum of azimuth and γ; recomputed 305 17 01.726, 125 17 41.851."""
    printed = ENTRIES["B05"]["check"]["output"]
    there, back = line(), line_factors(FRAME, ends(), np.array([[1, 0]]))
    for key, values, tolerance in (
        ("azimuths", (there.azimuth, back.azimuth), 0.005),
        ("grid bearings", (there.grid_bearing, back.grid_bearing), 0.01),
        ("plane bearings", (there.plane_bearing, back.plane_bearing), 0.006),
    ):
        for text, value in zip(printed[key].split(" / "), values, strict=True):
            assert value[0] == pytest.approx(angle(text), rel=0, abs=tolerance * ARCSEC)


def test_back_of_a_line_is_the_line_from_its_other_end():
    there, back = line(), line_factors(FRAME, ends(), np.array([[1, 0]]))
    assert there.arc_to_chord_back[0] == pytest.approx(back.arc_to_chord[0], rel=0, abs=1e-4 * ARCSEC)
    assert there.line_scale[0] == pytest.approx(back.line_scale[0], rel=0, abs=1e-13)


def test_alice_springs_b07():
    latitude, longitude = (angle(part) for part in ENTRIES["B07"]["check"]["inputs"]["Alice Springs"].split(", ")[:2])
    printed = ENTRIES["B07"]["check"]["output"]
    factors = mark_factors(EllipsoidFrame("EPSG:28353"), np.array([[longitude, latitude, 0.0]]))
    assert factors.point_scale[0] == pytest.approx(float(printed["k"]), rel=0, abs=1e-10)  # PROJ's rounding over a step
    assert -factors.convergence[0] == pytest.approx(angle(printed["gamma"]), rel=0, abs=2e-5 * ARCSEC)
    assert factors.height_factor[0] == 1.0


def test_neighbouring_zone_b09():
    printed = ENTRIES["B09"]["check"]["output"]
    factors = mark_factors(EllipsoidFrame("EPSG:28354"), ends()[1:])
    assert factors.point_scale[0] == pytest.approx(float(printed["k"]), rel=0, abs=5e-9)
    assert -factors.convergence[0] == pytest.approx(angle(printed["gamma"].lstrip("+")), rel=0, abs=0.005 * ARCSEC)


def test_height_factor():
    """R/(R + h), R = 6 371 km to four digits here: 100 m up shorten by 15.7 ppm."""
    factors = mark_factors(FRAME, ends() * (1, 1, 0) + (0, 0, 100.0))
    np.testing.assert_allclose(factors.height_factor, 1 - 15.69e-6, rtol=0, atol=0.02e-6)
    np.testing.assert_allclose(factors.combined, factors.point_scale * factors.height_factor, rtol=0, atol=0)


def around(longitude, latitude, radius):
    """A mark and nine others about it, `radius` metres away on the sphere, 500 m up."""
    bearing = np.append(np.linspace(0, 2 * np.pi, 9, endpoint=False), 0)[::-1]
    angle = np.append(0, np.full(9, radius)) / 6.37e6
    plan = np.radians([longitude, latitude]) + np.column_stack(
        [angle * np.sin(bearing) / np.cos(np.radians(latitude)), angle * np.cos(bearing)]
    )
    return np.column_stack([plan, np.full(10, 500.0)])


@pytest.mark.parametrize(
    ("crs", "longitude", "latitude"),
    [
        ("EPSG:25832", 7.2, 51.4),  # transverse Mercator
        ("EPSG:2154", -3.0, 48.2),  # conic of two parallels, far from its meridian
        ("EPSG:2056", 7.4, 46.9),  # oblique Mercator
        ("EPSG:32661", 30.0, 80.0),  # polar stereographic
        ("EPSG:28992", 6.5, 53.0),  # oblique stereographic
    ],
)
def test_what_holds_on_every_conformal_map(crs, longitude, latitude):
    frame = EllipsoidFrame(crs)
    marks = around(longitude, latitude, 8000.0)
    lines = np.column_stack([np.zeros(9, dtype=np.int64), np.arange(1, 10)])
    points, factors = mark_factors(frame, marks), line_factors(frame, marks, lines)
    assert np.all(np.abs(points.largest_shear) < 1e-6)
    tangent = factors.azimuth - points.convergence[0] - factors.grid_bearing
    np.testing.assert_allclose(np.sin(tangent / 2), 0, rtol=0, atol=1e-9)  # conformal: azimuths turn by one angle
    np.testing.assert_allclose(points.convergence, frame.grid_rotation(marks), rtol=0, atol=1e-9)
    middle = mark_factors(frame, middles(frame, marks, lines)).point_scale
    simpson = (points.point_scale[0] + 4 * middle + points.point_scale[1:]) / 6  # line scale, as under B03
    np.testing.assert_allclose(factors.line_scale, simpson, rtol=0, atol=2e-9)
    np.testing.assert_allclose(factors.grid, factors.ground * factors.combined, rtol=0, atol=1e-9)  # m


def middles(frame, marks, lines):
    geodesic = Geod(a=frame.ellipsoid.semi_major, f=frame.ellipsoid.flattening)
    start, end = (marks[lines[:, role]] for role in (0, 1))
    azimuth, _, length = geodesic.inv(*start[:, :2].T, *end[:, :2].T, radians=True)
    longitude, latitude, _ = geodesic.fwd(*start[:, :2].T, azimuth, length / 2, radians=True)
    return np.column_stack([longitude, latitude, np.zeros(len(lines))])


def test_a_map_that_is_not_conformal_shows_its_shear():
    """Lambert azimuthal equal-area of Europe: areal scale 1, directions sheared away from its centre."""
    frame = EllipsoidFrame("EPSG:3035")
    factors = mark_factors(frame, around(25.0, 40.0, 1000.0))
    np.testing.assert_allclose(factors.point_scale, 1.0, rtol=0, atol=1e-8)
    assert np.all(factors.largest_shear > 0.01)


def test_marks_without_plan_coordinates_have_no_factors():
    factors = mark_factors(FRAME, np.array([[np.nan, np.nan, 10.0], ends()[0]]))
    assert np.isnan(factors.point_scale[0])
    assert np.isfinite(factors.point_scale[1])

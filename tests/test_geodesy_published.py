"""Projection, convergence, scale, radii, geodetic ↔ cartesian, geodesics and datum shift against published examples.

tests/data/geodesy.json holds each example with its source. Numbers are read from its printed text, so that what is
tested is what was printed; where a figure is a misprint (`agrees`: partly) the recomputed one stands in.
"""

from __future__ import annotations

import json
import math
import re
from pathlib import Path

import numpy as np
import pytest
from pyproj import Geod, Transformer

from adjust.frames import EllipsoidFrame, Geometry, PlaneFrame
from adjust.observations import Azimuths, HorizontalDistances, Precision, Provenance, SlopeDistances, ZenithAngles
from adjust.units import ARCSEC, US_SURVEY_FOOT, parse_dms

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "geodesy.json").read_text("utf-8"))}
MGA_55, MGA_54 = EllipsoidFrame("EPSG:28355"), EllipsoidFrame("EPSG:28354")
FLINDERS, BUNINYONG = 0, 1
FORTH = (np.array([FLINDERS]), np.array([BUNINYONG]))
PRINTED_MILLIMETRE = 0.0006  # m: half a unit of the printed third decimal, and the input's fifth decimal of a second


def dms(text: str) -> float:
    """Radians of `-37 57 03.72030` or `52 39 27.2531 N`; a whole angle is negative when its sign or letter is."""
    match = re.search(r"-?\d+ \d+ [\d.]+", text)
    assert match
    return math.radians(parse_dms(match.group())) * (-1.0 if text.strip()[-1] in "SW" else 1.0)


def numbers(text: str) -> list[float]:
    return [float(number) for number in re.findall(r"-?\d+(?:\.\d+)?", text)]


def printed(entry: str, key: str) -> str:
    return ENTRIES[entry]["check"]["output"][key]


def position(text: str) -> np.ndarray:
    """Longitude and latitude (radians) of `latitude, longitude`, height 0."""
    latitude, longitude = text.split(",")[:2]
    return np.array([dms(longitude), dms(latitude), 0.0])


def line(heights: tuple[float, float] = (0.0, 0.0)) -> np.ndarray:
    """Flinders Peak and Buninyong (2, 3) on GRS 80."""
    inputs = ENTRIES["B01"]["check"]["inputs"]
    ends = np.array([position(inputs["Flinders"]), position(inputs["Buninyong"])])
    ends[:, 2] = heights
    return ends


def terrain_line() -> np.ndarray:
    inputs = ENTRIES["B08"]["check"]["inputs"]
    return line((float(inputs["Flinders h"]), float(inputs["Buninyong h"])))


def inverse_line() -> np.ndarray:
    """The same line with the digits that the inverse problem was printed with."""
    return np.array([position(end) for end in ENTRIES["B06"]["check"]["inputs"]["inverse"].split("->")])


def geometry(coordinates: np.ndarray) -> Geometry:
    count = len(coordinates)
    return Geometry(MGA_55, coordinates, np.zeros(count), np.zeros((count, 2)), False, 0.13)


def row(kind, **columns):
    """One observation from the first mark to the second."""
    provenance = Provenance(("test",), np.zeros(1, dtype=np.int64), np.ones(1, dtype=np.int64))
    precision = Precision.of_sd(np.ones(1))
    return kind(
        marks=np.array([[0, 1]]), observed=np.zeros((1, 1)), provenance=provenance, precision=precision, **columns
    )


def test_radii_of_curvature_a13() -> None:
    latitude = np.array([dms(part) for part in ENTRIES["A13"]["check"]["inputs"]["phi"].split(" and ")])
    ellipsoid = MGA_55.ellipsoid
    tolerance = 6e-5  # m: half of the printed last digit
    np.testing.assert_allclose(
        ellipsoid.meridian_radius(latitude), numbers(printed("A13", "rho")), rtol=0, atol=tolerance
    )
    np.testing.assert_allclose(
        ellipsoid.prime_vertical_radius(latitude), numbers(printed("A13", "nu")), rtol=0, atol=tolerance
    )


def test_grid_coordinates_b01() -> None:
    expected = [numbers(printed("B01", name)) for name in ("Flinders", "Buninyong")]
    np.testing.assert_allclose(MGA_55.grid_coordinates(line()), expected, rtol=0, atol=PRINTED_MILLIMETRE)


def test_convergence_b02() -> None:
    """The manual's γ is added to an azimuth to give a grid bearing; ours is the azimuth of grid north, −γ."""
    gamma = [dms(printed("B02", name).split("gamma")[1]) for name in ("Flinders", "Buninyong")]
    tolerance = 0.006 * ARCSEC  # printed to 0.01″
    np.testing.assert_allclose(-MGA_55.grid_rotation(line()), gamma, rtol=0, atol=tolerance)


def test_point_scale_b02() -> None:
    """A metre north on the ground (ellipsoid) is k metres on the grid."""
    start = line()
    for direction in np.eye(3)[:2]:
        step = MGA_55.grid_coordinates(MGA_55.moved(start, np.tile(direction * 10.0, (2, 1))))
        back = MGA_55.grid_coordinates(MGA_55.moved(start, np.tile(direction * -10.0, (2, 1))))
        scale = np.linalg.norm(step - back, axis=1) / 20.0
        expected = [numbers(printed("B02", name))[0] for name in ("Flinders", "Buninyong")]
        np.testing.assert_allclose(scale, expected, rtol=0, atol=6e-9)  # printed to 1e-8


def test_line_scale_b03() -> None:
    plane = float(np.linalg.norm(np.diff(MGA_55.grid_coordinates(line()), axis=0)))
    assert plane == pytest.approx(numbers(printed("B03", "grid (plane)"))[0], rel=0, abs=PRINTED_MILLIMETRE)
    ellipsoidal = numbers(printed("B03", "ellipsoidal"))[0]
    # B03 defines K on the arc L of the projected geodesic; its chord is the plane distance: 40″ of bend, 1e-9 shorter.
    assert plane / ellipsoidal == pytest.approx(float(printed("B03", "K")), rel=0, abs=2e-8)


def test_azimuth_to_plane_bearing_b04_b05() -> None:
    """Our azimuth, turned by our convergence and the printed arc-to-chord corrections, is our plane bearing."""
    ends = line()
    rotation, grid = MGA_55.grid_rotation(ends), MGA_55.grid_coordinates(ends)
    easting, northing = grid[BUNINYONG] - grid[FLINDERS]
    corrections = [numbers(printed("B04", key))[0] * ARCSEC for key in ("d1", "d2")]
    azimuths = [dms(text) for text in printed("B05", "azimuths").split("/")]
    for at, turn in ((FLINDERS, 0.0), (BUNINYONG, np.pi)):
        plane = np.arctan2(easting, northing) % (2 * np.pi) - turn
        printed_plane = dms(printed("B05", "plane bearings").split("/")[at])
        assert plane == pytest.approx(printed_plane, rel=0, abs=0.006 * ARCSEC)
        chained = azimuths[at] - rotation[at] + corrections[at]
        assert chained == pytest.approx(plane, rel=0, abs=0.016 * ARCSEC)  # three printed roundings of 0.005″
    difference = rotation[BUNINYONG] - rotation[FLINDERS]
    turning = azimuths[BUNINYONG] - (azimuths[FLINDERS] - np.pi)
    assert turning == pytest.approx(dms(printed("B05", "meridian convergence")), rel=0, abs=0.011 * ARCSEC)
    assert difference == pytest.approx(dms("0 17 39.57"), rel=0, abs=0.011 * ARCSEC)  # of B02's two printed γ


def test_predicted_azimuth_is_the_published_geodesic_less_its_bend_b06() -> None:
    """A sight between points of the ellipsoid lies in the normal section, 0.005″ off the geodesic here.

    Normal section minus geodesic: e² s² cos² φ sin 2α / 12 ν² (Rapp 1991, *Geometric Geodesy* I; from memory).
    """
    ends, ellipsoid = inverse_line(), MGA_55.ellipsoid
    azimuth = row(Azimuths).predict(geometry(ends))[0, 0] % (2 * np.pi)
    length, geodesic = re.findall(r"s ([\d.]+), az ([\d .]+),", printed("B06", "inverse"))[0]
    geodesic, latitude = dms(geodesic), ends[FLINDERS, 1]
    share = float(length) / ellipsoid.prime_vertical_radius(latitude)
    bend = ellipsoid.eccentricity_squared / 12 * share**2 * np.cos(latitude) ** 2 * np.sin(2 * geodesic)
    assert abs(bend) > 0.004 * ARCSEC  # the test would see its sign
    assert azimuth == pytest.approx(geodesic + bend, rel=0, abs=2e-4 * ARCSEC)


def test_geodesic_on_our_ellipsoid_b06() -> None:
    ends, ellipsoid = inverse_line(), MGA_55.ellipsoid
    geod = Geod(a=ellipsoid.semi_major, b=ellipsoid.semi_minor)
    forward, back, length = geod.inv(*ends[FLINDERS, :2], *ends[BUNINYONG, :2], radians=True)
    inverse = printed("B06", "inverse")
    assert length == pytest.approx(numbers(inverse)[0], rel=0, abs=2e-6)  # m: printed
    for azimuth, text in ((forward, inverse.split("az")[1]), (back, inverse.split("az")[2])):
        assert azimuth % (2 * np.pi) == pytest.approx(dms(text), rel=0, abs=1e-5 * ARCSEC)  # printed


def test_transverse_mercator_to_a_micrometre_b07() -> None:
    place = position(ENTRIES["B07"]["check"]["inputs"]["Alice Springs"])[None]
    frame = EllipsoidFrame("EPSG:28353")  # zone 53, central meridian 135° E
    expected = [float(printed("B07", key)) for key in ("E", "N")]
    np.testing.assert_allclose(
        frame.grid_coordinates(place)[0], expected, rtol=0, atol=5e-7
    )  # m: input at 1e-5″/2 is 1e-7
    assert -frame.grid_rotation(place)[0] == pytest.approx(dms(printed("B07", "gamma")), rel=0, abs=2e-5 * ARCSEC)


def test_geodetic_to_cartesian_and_back_b08() -> None:
    expected = np.array([numbers(printed("B08", name)) for name in ("Flinders", "Buninyong")])
    ends = terrain_line()
    # m: the printed fourth decimal, and the input's fifth decimal of a second (0.15 mm)
    np.testing.assert_allclose(MGA_55.geocentric(ends), expected, rtol=0, atol=2.5e-4)
    back = MGA_55.from_geocentric(expected)
    np.testing.assert_allclose(MGA_55.displacement(ends, back), 0.0, rtol=0, atol=2.5e-4)


def test_neighbouring_zone_b09() -> None:
    place = line()[[BUNINYONG]]
    expected = numbers(printed("B09", "E,N"))
    np.testing.assert_allclose(MGA_54.grid_coordinates(place)[0], expected, rtol=0, atol=PRINTED_MILLIMETRE)
    assert -MGA_54.grid_rotation(place)[0] == pytest.approx(dms(printed("B09", "gamma")), rel=0, abs=0.006 * ARCSEC)


@pytest.mark.parametrize("name", ["Caister", "Framingham"])
def test_national_grid_on_the_airy_ellipsoid_b10(name: str) -> None:
    frame = EllipsoidFrame("EPSG:27700")
    place = position(ENTRIES["B10"]["check"]["inputs"][name])[None]
    expected = numbers(printed("B10", name))
    np.testing.assert_allclose(frame.grid_coordinates(place)[0], expected, rtol=0, atol=2e-3)  # m: input at 1e-4″


def test_transverse_mercator_example_with_a_rounded_scale_b11() -> None:
    """The printed figures belong to k₀ = 0.9996013, as the entry notes."""
    crs = "+proj=tmerc +lat_0=49 +lon_0=-2 +k=0.9996013 +x_0=400000 +y_0=-100000 +ellps=airy +type=crs"
    place = np.radians([[0.5, 50.5, 0.0]])
    expected = numbers(printed("B11", "E,N"))
    np.testing.assert_allclose(
        EllipsoidFrame(crs).grid_coordinates(place)[0], expected, rtol=0, atol=6e-3
    )  # m: printed cm


def test_lambert_conic_in_us_survey_feet_b12() -> None:
    """EPSG:32040 is the example's projection; our grid coordinates are metres whatever the CRS counts in."""
    frame = EllipsoidFrame("EPSG:32040")
    expected = np.array(numbers(printed("B12", "E,N ftUS"))) * US_SURVEY_FOOT
    place = np.radians([[-96.0, 28.5, 0.0]])
    np.testing.assert_allclose(frame.grid_coordinates(place)[0], expected, rtol=0, atol=2e-3)  # m: printed 0.01 ft
    np.testing.assert_allclose(
        np.degrees(frame.from_grid(expected[None])), [[-96.0, 28.5]], rtol=0, atol=2e-8
    )  # °: 2 mm


def test_datum_shift_through_our_geodetic_coordinates_b14() -> None:
    """GDA94 → GDA2020: PROJ's seven parameters between our geodetic coordinates of either end."""
    frame = EllipsoidFrame("EPSG:4283")
    start = frame.from_geocentric(np.array([numbers(ENTRIES["B14"]["check"]["inputs"]["ALIC GDA94"])]))
    constants = ENTRIES["B14"]["constants"]
    shift = dict(zip("xyz", numbers(constants["T (m)"]), strict=True))
    shift |= dict(zip(("rx", "ry", "rz"), numbers(constants["R (arcsec)"]), strict=True))
    terms = " ".join(f"+{name}={value}" for name, value in shift.items())
    cartesian = "+proj=cart +ellps=GRS80"
    helmert = f"+proj=helmert {terms} +s={constants['s (ppm)']} +convention=coordinate_frame"
    pipeline = Transformer.from_pipeline(
        f"+proj=pipeline +step {cartesian} +step {helmert} +step +inv {cartesian}",
    )
    shifted = np.column_stack(pipeline.transform(*start.T, radians=True))
    expected = numbers(printed("B14", "GDA2020"))
    np.testing.assert_allclose(frame.geocentric(shifted)[0], expected, rtol=0, atol=1e-4)  # m: printed


def test_slope_distance_reduces_to_the_published_ellipsoidal_distance_a12() -> None:
    """Our slope distance, by the manual's chord and arc formulas, and our level chord at height zero, by its arc."""
    ends, ellipsoid = terrain_line(), MGA_55.ellipsoid
    slope = row(SlopeDistances, heights=np.zeros((1, 2))).predict(geometry(ends))[0, 0]
    latitude, azimuth = ends[:, 1].mean(), dms("306 52 05.37") - 0.5 * dms("0 18 19.70")
    east, north = ellipsoid.prime_vertical_radius(latitude), ellipsoid.meridian_radius(latitude)
    radius = east * north / (east * np.cos(azimuth) ** 2 + north * np.sin(azimuth) ** 2)
    low, high = ends[:, 2]
    chord = np.sqrt((slope**2 - (high - low) ** 2) / ((1 + low / radius) * (1 + high / radius)))
    level = row(HorizontalDistances).predict(geometry(line()))[0, 0]
    expected = float(printed("A12", "s_m"))
    for length in (chord, level):
        assert length + length**3 / (24 * radius**2) == pytest.approx(expected, rel=0, abs=PRINTED_MILLIMETRE)


@pytest.mark.parametrize("coefficient", [1 / 7, 0.0])
def test_curvature_and_refraction_of_a_level_sight_a09(coefficient: float) -> None:
    """Over one kilometre in the plane, a target at the instrument's level appears (1 − k) D² / 2R low."""
    marks = np.array([[0.0, 0.0, 0.0], [1000.0, 0.0, 0.0]])
    plane = Geometry(PlaneFrame(), marks, np.zeros(2), np.zeros((2, 2)), False, coefficient)
    zenith = row(ZenithAngles, heights=np.zeros((1, 2))).predict(plane)[0, 0]
    dip = 1000.0 / np.tan(zenith)
    key = "net" if coefficient else "curvature"
    assert -dip == pytest.approx(numbers(printed("A09", key))[0], rel=0, abs=5.5e-5)  # m: printed to 0.1 mm

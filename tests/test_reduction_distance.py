"""Distances: constants and velocity, both ends of a line, and the way down to the ellipsoid."""

import json
from pathlib import Path

import numpy as np
import pytest

from adjust.frames import EllipsoidFrame
from adjust.reductions.distance import mark_to_mark, means_of_both_ends, slope_of
from adjust.reductions.ellipsoid_distance import ellipsoid_distance, radius_in_azimuth
from adjust.units import parse_dms

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "reductions.json").read_text("utf-8"))}
"""Each entry names its source."""
ELLIPSOID = EllipsoidFrame("EPSG:4283").ellipsoid


def angle(text):
    return np.radians([parse_dms(text)])


def numbers(text):
    return np.array([float(value) for value in text.replace(",", " ").replace("m", "").split()])


def test_radii_a13():
    latitudes = np.radians([parse_dms(text) for text in ENTRIES["A13"]["check"]["inputs"]["phi"].split(" and ")])
    printed = ENTRIES["A13"]["check"]["output"]
    for azimuth, key in ((0.0, "rho"), (np.pi / 2, "nu")):
        radius = radius_in_azimuth(ELLIPSOID, latitudes, np.full(2, azimuth))
        np.testing.assert_allclose(radius, numbers(printed[key]), rtol=0, atol=5e-5)  # m: the printed digits


def test_slope_distance_to_the_ellipsoid_a12():
    given = ENTRIES["A12"]["check"]["inputs"]
    start, end = numbers(given["XYZ Flinders"]), numbers(given["XYZ Buninyong"])
    heights = numbers(given["h1,h2"])
    latitude = (angle("-37-57-03.72030") + angle("-37-39-10.15611")) / 2
    azimuth = (angle("306-52-05.373") + angle("127-10-25.070") + np.pi) / 2  # at mid-line
    radius = radius_in_azimuth(ELLIPSOID, latitude, azimuth)
    distance = ellipsoid_distance(np.linalg.norm([end - start], axis=1), heights[:1], heights[1:], radius)
    assert distance[0] == pytest.approx(float(ENTRIES["A12"]["check"]["output"]["s_m"]), rel=0, abs=5e-4)  # m: printed


def test_constant_scale_and_velocity_in_their_order():
    """500 m shown, 3 ppm of air, −2 ppm of frequency, −34.4 mm for the prism: the figures are made up."""
    slope = slope_of(np.array([500.0]), np.array([1 + 3e-6]), np.array([-2e-6]), np.array([-0.0344]))
    assert slope[0] == pytest.approx(500 + 0.0015 - 0.0010 - 0.0344, rel=0, abs=1e-8)  # m: product of the two ppm


def test_mark_to_mark():
    """A right triangle: 40 m level, 30 m up between the marks."""
    zenith = np.arctan2(40.0, 30.0 + 1.3 - 1.6)
    slope = np.hypot(40.0, 29.7)
    distance = mark_to_mark(np.array([slope]), np.array([zenith]), np.array([1.6]), np.array([1.3]))
    assert distance[0] == pytest.approx(50.0, rel=0, abs=1e-12)


def test_both_ends():
    at, to = np.array([1, 2, 1, 3, 2]), np.array([2, 1, 2, 1, 3])
    value, variance = np.array([100.002, 100.008, 100.004, 70.0, 30.0]), np.array([2.0, 1.0, 2.0, 1.0, 1.0]) * 1e-6
    ends = means_of_both_ends(at, to, value, variance)
    assert ends.marks.tolist() == [[1, 2]]  # the other lines were measured from one end
    np.testing.assert_allclose(ends.difference, -0.005, rtol=0, atol=1e-9)  # m
    np.testing.assert_allclose(ends.mean, 100.0055, rtol=0, atol=1e-9)  # m
    np.testing.assert_allclose(ends.variance, 0.5e-6, rtol=0, atol=1e-15)  # m²
    np.testing.assert_allclose(ends.difference_variance, 2e-6, rtol=0, atol=1e-15)  # m²

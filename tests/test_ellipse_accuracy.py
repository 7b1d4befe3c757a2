"""Ellipses, circles and intervals: published exercises, exact references, simulation and properties."""

import json
import math
from pathlib import Path

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import fdtri, ndtri

from adjust.quality import circle_radius, ellipse_factor, half_interval, standard_ellipse

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "ellipses.json").read_text("utf-8"))}
"""Each entry names its source."""

SWAP = np.array([[0.0, 1.0], [1.0, 0.0]])
"""The exercises order north, east; ours is east, north."""


def direction(azimuth):
    """Unit vector east, north."""
    return np.array([math.sin(azimuth), math.cos(azimuth)])


def exercise(name, key):
    return SWAP @ np.array(ENTRIES[name]["inputs"][key], dtype=float) @ SWAP, ENTRIES[name]["published_outputs"]


def test_ellipse_from_cofactors_p04():
    cofactor, printed = exercise("P04-W10.1", "Q")
    covariance = cofactor * ENTRIES["P04-W10.1"]["inputs"]["s0_squared_cm2"]
    ellipse = standard_ellipse(covariance)
    assert ellipse.semi_major == pytest.approx(printed["E_cm"], rel=0, abs=0.005)  # cm
    assert ellipse.semi_minor == pytest.approx(printed["F_cm"], rel=0, abs=0.005)  # cm
    assert math.degrees(ellipse.azimuth) == pytest.approx(printed["azimuth_E_deg"][0], rel=0, abs=0.05)
    assert math.sqrt(covariance[0, 0]) == pytest.approx(printed["s_in_azimuth_90_cm"])  # east
    assert math.hypot(ellipse.semi_major, ellipse.semi_minor) == pytest.approx(math.sqrt(3))  # sP


def test_relative_ellipse_p05():
    covariance, printed = exercise("P05-W10.3", "Q_difference_cm2")
    ellipse = standard_ellipse(covariance)
    assert ellipse.semi_major == pytest.approx(printed["E12_cm"], rel=0, abs=0.005)  # cm
    assert ellipse.semi_minor == pytest.approx(printed["F12_cm"], rel=0, abs=0.005)  # cm
    assert math.degrees(ellipse.azimuth) == pytest.approx(printed["azimuth_E12_deg"][0], rel=0, abs=1e-9)


def test_extremes_and_a_direction_p06():
    covariance, printed = exercise("P06-W10.4", "Q_cm2")
    ellipse = standard_ellipse(covariance)
    assert ellipse.semi_major == pytest.approx(printed["E_cm"], rel=0, abs=0.005)  # cm
    assert ellipse.semi_minor == pytest.approx(printed["F_cm"], rel=0, abs=0.005)  # cm
    assert math.degrees(ellipse.azimuth) == pytest.approx(printed["azimuth_E_deg"][0], rel=0, abs=0.05)
    assert math.hypot(ellipse.semi_major, ellipse.semi_minor) == pytest.approx(printed["sP_cm"], rel=0, abs=0.005)
    psi = math.radians(ENTRIES["P06-W10.4"]["inputs"]["psi_deg_from_major_axis"])
    along = math.hypot(ellipse.semi_major * math.cos(psi), ellipse.semi_minor * math.sin(psi))
    assert along == pytest.approx(printed["s_psi30_cm"], rel=0, abs=0.005)  # cm
    unit = direction(ellipse.azimuth + psi)
    assert along == pytest.approx(math.sqrt(unit @ covariance @ unit))
    side = ENTRIES["P06-W10.4"]["inputs"]["side"]
    lengthwise = direction(math.radians(side["azimuth_deg"]))
    ratio = side["length_km"] * 1e5 / math.sqrt(lengthwise @ covariance @ lengthwise)
    assert ratio == pytest.approx(740000, rel=0, abs=5000)  # printed to the ten thousand


def test_angle_from_a_point_covariance_p07():
    """Read as the entry's note says; 11.95 recomputed, the source cuts to 11.9."""
    covariance, printed = exercise("P07-W10.5", "Q_cm2")
    ellipse = standard_ellipse(covariance)
    assert ellipse.semi_major**2 == pytest.approx(printed["E_squared_cm2"])
    assert ellipse.semi_minor**2 == pytest.approx(printed["F_squared_cm2"])
    assert ellipse.azimuth == pytest.approx(math.pi / 2)
    across = direction(math.radians(60 + 90))
    arcsec = math.degrees(math.sqrt(across @ covariance @ across) / 22000) * 3600
    assert arcsec == pytest.approx(11.95, rel=0, abs=0.005)


def test_confidence_ellipses_by_fisher_p08():
    entry = ENTRIES["P08-MAHUN-CI"]
    factor = ellipse_factor(0.95, entry["inputs"]["dof"])
    for name, (major, minor) in entry["published_outputs"]["ellipses_95"].items():
        standard = entry["inputs"]["standard_ellipses"][name]
        assert standard["a"] * factor == pytest.approx(major, rel=0, abs=0.0005)  # ft, printed to 3 or 4 decimals
        assert standard["b"] * factor == pytest.approx(minor, rel=0, abs=0.0005)
    for freedom, multiplier in entry["recomputed_outputs"]["multipliers_by_dof"].items():
        ours = ellipse_factor(0.95, None if freedom == "infinite" else int(freedom))
        assert ours == pytest.approx(multiplier, rel=0, abs=0.6e-5)


@given(st.floats(0.01, 0.999), st.integers(1, 500))
def test_ellipse_factor_is_fishers_quantile(confidence, freedom):
    assert ellipse_factor(confidence, freedom) == pytest.approx(math.sqrt(2 * fdtri(2, freedom, confidence)), rel=1e-9)


axes = st.floats(1e-4, 1e3)
turns = st.floats(0, math.pi, exclude_max=True)


@given(axes, st.floats(0, 1), turns)
def test_ellipse_gives_back_the_axes_it_was_made_of(major, ratio, azimuth):
    along, across = direction(azimuth), direction(azimuth + math.pi / 2)
    covariance = major**2 * (np.outer(along, along) + ratio**2 * np.outer(across, across))
    ellipse = standard_ellipse(covariance)
    assert 0 <= ellipse.azimuth < math.pi
    assert ellipse.semi_minor <= ellipse.semi_major
    assert ellipse.semi_major == pytest.approx(major, rel=1e-14)
    # The covariance itself holds b² to a few ε a², so b is known to ε a²/b, at the worst √ε a.
    assert ellipse.semi_minor == pytest.approx(ratio * major, rel=0, abs=8e-16 * major / max(ratio, 4e-8))
    turned = abs(math.remainder(ellipse.azimuth - azimuth, math.pi))
    assert turned * (1 - ratio**2) < 1e-14


@given(st.floats(1e-9, 1), st.booleans())
def test_thin_ellipse_along_an_axis_keeps_all_digits(minor, along_north):
    covariance = np.diag([minor**2, 1.0] if along_north else [1.0, minor**2])
    assert standard_ellipse(covariance).semi_minor == pytest.approx(minor, rel=1e-15)


def test_ellipses_of_points_circles_and_nothing():
    stack = np.array([np.zeros((2, 2)), np.eye(2), np.full((2, 2), np.nan), [[0.0, 0.0], [0.0, 4.0]]])
    ellipse = standard_ellipse(stack)
    np.testing.assert_array_equal(ellipse.semi_major, [0, 1, np.nan, 2])
    np.testing.assert_array_equal(ellipse.semi_minor, [0, 1, np.nan, 0])
    np.testing.assert_array_equal(ellipse.azimuth, [0, 0, np.nan, 0])


def test_azimuth_a_hair_left_of_north_stays_below_half_a_turn():
    ellipse = standard_ellipse(np.array([[1.0, -1e-18], [-1e-18, 4.0]]))
    assert 0 <= ellipse.azimuth < math.pi


def outside_probability(radius, ratio, freedom):
    """Reference in 30 digits: ∫ over directions, split towards the minor axis where a flat ellipse bends it."""
    with mpmath.workdps(30):
        size, flatness = mpmath.mpf(float(radius)), mpmath.mpf(float(ratio))

        def beyond(angle):
            stretch = mpmath.cos(angle) ** 2 + (flatness * mpmath.sin(angle)) ** 2
            square = size**2 / stretch
            return mpmath.exp(-square / 2) if freedom is None else (1 + square / freedom) ** (-mpmath.mpf(freedom) / 2)

        right = mpmath.pi / 2
        edges = [0, *(right - mpmath.mpf(10) ** (-k / mpmath.mpf(2)) for k in range(13)), right]
        return float(mpmath.quad(beyond, edges) / right)


@pytest.mark.parametrize("freedom", [None, 1, 2, 3, 30])
@pytest.mark.parametrize("ratio", [1.0, 0.7, 0.1, 0.003, 1e-6])
def test_circle_holds_95_per_cent_in_high_precision(ratio, freedom):
    radius = circle_radius(np.array([1.0]), np.array([ratio]), 0.95, freedom)[0]
    assert outside_probability(radius, ratio, freedom) == pytest.approx(0.05, rel=1e-10)


def test_circle_by_a_double_integral_of_the_density():
    """Another road to the same figure: the bivariate normal density over the disc, in rectangular coordinates."""
    ratio = 0.4
    radius = circle_radius(np.array([1.0]), np.array([ratio]))[0]

    def strip(x):
        return mpmath.npdf(x) * mpmath.erf(mpmath.sqrt(radius**2 - x**2) / ratio / mpmath.sqrt(2))

    assert float(2 * mpmath.quad(strip, [0, radius / 2, radius])) == pytest.approx(0.95, rel=1e-10)


@pytest.mark.parametrize("freedom", [None, 1, 2, 7, 200])
def test_circle_of_a_circle_is_its_ellipse_and_of_a_line_its_interval(freedom):
    line, circle = circle_radius(np.ones(2), np.array([0.0, 1.0]), 0.95, freedom)
    assert circle == pytest.approx(ellipse_factor(0.95, freedom), rel=1e-11)
    assert line == pytest.approx(half_interval(np.array([1.0]), 0.95, freedom)[0], rel=1e-11)


def test_leenhouts_polynomial_is_close_to_the_exact_circle():
    """Leenhouts (1985), Navigation 32, as NGS uses it; measured here: within 0.19 % of the exact radius."""
    ratio = np.linspace(0, 1, 1001)
    polynomial = 1.960790 + 0.004071 * ratio + 0.114276 * ratio**2 + 0.371625 * ratio**3
    error = polynomial / circle_radius(np.ones(1001), ratio) - 1
    assert np.abs(error).max() == pytest.approx(0.00181, rel=0, abs=0.00001)


@given(st.floats(1e-3, 1e3), st.floats(0, 1), st.sampled_from([0.5, 0.95, 0.999]), st.sampled_from([None, 1, 4, 50]))
def test_circle_lies_between_line_and_circle_and_scales(major, ratio, confidence, freedom):
    radius = circle_radius(np.array([major]), np.array([major * ratio]), confidence, freedom)[0] / major
    assert half_interval(1.0, confidence, freedom) * (1 - 1e-10) <= radius
    assert radius <= ellipse_factor(confidence, freedom) * (1 + 1e-10)
    assert radius == pytest.approx(circle_radius(np.ones(1), np.array([ratio]), confidence, freedom)[0], rel=1e-10)


@pytest.mark.parametrize("freedom", [None, 5])
def test_simulated_errors_fall_inside_as_often_as_claimed(freedom):
    rng = np.random.default_rng(20240611)
    trials = 200_000
    covariance = np.array([[4.0, 1.5], [1.5, 1.0]])
    errors = rng.standard_normal((trials, 2)) @ np.linalg.cholesky(covariance).T
    scale = np.ones(trials) if freedom is None else np.sqrt(rng.chisquare(freedom, trials) / freedom)
    ellipse = standard_ellipse(covariance)
    circle = circle_radius(ellipse.semi_major[None], ellipse.semi_minor[None], 0.95, freedom)[0]
    whitened = np.linalg.solve(np.linalg.cholesky(covariance), errors.T)
    in_circle = np.hypot(*errors.T) <= circle * scale
    in_ellipse = np.hypot(*whitened) <= ellipse_factor(0.95, freedom) * scale
    in_interval = np.abs(errors[:, 1]) <= half_interval(np.array([1.0]), 0.95, freedom)[0] * scale
    four_standard_errors = 4 * math.sqrt(0.95 * 0.05 / trials)
    for inside in (in_circle, in_ellipse, in_interval):
        assert np.mean(inside) == pytest.approx(0.95, rel=0, abs=four_standard_errors)


def test_figures_that_do_not_exist_are_nan():
    ones = np.ones(1)
    assert np.isnan(circle_radius(ones, ones, 0.95, 0)).all()
    assert np.isnan(half_interval(ones, 0.95, 0)).all()
    assert math.isnan(ellipse_factor(0.95, 0))
    np.testing.assert_array_equal(circle_radius(np.array([0.0, np.nan]), np.array([0.0, np.nan])), [0, np.nan])


def test_one_ellipse_is_plain_numbers():
    ellipse = standard_ellipse(np.diag([4.0, 1.0]))
    assert all(type(figure) is np.float64 for figure in (*ellipse, *ellipse.scaled(2.0)))


def test_what_is_held_stays_exact_where_the_scale_is_unknown():
    ellipse = standard_ellipse(np.array([np.zeros((2, 2)), np.diag([4.0, 1.0])])).scaled(math.nan)
    np.testing.assert_array_equal(ellipse, [[0, np.nan], [0, np.nan], [0, np.nan]])
    np.testing.assert_array_equal(half_interval(np.array([0.0, 1.0]), 0.95, 0), [0, np.nan])


def test_half_interval_is_the_normal_quantile():
    np.testing.assert_allclose(half_interval(np.array([2.0]), 0.9), 2 * ndtri(0.95), rtol=1e-15)

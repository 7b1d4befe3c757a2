"""Test levels, critical values and residual tests against published tables and certified data."""

import json
import math
from pathlib import Path

import numpy as np
import pytest

from adjust.quality import (
    chi_square_quantile,
    circle_radius,
    critical_tau,
    critical_w,
    global_test,
    half_interval,
    minimal_detectable_bias,
    non_centrality,
    normalised_residual,
    standard_ellipse,
    studentised_residual,
)
from adjust.quality.accuracy import interval_factor

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "statistics.json").read_text("utf-8"))}
"""Each entry names its source."""


def numbers(text):
    return [float(word) for word in text.replace(",", " ").split()]


TAU = ENTRIES["S1"]
MISPRINTED_TAU = {(7, 0.1), (9, 0.1), (14, 0.05), (16, 0.01), (18, 0.01)}
"""Printed one or two units of the fourth decimal off; `agrees` of the entry. (n = 4, 0.01 is entered as 1.4142.)"""


@pytest.mark.parametrize("row", TAU["published_outputs"], ids=lambda row: f"n={row['n']}")
def test_tau_of_the_largest_residual_is_ugahs_table_1(row):
    n = row["n"]
    for alpha, printed in zip(TAU["inputs"]["alphas"], row["values"], strict=True):
        ours = critical_tau(alpha / n, n - 2)
        wrong = (n, alpha) in MISPRINTED_TAU
        assert ours == pytest.approx(printed, rel=0, abs=2.5e-4 if wrong else 0.5e-4)  # printed to 4 decimals
        assert wrong == (abs(ours - printed) > 0.5e-4)


@pytest.mark.parametrize("row", TAU["recomputed_outputs"]["table"], ids=lambda row: f"n={row['n']}")
def test_tau_in_full_digits(row):
    """Regression: recomputed independently from the formula when the table was collected."""
    ours = [critical_tau(alpha / row["n"], row["n"] - 2) for alpha in TAU["inputs"]["alphas"]]
    np.testing.assert_allclose(ours, row["values"], rtol=0, atol=1e-12)  # recomputed to 15 digits


@pytest.mark.parametrize("row", TAU["recomputed_outputs"]["pope_two_sided_single_test_unpublished"])
def test_tau_of_a_single_residual_in_full_digits(row):
    ours = [critical_tau(alpha, row["f"]) for alpha in (0.05, 0.01, 0.001)]
    np.testing.assert_allclose(ours, [row["a050"], row["a010"], row["a001"]], rtol=0, atol=1e-12)


def test_thompsons_tau_follows_from_popes():
    for n, printed in enumerate(numbers(ENTRIES["F03"]["check"]["output"]["tau_n"]), start=3):
        thompson = critical_tau(0.05, n - 1) * math.sqrt((n - 1) / n)
        assert thompson == pytest.approx(printed, rel=0, abs=0.51e-4)  # printed to 4 decimals


@pytest.mark.parametrize("row", ENTRIES["S2"]["published_outputs"], ids=lambda row: f"power={row['power']}")
def test_non_centrality_is_zaykins_table(row):
    for dimension in (1, 8):
        ours = non_centrality(0.05, row["power"], dimension)
        assert ours == pytest.approx(row[f"df{dimension}"], rel=6e-6)  # printed to 6 digits


@pytest.mark.parametrize("name", ENTRIES["S2"]["recomputed_outputs"]["delta0_other_unpublished"])
def test_non_centrality_in_full_digits(name):
    level, power = (float(part.lstrip("abcdefghijklmnopqrstuvwxyz")) for part in name.split("_"))
    expected = ENTRIES["S2"]["recomputed_outputs"]["delta0_other_unpublished"][name]["lambda0"]
    assert non_centrality(level, power) == pytest.approx(expected, rel=1e-12)


def test_baardas_constants():
    """From memory in the collection; k, δ₀ and λ₀ at 0.001 and 0.80."""
    printed = {name: float(value) for name, value in ENTRIES["F01"]["check"]["output"].items()}
    assert critical_w(0.001) == pytest.approx(printed["k"], rel=0, abs=0.005)
    assert math.sqrt(non_centrality(0.001, 0.80)) == pytest.approx(printed["delta0"], rel=0, abs=0.005)
    assert non_centrality(0.001, 0.80) == pytest.approx(printed["lambda0"], rel=0, abs=0.005)
    sd, redundancy = np.array([2.0]), 0.25
    bias = minimal_detectable_bias(redundancy / sd**2, non_centrality(0.001, 0.80))
    np.testing.assert_allclose(bias, sd * printed["delta0"] / math.sqrt(redundancy), rtol=0, atol=0.02)  # from ±0.005


@pytest.mark.parametrize("degrees_of_freedom", [4, 5, 6])
def test_chi_square_is_the_printed_table(degrees_of_freedom):
    tails = ENTRIES["S7"]["inputs"]["upper_tail_probability"]
    printed = ENTRIES["S7"]["published_outputs"][str(degrees_of_freedom)]
    ours = [chi_square_quantile(1 - tail, degrees_of_freedom) for tail in tails]
    np.testing.assert_allclose(ours, printed, rtol=0, atol=0.51e-5)  # printed to 5 decimals


@pytest.mark.parametrize(("degrees_of_freedom", "confidence", "lower", "upper"), [(4, 0.95, 0.48442, 11.14329)])
def test_global_test_bounds_are_the_printed_table(degrees_of_freedom, confidence, lower, upper):
    bounds = global_test(1.0, degrees_of_freedom, confidence)
    assert (bounds.lower, bounds.upper) == pytest.approx((lower, upper), rel=0, abs=0.51e-5)


def test_global_test_bounds_for_twelve_degrees_of_freedom():
    lower, upper = numbers(ENTRIES["F09"]["check"]["output"]["chi2"])
    bounds = global_test(12.0, 12, 0.95)
    assert (bounds.lower, bounds.upper) == pytest.approx((lower, upper), rel=0, abs=0.0005)


@pytest.mark.parametrize(
    ("degrees_of_freedom", "low", "high"),
    [
        (1, 0.031, 2.241),
        (2, 0.159, 1.921),
        (5, 0.408, 1.602),
        (10, 0.570, 1.431),
        (30, 0.748, 1.251),
        (100, 0.862, 1.138),
    ],
)
def test_limits_of_the_estimated_sigma_zero(degrees_of_freedom, low, high):
    """Entry F09, `recomputed`."""
    bounds = global_test(1.0, degrees_of_freedom, 0.95)
    limits = [math.sqrt(bound / degrees_of_freedom) for bound in (bounds.lower, bounds.upper)]
    assert limits == pytest.approx([low, high], rel=0, abs=0.0006)  # given to 3 decimals, one of them cut


def test_student_t_is_soongs_table_a4():
    freedom = numbers(ENTRIES["F10"]["check"]["inputs"]["f"])
    printed = numbers(ENTRIES["F10"]["check"]["output"]["t"])
    ours = [interval_factor(0.95, int(f)) for f in freedom]
    np.testing.assert_allclose(ours, printed, rtol=0, atol=0.51e-3)  # printed to 3 decimals


def test_iso_17123_chi_square_and_multipliers():
    """From memory in the collection: one-sided 95 % is the upper bound of a two-sided test at 90 %."""
    check = ENTRIES["C19"]["check"]
    columns = check["inputs"]["nu"], check["output"]["chi2"], check["output"]["multiplier"]
    for freedom, printed, multiplier in zip(*map(numbers, columns), strict=True):
        upper = global_test(1.0, int(freedom), 0.90).upper
        assert upper == pytest.approx(printed, rel=0, abs=0.006)  # 2 decimals, some cut
        assert math.sqrt(upper / freedom) == pytest.approx(multiplier, rel=0, abs=0.006)


NGS = [
    tuple(numbers(row)) for row in ENTRIES["D02"]["check"]["inputs"]["(SD_N, SD_E cm, corr)"].strip("()").split(") (")
]


@pytest.mark.parametrize("row", range(len(NGS)))
def test_95_circle_and_ellipse_are_the_ngs_data_sheets(row):
    """Printed to 0.01 cm by NGS from Leenhouts' polynomial, which is within 0.0025 cm of the exact radius here."""
    north, east, correlation = NGS[row]
    cross = north * east * correlation
    ellipse = standard_ellipse(np.array([[[east**2, cross], [cross, north**2]]]))
    printed = numbers(ENTRIES["D02"]["check"]["output"]["Horiz cm"])[row]
    recomputed = numbers(ENTRIES["D02"]["recomputed"])[row]
    ours = circle_radius(ellipse.semi_major, ellipse.semi_minor)
    np.testing.assert_allclose(ours, printed, rtol=0, atol=0.0076)  # cm: printed to 0.01, polynomial
    np.testing.assert_allclose(ours, recomputed, rtol=0, atol=0.003)  # cm: printed to 0.001, polynomial


def test_semi_axes_of_ngs_gw1129():
    north, east, correlation = numbers(ENTRIES["D04"]["check"]["inputs"]["GW1129"])
    cross = north * east * correlation
    ellipse = standard_ellipse(np.array([[east**2, cross], [cross, north**2]]))
    assert (ellipse.semi_major, ellipse.semi_minor) == pytest.approx((0.8095, 0.5200), rel=0, abs=0.6e-4)


def test_95_heights_are_the_ngs_data_sheets():
    sd = np.array(numbers(ENTRIES["D03"]["check"]["inputs"]["SD_h cm"]))
    printed = numbers(ENTRIES["D03"]["check"]["output"]["Ellip cm"])
    recomputed = numbers(ENTRIES["D03"]["recomputed"])
    np.testing.assert_allclose(half_interval(sd), recomputed, rtol=0, atol=0.0006)  # cm
    np.testing.assert_allclose(half_interval(sd), printed, rtol=0, atol=0.0121)  # cm: NGS's sd has more digits inside


def test_nssda_vertical_and_horizontal():
    rmse = float(ENTRIES["D05"]["check"]["inputs"]["RMSE_z"].split()[0])
    printed = float(ENTRIES["D05"]["check"]["output"]["Accuracy_z"].split()[0])
    assert half_interval(np.array([rmse]))[0] == pytest.approx(printed, rel=2e-5)  # 1.9600 has 5 digits
    circle = circle_radius(np.array([1.0]), np.array([1.0]))[0]
    assert circle == pytest.approx(2.4477, rel=0, abs=0.51e-4)
    assert circle / math.sqrt(2) == pytest.approx(1.7308, rel=0, abs=0.51e-4)


def test_nssda_mean_rule_stays_near_the_exact_circle():
    """2.4477 · ½(RMSE_min + RMSE_max), for ratios 0.6 … 1, is a rule of thumb: it falls short, by 6 % at the most."""
    ratio = np.linspace(0.6, 1.0, 41)
    shortfall = 1 - 2.44775 * (1 + ratio) / 2 / circle_radius(np.ones(41), ratio)
    assert np.all(np.diff(shortfall) < 0)
    assert shortfall[0] == pytest.approx(0.0591, rel=0, abs=0.0001)
    assert shortfall[-1] == pytest.approx(0.0, rel=0, abs=2e-6)


def sums(entry):
    """Residuals about the common mean (n,) and group number (n,), from the rows of a one-way analysis of variance."""
    values = np.array([float(value) for _, value in entry["inputs"]["rows"]])
    return (values - values[0]) - np.mean(values - values[0]), np.array([int(g) for g, _ in entry["inputs"]["rows"]])


def contrast_residual(residual, contrast):
    """w of a bias along `contrast` (n,), orthogonal to the common mean, unit weights: Q_vv leaves it whole."""
    return normalised_residual(contrast @ residual, contrast @ contrast)


def test_w_and_tau_of_one_bias_are_nist_atmwtag():
    """One height observed in two epochs: the bias of the second epoch has w² = between-groups sum of squares, and
    τ² turns into the certified F by F = (f − 1) τ²/(f − τ²)."""
    entry = ENTRIES["D1"]
    residual, group = sums(entry)
    freedom = len(residual) - 1
    w = contrast_residual(residual, (group == 2) - 0.5)
    tau = studentised_residual(w, residual @ residual / freedom)
    # The data agree in 7 digits: of 16 digits 9 are left for the residuals, and about 8 for their squares.
    assert w**2 == pytest.approx(float(entry["published_outputs"]["between_SS"]), rel=1e-8)
    assert (freedom - 1) * tau**2 / (freedom - tau**2) == pytest.approx(
        float(entry["published_outputs"]["F"]), rel=1e-8
    )
    assert abs(tau) > critical_tau(0.001, freedom)


def test_w_of_four_biases_is_nist_sirstv():
    """Five groups: four orthogonal contrasts of group means, whose w² add up to the between-groups sum of squares."""
    entry = ENTRIES["D2"]
    residual, group = sums(entry)
    total = 0.0
    for last in range(2, 6):
        contrast = np.where(group < last, 1.0, 0.0) - np.where(group == last, last - 1.0, 0.0)
        total += contrast_residual(residual, contrast) ** 2
    within = residual @ residual - total
    assert total == pytest.approx(float(entry["published_outputs"]["between_SS"]), rel=1e-11)
    assert within == pytest.approx(float(entry["published_outputs"]["within_SS"]), rel=1e-11)
    assert (total / 4) / (within / 20) == pytest.approx(float(entry["published_outputs"]["F"]), rel=1e-11)

"""Published tolerances: the table against its sources, its arithmetic, and which of them a closure is held to."""

from __future__ import annotations

import re

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.stats import norm

from adjust.network.closures import check_job
from adjust.network.closures.closures import sd_factor
from adjust.tolerances import STANDARDS, Quantity, Rule, Tolerances
from adjust.units import ARCSEC, INTERNATIONAL_FOOT
from tests.building import build_job
from tests.published import published

SOURCES = published("closure_tolerances.json")
MILE = 1609.344
"""Metres, exact."""
FGCC_ORDERS = (
    "first order class I",
    "first order class II",
    "second order class I",
    "second order class II",
    "third order class I",
)


def rule(name: str, quantity: Quantity) -> Rule:
    (found,) = Tolerances(standards=(name,)).rules(quantity)
    return found


def allowed(name: str, quantity: Quantity, size: float) -> float:
    """Metres or radians."""
    return float(rule(name, quantity).allowed(np.array([size]))[0])


@pytest.mark.parametrize(
    ("quantity", "key"),
    [(Quantity.LEVEL_RUNS, "1st I / 1st II / 2nd I / 2nd II / 3rd, section s"), (Quantity.LEVEL_LOOP, "loop l")],
)
def test_fgcc_levelling_figures_are_those_printed(quantity: Quantity, key: str) -> None:
    printed = [float(figure) for figure in SOURCES["C01"]["constants"][key].split()]
    millimetres = [1000 * allowed(f"FGCC 1984 {order}", quantity, 1000.0) for order in FGCC_ORDERS]
    assert_allclose(millimetres, printed, rtol=0, atol=1e-9)  # mm at 1 km
    assert 1000 * allowed("FGCC 1984 third order class II", quantity, 1000.0) == pytest.approx(printed[-1])


def test_third_order_levelling_in_feet_and_miles() -> None:
    """US practice prints 0.05 ft √M for third order; 12 mm √km is 0.04994 (C01, with the other orders recomputed)."""
    feet = [allowed(f"FGCC 1984 {order}", Quantity.LEVEL_LOOP, MILE) / INTERNATIONAL_FOOT for order in FGCC_ORDERS]
    assert round(feet[-1], 2) == 0.05
    assert_allclose(feet, [0.0166, 0.0208, 0.0250, 0.0333, 0.04994], rtol=0, atol=0.00006)  # ft


def test_a_misclosure_grows_with_the_root_of_the_length() -> None:
    six = rule("FGCC 1984 second order class I", Quantity.LEVEL_LOOP).allowed(np.array([1000.0, 4000.0, 9000.0]))
    assert_allclose(six, [0.006, 0.012, 0.018], rtol=0, atol=1e-12)  # m


def test_traverse_figures_are_those_printed() -> None:
    orders = ("first order class I", "second order class I", "second order class II", "third order class I")
    names = [f"FGCC 1984 {order}" for order in (*orders, "third order class II")]
    angles, metres, ratios = (SOURCES["C10"]["constants"][key] for key in list(SOURCES["C10"]["constants"]))
    seconds = [allowed(name, Quantity.ANGLES, 1.0) / ARCSEC for name in names]
    assert_allclose(seconds, [float(text) for text in angles.split()], rtol=0, atol=1e-9)  # ″ at n = 1
    for name, root, ratio in zip(names, metres.split(), ratios.split(), strict=True):
        by_root, by_ratio = Tolerances(standards=(name,)).rules(Quantity.POSITION)
        assert by_root.allowed(np.array([4000.0]))[0] == pytest.approx(2 * float(root))  # m at 4 km
        assert 4000.0 / by_ratio.allowed(np.array([4000.0]))[0] == pytest.approx(float(ratio[2:]))
        assert by_root.recalled
        assert by_ratio.recalled


def test_law_and_highway_practice() -> None:
    """Washington Administrative Code 332-130-090; Texas right-of-way table (C08)."""
    for name, key in (("WAC 332-130-090", "WAC 332-130-090"), ("TxDOT right of way", "TxDOT right of way")):
        pairs = re.findall(r"1:(\d+) with (\d+)\*sqrt", SOURCES["C08"]["constants"][key])
        assert len(pairs) == 2
        for ratio, seconds in pairs:
            chosen = f"{name} 1:{ratio}"
            assert allowed(chosen, Quantity.ANGLES, 9.0) / ARCSEC == pytest.approx(3 * float(seconds))
            assert allowed(chosen, Quantity.POSITION, 1000.0) == pytest.approx(1000.0 / float(ratio))


def test_bearing_accuracy_that_goes_with_a_ratio() -> None:
    """C08 prints 20″ and 15″ for 1:10 000 and 1:15 000; arcsin gives 20.6″ and 13.8″: the printed ones are round."""
    angles = [np.arcsin(allowed(f"TxDOT right of way 1:{ratio}", Quantity.POSITION, 1.0)) for ratio in (10_000, 15_000)]
    assert_allclose(np.array(angles) / ARCSEC, [20.6, 13.8], rtol=0, atol=0.06)  # ″


def test_other_levelling_figures() -> None:
    for name, text in SOURCES["C05"]["constants"].items():
        found = rule(f"ICSM SP1 {name}", Quantity.LEVEL_RUNS)
        assert found.recalled == ("recalled" in text)
        assert 1000 * found.allowed(np.array([1000.0]))[0] == pytest.approx(float(text.split()[0]))  # mm at 1 km
    closure, rejection = re.findall(r"([\d.]+)\*sqrt", SOURCES["C06"]["formula"])
    army = "US Army second order"
    assert 1000 * allowed(army, Quantity.LEVEL_LOOP, 1000.0) == pytest.approx(float(closure))  # mm at 1 km
    assert 1000 * allowed(army, Quantity.LEVEL_RUNS, 1000.0) == pytest.approx(float(rejection))  # mm at 1 km


def test_every_figure_says_where_it_is_from() -> None:
    for name, standard in STANDARDS.items():
        assert standard.name == name
        for figure in standard.figures:
            text = str(figure.rule)
            assert name in text
            assert figure.rule.printed in text
            assert ("from memory" in text) == figure.rule.recalled


def test_own_figures_win_over_a_standard() -> None:
    own = Rule("4 mm √K", per_root=0.004 / np.sqrt(1000.0))
    tolerances = Tolerances(standards=("FGCC 1984 third order class I",), own={Quantity.LEVEL_LOOP: (own,)})
    assert tolerances.rules(Quantity.LEVEL_LOOP) == (own,)
    assert tolerances.rules(Quantity.LEVEL_RUNS)[0].source == "FGCC 1984 third order class I"
    assert tolerances.rules(Quantity.STATION) == ()


def test_triangles_follow_the_figures_for_angles() -> None:
    tolerances = Tolerances(standards=("FGCC 1984 third order class I",))
    assert tolerances.rules(Quantity.TRIANGLE) == tolerances.rules(Quantity.ANGLES)


def test_the_smaller_of_two_position_rules_counts() -> None:
    """0.08 m √K is the larger below 16 km, where 1:50 000 passes it (K = (0.08 · 50)² km)."""
    job = build_job(
        {"A": (0.0, 0.0), "B": (20_000.0, 0.0), "C": (0.0, 9_000.0), "D": (9_000.0, 9_000.0)},
        fixed_plan="ABCD",
        horizontals=[("A", "B", 20_000.0), ("C", "D", 9_000.0)],
        tolerances=Tolerances(standards=("FGCC 1984 second order class I",)),
    )
    (judged,) = check_job(job).closures
    assert [judged.rules[rule].printed for rule in judged.rule] == ["0.08 m √K, K in km", "1:50000"]
    assert_allclose(judged.allowed[:, 0], [0.08 * np.sqrt(20.0), 9000.0 / 50_000], rtol=0, atol=1e-9)  # m


@pytest.mark.parametrize("tests", [1, 10, 20_000])
def test_the_sd_factor_leaves_a_sound_job_its_chance(tests: int) -> None:
    """Šidák: m independent two-sided tests all pass with the probability confidence."""
    chance = (norm.cdf(sd_factor(tests, 0.99)) - norm.cdf(-sd_factor(tests, 0.99))) ** tests
    assert chance == pytest.approx(0.99, abs=1e-9)


def test_where_the_length_is_not_known_the_sds_decide() -> None:
    tolerances = Tolerances(standards=("FGCC 1984 third order class I",))
    job = build_job("ABC", levels=[("A", "B", 1.0), ("B", "C", 1.0), ("C", "A", -2.001)], tolerances=tolerances)
    (judged,) = check_job(job).closures
    assert "sd" in judged.rules[judged.rule[0]].printed
    assert_allclose(judged.allowed, sd_factor(1, 0.99) * 0.001 * np.sqrt(3.0), rtol=0, atol=1e-12)  # m

"""Published level nets and difference designs, from job folders through the whole adjustment.

Sources stand in tests/data/levelling.json; `recomputed_outputs` there are exact or independent solutions, used where a
printed figure is a misprint.
"""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from adjust import Adjustment
from adjust.arrays import FloatArray
from adjust.units import INTERNATIONAL_FOOT as FOOT
from tests.published import adjusted, published, table

NETS = published("levelling.json")
PLANE = '[frame]\nkind = "plane"\n'
POSTERIOR = '[statistics]\nsd_basis = "posterior"\n'
MILLIMETRE = 1e-3
HALF_DIGIT = 0.5 + 1e-9
"""Of the last printed digit, as rounding allows, and what double precision adds to it."""


def marks_table(fixed: dict[str, float], free: list[str], unit: str = "m") -> str:
    rows = [(name, height, "fixed") for name, height in fixed.items()] + [(name, None, None) for name in free]
    return table(f"mark,height_{unit},height_control", rows)


def height(adjustment: Adjustment, mark: str) -> float:
    return float(adjustment.coordinates[adjustment.job.marks.index[mark], 2])


def sd(adjustment: Adjustment, mark: str) -> float:
    return float(adjustment.standard_deviations[adjustment.job.marks.index[mark], 2])


def height_covariance(adjustment: Adjustment, marks: list[str]) -> FloatArray:
    """Of the heights alone, in the order of `marks`, m²."""
    return adjustment.covariance(marks)[2::3, 2::3]


def difference_sd(adjustment: Adjustment, first: str, second: str) -> float:
    covariance = height_covariance(adjustment, [first, second])
    return float(np.sqrt(covariance[0, 0] + covariance[1, 1] - 2 * covariance[0, 1]))


def sigma(adjustment: Adjustment) -> float:
    assert adjustment.solution.variance_factor is not None
    return float(np.sqrt(adjustment.solution.variance_factor))


def column(adjustment: Adjustment, name: str) -> FloatArray:
    values: FloatArray = getattr(adjustment.residuals[0], name)[:, 0]
    return values


class TestEqualAndSetupWeights:
    """L1: in feet, unit weight one foot; printed figures that are misprints are named in the entry's `agrees`."""

    NET = NETS["L1"]

    def adjust(self, folder: Path, sds: list[float]) -> Adjustment:
        inputs = self.NET["inputs"]
        rows = [(o["frm"], o["to"], o["dh"], weight) for o, weight in zip(inputs["observations"], sds, strict=True)]
        return adjusted(
            folder,
            job=PLANE + POSTERIOR,
            marks=marks_table(inputs["fixed"], ["Q", "R"], "ft"),
            levels=table("from,to,rise_ft,sd_ft", rows),
        )

    @pytest.fixture
    def equal(self, tmp_path: Path) -> Adjustment:
        return self.adjust(tmp_path, [1.0] * 8)

    @pytest.fixture
    def by_setups(self, tmp_path: Path) -> Adjustment:
        """Weights 12 / setups."""
        return self.adjust(tmp_path, [float(np.sqrt(o["setups"] / 12)) for o in self.NET["inputs"]["observations"]])

    def test_printed_heights_and_observations(self, equal: Adjustment) -> None:
        printed = self.NET["published_outputs"]["unweighted"]
        assert equal.solution.degrees_of_freedom == printed["dof"]
        for mark, value in printed["H"].items():
            assert height(equal, mark) / FOOT == pytest.approx(value, rel=0, abs=1e-3 * HALF_DIGIT)  # ft
        np.testing.assert_allclose(
            column(equal, "adjusted") / FOOT, printed["adjusted_obs"], rtol=0, atol=1e-3 * HALF_DIGIT
        )
        assert sd(equal, "Q") / FOOT == pytest.approx(printed["sd"]["Q"], rel=0, abs=1e-3 * HALF_DIGIT)

    def test_printed_sigma_is_one_unit_low(self, equal: Adjustment) -> None:
        """Misprint: 0.028 is printed, 0.02905 follows; the sds that hang on it are one unit low with it."""
        assert sigma(equal) == pytest.approx(0.028, rel=0, abs=1.5e-3)  # ft
        assert sd(equal, "R") / FOOT == pytest.approx(0.014, rel=0, abs=1.5e-3)  # ft
        assert difference_sd(equal, "Q", "R") / FOOT == pytest.approx(0.017, rel=0, abs=1.5e-3)  # ft

    def test_printed_weighted_figures(self, by_setups: Adjustment) -> None:
        """The printed heights are a unit low from hand rounding; σ₀ and sds agree to the last digit."""
        printed = self.NET["published_outputs"]["weighted"]
        for mark, value in printed["H"].items():
            assert height(by_setups, mark) / FOOT == pytest.approx(value, rel=0, abs=1.5e-3)  # ft
            assert sd(by_setups, mark) / FOOT == pytest.approx(printed["sd"][mark], rel=0, abs=1e-3 * HALF_DIGIT)
        assert sigma(by_setups) == pytest.approx(printed["s0"], rel=0, abs=1e-3 * HALF_DIGIT)

    @pytest.mark.parametrize("case", ["unweighted", "weighted"])
    def test_recomputed_figures(self, case: str, equal: Adjustment, by_setups: Adjustment) -> None:
        check_recomputed({"unweighted": equal, "weighted": by_setups}[case], self.NET["recomputed_outputs"][case], FOOT)


class TestWeightsByLength:
    """L2: unit weight one kilometre, 5 mm/√km a priori, two-sided χ² test."""

    NET = NETS["L2"]

    def adjust(self, folder: Path, statistics: str) -> Adjustment:
        inputs = self.NET["inputs"]
        rows = [(o["frm"], o["to"], o["dh"], o["length_km"]) for o in inputs["observations"]]
        job = f"[instruments.N]\nlevel_mm_per_sqrt_km = {inputs['test']['a_priori_sigma_mm_per_sqrt_km']}\n"
        return adjusted(
            folder,
            job=f'{PLANE}[defaults]\ninstrument = "N"\n{job}{statistics}',
            marks=marks_table(inputs["fixed"], ["P1", "P2", "P3"]),
            levels=table("from,to,rise_m,length_km", rows),
        )

    @pytest.fixture
    def net(self, tmp_path: Path) -> Adjustment:
        return self.adjust(tmp_path, POSTERIOR)

    def test_printed_heights_and_corrections(self, net: Adjustment) -> None:
        printed = self.NET["published_outputs"]
        for mark, value in printed["H"].items():
            assert height(net, mark) == pytest.approx(value, rel=0, abs=1e-3 * HALF_DIGIT)  # m
        for line, value in printed["corrections_mm"].items():
            found = column(net, "residual")[int(line[1:]) - 1] / MILLIMETRE
            assert found == pytest.approx(value, rel=0, abs=1e-3 * HALF_DIGIT)  # mm

    def test_printed_global_test(self, net: Adjustment) -> None:
        printed, test = self.NET["published_outputs"], net.solution.global_test
        assert test.statistic == pytest.approx(printed["chi2"], rel=0, abs=1e-4 * HALF_DIGIT)
        assert test.lower == pytest.approx(printed["chi2_bounds"][0], rel=0, abs=1e-3 * HALF_DIGIT)
        assert test.upper == pytest.approx(printed["chi2_bounds"][1], rel=0, abs=0.05)  # printed 11.1
        assert test.passed is printed["chi2_accepted"]

    def test_printed_precision(self, net: Adjustment) -> None:
        """Printed sds carry σ₀ rounded to 2.98 mm and cofactors rounded or cut to four digits; that of h5 to two."""
        printed = self.NET["published_outputs"]
        s0 = sigma(net) * 5.0
        assert s0 == pytest.approx(printed["s0_mm"], rel=0, abs=1e-2 * HALF_DIGIT)  # mm
        for mark, value in printed["sd_H_mm"].items():
            rounded = sd(net, mark) / MILLIMETRE * printed["s0_mm"] / s0
            assert rounded == pytest.approx(value, rel=0, abs=1.5e-4)  # mm
        cofactor = (difference_sd(net, "P1", "P2") / MILLIMETRE / s0) ** 2
        assert cofactor == pytest.approx(printed["cofactor_adjusted_h5"], rel=0, abs=1e-2 * HALF_DIGIT)

    def test_misprints(self, net: Adjustment) -> None:
        """[pvv] is printed 35.47 for 35.573; the printed sd of P2 − P3, 3.3129 mm, leaves out their covariance."""
        recomputed = self.NET["recomputed_outputs"]
        square_sum = net.solution.global_test.statistic * 25.0
        assert square_sum == pytest.approx(recomputed["vPv_mm2"], rel=0, abs=1e-9)  # mm²
        assert square_sum == pytest.approx(35.47, rel=0, abs=0.15)
        found = difference_sd(net, "P2", "P3") / MILLIMETRE
        assert found == pytest.approx(recomputed["sd_P2_minus_P3_mm"], rel=0, abs=1e-9)  # mm
        neglecting = np.hypot(sd(net, "P2"), sd(net, "P3")) / MILLIMETRE
        assert neglecting == pytest.approx(3.3129, rel=0, abs=3e-3)  # mm, σ₀ rounded as above

    def test_recomputed_figures(self, net: Adjustment) -> None:
        check_recomputed(net, self.NET["recomputed_outputs"], 1.0, unit_weight=0.005)


class TestFifteenDigits:
    """L3: exact rationals, printed to 15 digits."""

    NET = NETS["L3"]

    @pytest.fixture
    def net(self, tmp_path: Path) -> Adjustment:
        inputs = self.NET["inputs"]
        rows = [(o["frm"], o["to"], o["dh"], 1) for o in inputs["observations"]]
        return adjusted(
            tmp_path,
            job=PLANE + POSTERIOR,
            marks=marks_table(inputs["fixed"], ["1", "2", "3"]),
            levels=table("from,to,rise_m,sd_m", rows),
        )

    def test_printed_residuals_and_observations(self, net: Adjustment) -> None:
        printed = self.NET["published_outputs"]
        residuals = np.array(printed["V"], dtype=float)
        observations = np.array(printed["adjusted_obs"], dtype=float)
        np.testing.assert_allclose(column(net, "residual"), residuals, rtol=0, atol=2e-15 * 12)  # m: of heights of 12 m
        np.testing.assert_allclose(column(net, "adjusted"), observations, rtol=0, atol=2e-15 * 12)  # m
        assert net.solution.degrees_of_freedom == printed["r"]
        assert sigma(net) == pytest.approx(float(printed["s0"]), rel=1e-11)  # 12-metre heights leave 1e-15 m of 5 mm

    def test_printed_cofactors(self, net: Adjustment) -> None:
        cofactors = height_covariance(net, ["1", "2", "3"]) / sigma(net) ** 2
        printed = np.array(self.NET["published_outputs"]["N_inverse"], dtype=float)
        np.testing.assert_allclose(cofactors, printed, rtol=0, atol=1e-15)

    def test_recomputed_figures(self, net: Adjustment) -> None:
        check_recomputed(net, self.NET["recomputed_outputs"], 1.0)


def check_recomputed(net: Adjustment, expected: dict[str, Any], unit: float, unit_weight: float | None = None) -> None:
    """Every recomputed figure; `unit` metres, observations of unit weight with an sd of `unit_weight` metres."""
    one = unit if unit_weight is None else unit_weight
    tolerance = 1e-12  # in the entry's unit: inputs of hundreds of feet
    for mark, value in expected["heights"].items():
        assert height(net, mark) / unit == pytest.approx(value, rel=0, abs=tolerance)
        assert sd(net, mark) / unit == pytest.approx(expected["height_sd_post"][mark], rel=0, abs=tolerance)
    np.testing.assert_allclose(column(net, "residual") / unit, expected["residuals"], rtol=0, atol=tolerance)
    np.testing.assert_allclose(column(net, "adjusted") / unit, expected["adjusted_obs"], rtol=0, atol=tolerance)
    further = expected["derived_not_published"]
    np.testing.assert_allclose(column(net, "redundancy"), further["redundancy_numbers"], rtol=0, atol=1e-14)
    np.testing.assert_allclose(column(net, "w") * one / unit, further["w_apriori_unit_sigma"], rtol=0, atol=1e-11)
    np.testing.assert_allclose(column(net, "tau"), further["tau_pope"], rtol=0, atol=1e-9)
    cofactors = height_covariance(net, list(expected["heights"])) / (sigma(net) * one) ** 2
    np.testing.assert_allclose(cofactors, expected["Qxx"], rtol=0, atol=1e-13)
    assert net.solution.global_test.statistic * (one / unit) ** 2 == pytest.approx(expected["vPv"], rel=1e-10)
    assert net.solution.degrees_of_freedom == expected["dof"]


class TestFreeNetwork:
    """F1: a loop of three marks on inner constraints."""

    NET = NETS["F1"]

    @pytest.fixture
    def net(self, tmp_path: Path) -> Adjustment:
        inputs = self.NET["inputs"]
        return adjusted(
            tmp_path,
            job=f'{PLANE}[datum]\nmode = "inner"\n{POSTERIOR}',
            marks=table("mark,height_m", inputs["X0"].items()),
            levels=table("from,to,rise_m,sd_m", [(o["frm"], o["to"], o["dh"], 1) for o in inputs["observations"]]),
        )

    def test_printed_heights_and_corrections(self, net: Adjustment) -> None:
        printed = self.NET["published_outputs"]
        for mark, value in printed["H"].items():
            assert height(net, mark) == pytest.approx(value, rel=0, abs=1e-14)  # m: the printed figures are exact
        v, corrected = column(net, "residual"), column(net, "adjusted")
        np.testing.assert_allclose(v, np.array(printed["v_mm"]) * MILLIMETRE, rtol=0, atol=1e-14)  # m
        np.testing.assert_allclose(corrected, printed["adjusted_obs"], rtol=0, atol=1e-14)  # m

    def test_printed_cofactors(self, net: Adjustment) -> None:
        cofactors = height_covariance(net, ["1", "2", "3"]) / sigma(net) ** 2
        printed = self.NET["published_outputs"]["Qxx"]
        diagonal, beside = float(Fraction(printed["diag"])), float(Fraction(printed["off"]))
        expected = np.full((3, 3), beside) + (diagonal - beside) * np.eye(3)
        np.testing.assert_allclose(cofactors, expected, rtol=0, atol=1e-15)

    def test_recomputed_figures(self, net: Adjustment) -> None:
        expected = self.NET["recomputed_outputs"]
        assert net.solution.datum_defect == 1
        assert net.solution.degrees_of_freedom == expected["dof"]
        assert sigma(net) == pytest.approx(expected["s0"], rel=1e-12)
        np.testing.assert_allclose(net.standard_deviations[:, 2], expected["sd_H_post"], rtol=0, atol=1e-15)  # m
        np.testing.assert_allclose(column(net, "redundancy"), expected["redundancy_numbers"], rtol=0, atol=1e-14)


DESIGNS = {name: entry for name, entry in NETS.items() if name.startswith("C1")}
"""NIST difference designs: item i minus item j is the height of mark i above mark j; a row i − (j + k) is made one by
the marks S = x₄ + x₅ and D = 2x₄ in place of 4 and 5, so that x₄ − x₅ = D − S."""


class Design:
    """A difference design as a level net."""

    def __init__(self, entry: dict[str, Any]) -> None:
        self.entry = entry
        self.rows = np.array(entry["inputs"]["observation_rows"])
        self.restraint = np.array(entry["inputs"]["restraint"])
        self.items = self.rows.shape[1]
        self.to_marks = np.eye(self.items)
        if np.any(np.abs(self.rows).sum(axis=1) > 2):
            self.to_marks[3:] = [[0, 0, 0, 1, 1], [0, 0, 0, 2, 0]]
        self.from_marks = np.linalg.inv(self.to_marks)
        self.lines = self.rows @ self.from_marks

    def adjust(self, folder: Path, readings: FloatArray, held: float) -> Adjustment:
        """Adjust readings of unit sd; the restrained items sum to `held`."""
        names = [str(item) for item in range(1, self.items + 1)]
        carriers = [name for name, part in zip(names, self.restraint, strict=True) if part]
        given = [held / len(carriers) if name in carriers else None for name in names]
        fixed = len(carriers) == 1
        control = ["fixed" if fixed and name in carriers else None for name in names]
        datum = "" if fixed else f'[datum]\nmode = "inner"\nmarks = {carriers}\n'.replace("'", '"')
        ends = [(names[np.argmin(line)], names[np.argmax(line)]) for line in self.lines]
        return adjusted(
            folder,
            job=PLANE + datum,
            marks=table("mark,height_m,height_control", zip(names, given, control, strict=True)),
            levels=table("from,to,rise_m,sd_m", [(*end, y, 1) for end, y in zip(ends, readings.tolist(), strict=True)]),
        )

    def items_of(self, net: Adjustment) -> FloatArray:
        values: FloatArray = self.from_marks @ net.coordinates[:, 2]
        return values

    def covariance_of(self, net: Adjustment) -> FloatArray:
        joint = height_covariance(net, list(net.job.marks.names))
        covariance: FloatArray = self.from_marks @ joint @ self.from_marks.T
        return covariance


@pytest.mark.parametrize("name", DESIGNS)
def test_each_line_of_a_design_joins_two_marks(name: str) -> None:
    lines = Design(DESIGNS[name]).lines
    np.testing.assert_array_equal(np.sort(lines, axis=1)[:, [0, -1]], np.tile([-1, 1], (len(lines), 1)))
    np.testing.assert_array_equal(np.abs(lines).sum(axis=1), 2)


@pytest.mark.parametrize("name", DESIGNS)
def test_certified_solution_of_a_design(name: str, tmp_path: Path) -> None:
    """Items are the certified combination of readings and restraint."""
    design = Design(DESIGNS[name])
    readings = np.random.default_rng(7).normal(0.0, 1.0, len(design.rows))
    held = 4.25
    items = design.items_of(design.adjust(tmp_path, readings, held))
    matrix = np.array([[float(Fraction(cell)) for cell in row] for row in solution_matrix(design.entry)])
    share = np.array([float(Fraction(cell)) for cell in design.entry["recomputed_outputs"]["Rstar"]])
    np.testing.assert_allclose(items, readings @ matrix + share * held, rtol=0, atol=1e-14)


def solution_matrix(entry: dict[str, Any]) -> list[list[str]]:
    """As certified where the catalogue's page prints it over a common divisor, else recomputed."""
    printed, divisor = (
        entry["published_outputs"]["solution_matrix_times_divisor"],
        entry["published_outputs"]["divisor"],
    )
    if printed is None:
        recomputed: list[list[str]] = entry["recomputed_outputs"]["solution_matrix"]
        return recomputed
    return [[f"{cell}/{divisor}" for cell in row] for row in printed]


@pytest.mark.parametrize("name", DESIGNS)
def test_certified_precision_of_a_design(name: str, tmp_path: Path) -> None:
    """The certified factors K1, to four digits: sds of items and of sums of items, in sds of one reading."""
    design = Design(DESIGNS[name])
    readings = np.random.default_rng(8).normal(0.0, 1.0, len(design.rows))
    net = design.adjust(tmp_path, readings, 4.25)
    covariance = design.covariance_of(net)
    printed = design.entry["published_outputs"]
    combinations = np.array(printed["K1_combinations"])
    sds = np.sqrt(np.einsum("ki,ij,kj->k", combinations, covariance, combinations))
    np.testing.assert_allclose(sds, printed["K1_factors"], rtol=0, atol=1e-4 * HALF_DIGIT)
    exact = np.array([[float(Fraction(cell)) for cell in row] for row in design.entry["recomputed_outputs"]["Qxx"]])
    np.testing.assert_allclose(covariance, exact, rtol=0, atol=1e-14)
    assert net.solution.degrees_of_freedom == printed["dof"]

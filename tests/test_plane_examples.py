"""Published plane networks by least squares: a link traverse, a trilateration, a braced quadrilateral of directions.

Sources stand in tests/data/plane_networks.json. Where its entries say that results were recomputed there, the source
prints none that could be read, and the figures are an independent solution.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from adjust import Adjustment
from adjust.arrays import FloatArray
from adjust.units import ARCSEC, DEGREE, parse_dms
from tests.published import adjusted, published, table

NETWORKS = published("plane_networks.json")
PLANE = '[frame]\nkind = "plane"\n'
HALF_DIGIT = 0.5 + 1e-6
"""Of the last printed digit."""


def values(net: Adjustment, kind: str, name: str) -> FloatArray:
    """One column of the residuals of a kind."""
    (rows,) = (rows for rows in net.residuals if rows.observations.kind == kind)
    column: FloatArray = getattr(rows, name)[:, 0]
    return column


def plan(net: Adjustment, mark: str) -> FloatArray:
    """Easting and northing."""
    place: FloatArray = net.coordinates[net.job.marks.index[mark], :2]
    return place


def check_ellipse(net: Adjustment, mark: str, expected: list[float], metres: float, degrees: float) -> None:
    """Semi-axes and azimuth of a standard ellipse."""
    row = net.job.marks.index[mark]
    ellipses = net.ellipses
    assert ellipses.semi_major[row] == pytest.approx(expected[0], rel=0, abs=metres)
    assert ellipses.semi_minor[row] == pytest.approx(expected[1], rel=0, abs=metres)
    assert ellipses.azimuth[row] / DEGREE == pytest.approx(expected[2], rel=0, abs=degrees)


def marks_table(fixed: dict[str, list[float]], free: dict[str, list[float] | None], unit: str = "m") -> str:
    """`fixed` and `free` hold easting and northing."""
    rows = [(name, *place, "fixed") for name, place in fixed.items()]
    rows += [(name, *(place or (None, None)), None) for name, place in free.items()]
    return table(f"mark,easting_{unit},northing_{unit},plan_control", rows)


class TestLinkTraverse:
    """P01: five angles and four distances between two known lines; axes north, east in the entry."""

    ENTRY = NETWORKS["P01-W554"]

    @pytest.fixture
    def net(self, tmp_path: Path) -> Adjustment:
        inputs = self.ENTRY["inputs"]["equivalent_coordinate_network"]
        distances = [(d["from"], d["to"], d["value"], 0.0005 * d["value"] ** 0.5) for d in inputs["distances_m"]]
        angles = [(a["at"], a["from"], a["to"], a["value"], a["sd_arcsec"]) for a in inputs["angles_dms"]]
        return adjusted(
            tmp_path,
            job=PLANE,
            marks=marks_table({n: p[::-1] for n, p in inputs["fixed"].items()}, dict.fromkeys(["T2", "T3", "T4"])),
            angles=table("at,from,to,angle_dms,sd_arcsec", angles),
            distances=table("at,to,horizontal_m,sd_m", distances),
        )

    def test_printed_residuals(self, net: Adjustment) -> None:
        printed = self.ENTRY["published_outputs"]
        angles = values(net, "angle", "residual") / ARCSEC
        np.testing.assert_allclose(angles, printed["v_angles_arcsec"], rtol=0, atol=1e-2 * HALF_DIGIT)  # arcsec
        distances = values(net, "horizontal_distance", "residual") * 1000
        np.testing.assert_allclose(distances, printed["v_distances_mm"], rtol=0, atol=1e-2 * HALF_DIGIT)  # mm

    def test_printed_adjusted_observations(self, net: Adjustment) -> None:
        printed = self.ENTRY["published_outputs"]
        angles = [parse_dms(angle) * DEGREE for angle in printed["adjusted_angles_dms"]]
        np.testing.assert_allclose(values(net, "angle", "adjusted"), angles, rtol=0, atol=0.1 * HALF_DIGIT * ARCSEC)
        distances = values(net, "horizontal_distance", "adjusted")
        np.testing.assert_allclose(distances, printed["adjusted_distances_m"], rtol=0, atol=1e-3 * HALF_DIGIT)  # m

    def test_recomputed_figures(self, net: Adjustment) -> None:
        """The reconstructed control is rounded to a micrometre, which the residuals feel in their fourth decimal."""
        recomputed = self.ENTRY["recomputed_outputs"]
        angles = values(net, "angle", "residual") / ARCSEC
        np.testing.assert_allclose(angles, recomputed["v_angles_arcsec"], rtol=0, atol=1e-3)  # arcsec
        distances = values(net, "horizontal_distance", "residual") * 1000
        np.testing.assert_allclose(distances, recomputed["v_distances_mm"], rtol=0, atol=1e-3)  # mm
        for mark, place in recomputed["coordinates"].items():
            np.testing.assert_allclose(plan(net, mark), place[::-1], rtol=0, atol=6e-6)  # m: printed to 0.01 mm
        assert net.solution.degrees_of_freedom == recomputed["dof"]
        assert net.solution.variance_factor is not None
        assert net.solution.variance_factor**0.5 == pytest.approx(recomputed["s0_with_equivalent_sds"], rel=0, abs=6e-5)

    def test_recomputed_ellipses(self, net: Adjustment) -> None:
        for mark, ellipse in self.ENTRY["recomputed_outputs"]["ellipses_apriori_m_deg"].items():
            check_ellipse(net, mark, ellipse, metres=6e-7, degrees=2e-3)


class TestTrilateration:
    """P02: one point from four known ones, real distances reduced to the grid."""

    ENTRY = NETWORKS["P02-KF"]
    NEAR = (48565.0, 6059.0)

    def adjust(self, folder: Path, known: list[str], job: str = PLANE) -> Adjustment:
        inputs = self.ENTRY["inputs"]
        distances = [(mark, "N", inputs["distances_to_N"][mark], 1) for mark in known]
        return adjusted(
            folder,
            job=job,
            marks=marks_table({mark: inputs["fixed"][mark] for mark in known}, {"N": [*self.NEAR]}),
            distances=table("at,to,horizontal_m,sd_m", distances),
        )

    @pytest.fixture
    def net(self, tmp_path: Path) -> Adjustment:
        return self.adjust(tmp_path, ["P1", "P2", "P3", "P4"], PLANE + '[statistics]\nsd_basis = "posterior"\n')

    @pytest.mark.parametrize("pair", ENTRY["published_outputs"]["pairwise_intersections"])
    def test_printed_intersections(self, pair: str, tmp_path: Path) -> None:
        """Two distances each: no check on them, and the point follows to the last digit."""
        printed = self.ENTRY["published_outputs"]["pairwise_intersections"][pair]
        recomputed = self.ENTRY["recomputed_outputs"]["pairwise_intersections"][pair]
        net = self.adjust(tmp_path, pair.split("-"))
        expected = [there if there is not None else again for there, again in zip(printed, recomputed, strict=True)]
        np.testing.assert_allclose(plan(net, "N"), expected, rtol=0, atol=1e-4 * HALF_DIGIT)  # m
        assert net.solution.degrees_of_freedom == 0
        assert net.solution.variance_factor is None

    def test_recomputed_point(self, net: Adjustment) -> None:
        expected = self.ENTRY["recomputed_outputs"]["least_squares_equal_weights"]
        np.testing.assert_allclose(plan(net, "N"), expected["N"], rtol=0, atol=6e-6)  # m: printed to 0.01 mm
        residuals = values(net, "horizontal_distance", "residual") * 1000
        np.testing.assert_allclose(residuals, expected["v_mm"], rtol=0, atol=1e-3 * HALF_DIGIT)  # mm
        assert net.solution.degrees_of_freedom == expected["dof"]

    def test_recomputed_precision(self, net: Adjustment) -> None:
        expected = self.ENTRY["recomputed_outputs"]["least_squares_equal_weights"]
        assert net.solution.variance_factor is not None
        assert net.solution.variance_factor**0.5 == pytest.approx(expected["s0_m"], rel=0, abs=1e-7 * HALF_DIGIT)
        row = net.job.marks.index["N"]
        covariance = net.mark_covariances[row, :2, :2]
        np.testing.assert_allclose(
            covariance / net.solution.variance_factor, expected["Q"], rtol=0, atol=1e-6 * HALF_DIGIT
        )
        np.testing.assert_allclose(net.standard_deviations[row, :2], expected["sd_m"], rtol=0, atol=1e-6 * HALF_DIGIT)

    def test_recomputed_ellipse(self, net: Adjustment) -> None:
        """The entry counts the direction from the first axis, easting, counter-clockwise; azimuths count from north."""
        ellipse = self.ENTRY["recomputed_outputs"]["least_squares_equal_weights"]["ellipse_aposteriori_m"]
        azimuth = (90.0 - ellipse["direction_of_a_from_first_axis_deg"]) % 180.0
        check_ellipse(net, "N", [ellipse["a"], ellipse["b"], azimuth], metres=6e-7, degrees=6e-4)


class TestBracedQuadrilateral:
    """Q01: four rounds of three directions; two stations held a kilometre apart give it place, turn and size."""

    ENTRY = NETWORKS["Q01-MA75"]

    @pytest.fixture
    def net(self, tmp_path: Path) -> Adjustment:
        rounds: list[dict[str, Any]] = self.ENTRY["inputs"]["direction_sets"]
        rows = [
            (f"round {r['at']}", r["at"], to, value, 1)
            for r in rounds
            for to, value in zip(r["targets"], r["dms"], strict=True)
        ]
        return adjusted(
            tmp_path,
            job=PLANE,
            marks=marks_table({"S1": [0, 0], "S2": [1000, 0]}, dict.fromkeys(["S3", "S4"])),
            directions=table("setup,at,to,direction_dms,sd_arcsec", rows),
        )

    def test_residuals(self, net: Adjustment) -> None:
        expected = self.ENTRY["recomputed_outputs"]
        residuals = values(net, "direction", "residual") / ARCSEC
        np.testing.assert_allclose(residuals, expected["v_directions_arcsec"], rtol=0, atol=1e-4 * HALF_DIGIT)  # arcsec
        assert net.solution.global_test.statistic == pytest.approx(
            expected["vPv_arcsec2"], rel=0, abs=1e-5 * HALF_DIGIT
        )
        assert net.solution.degrees_of_freedom == expected["dof"]

    def test_angles_between_neighbouring_directions(self, net: Adjustment) -> None:
        """Directions with an orientation unknown are the same adjustment as angles with their full covariance."""
        expected = self.ENTRY["recomputed_outputs"]
        steps = np.diff(values(net, "direction", "adjusted").reshape(4, 3), axis=1).ravel() % (2 * np.pi)
        angles = [parse_dms(angle) * DEGREE for angle in expected["angles_adjusted"]]
        np.testing.assert_allclose(steps, angles, rtol=0, atol=1e-2 * HALF_DIGIT * ARCSEC)
        corrections = np.diff(values(net, "direction", "residual").reshape(4, 3), axis=1).ravel() / ARCSEC
        np.testing.assert_allclose(corrections, expected["v_angles_arcsec"], rtol=0, atol=1e-4 * HALF_DIGIT)  # arcsec

    def test_coordinates_and_ellipses(self, net: Adjustment) -> None:
        expected = self.ENTRY["recomputed_outputs"]
        for mark, place in expected["coordinates_on_1000m_base"].items():
            np.testing.assert_allclose(plan(net, mark), place[::-1], rtol=0, atol=6e-6)  # m: printed to 0.01 mm
        for mark, ellipse in expected["ellipses_1arcsec_m_deg"].items():
            check_ellipse(net, mark, ellipse, metres=6e-8, degrees=6e-4)

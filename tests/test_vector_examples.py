"""A GNSS net of five vectors with full covariances, against its solution in exact rational arithmetic.

The inputs are published (source in tests/data/vectors.json), their published answer could not be read: the expected
figures are the collection's own exact solution, in geocentric axes.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from adjust import Adjustment
from adjust.arrays import FloatArray
from adjust.frames import EllipsoidFrame
from tests.published import adjusted, published, table

NET = published("vectors.json")["G2"]
EXPECTED = NET["recomputed_outputs"]
FRAME = EllipsoidFrame("EPSG:4326")
FREE = ["B", "C"]
COVARIANCE_COLUMNS = "cov_xx_m2,cov_xy_m2,cov_xz_m2,cov_yy_m2,cov_yz_m2,cov_zz_m2"
HALF_DIGIT = 5e-8
"""Metres: coordinates are printed to 1e-7."""
NANOMETRES = 5e-9
"""Metres: geocentric coordinates of six million metres carry 1e-9, and go once to latitude and longitude and back."""


def control_rows() -> list[tuple[object, ...]]:
    """Fixed marks as latitude, longitude and height, which is how a mark is given."""
    fixed = NET["inputs"]["fixed"]
    places = FRAME.from_geocentric(np.array(list(fixed.values())))
    return [
        (name, np.degrees(latitude), np.degrees(longitude), height, "fixed", "fixed")
        for name, (longitude, latitude, height) in zip(fixed, places.tolist(), strict=True)
    ]


def adjust_net(folder: Path, basis: str) -> Adjustment:
    upper = np.triu_indices(3)
    vectors = [(v["frm"], v["to"], *v["d"], *np.array(v["cov_m2"])[upper].tolist()) for v in NET["inputs"]["baselines"]]
    return adjusted(
        folder,
        job=f'[frame]\nkind = "ellipsoid"\ncrs = "{FRAME.crs}"\nheights = "ellipsoidal"\n'
        f'[statistics]\nsd_basis = "{basis}"\n',
        marks=table(
            "mark,latitude_deg,longitude_deg,height_m,plan_control,height_control",
            [*control_rows(), *[(name, None, None, None, None, None) for name in FREE]],
        ),
        vectors=table(f"from,to,dx_m,dy_m,dz_m,{COVARIANCE_COLUMNS}", vectors),
    )


@pytest.fixture
def net(tmp_path: Path) -> Adjustment:
    return adjust_net(tmp_path, "prior")


def geocentric_covariance(net: Adjustment) -> FloatArray:
    """Joint covariance (6, 6) of the free marks' X, Y, Z, m². Easting and northing are east and north here."""
    rows = [net.job.marks.index[name] for name in FREE]
    axes = FRAME.axes(net.coordinates[rows])
    turn = np.zeros((6, 6))
    turn[:3, :3], turn[3:, 3:] = axes[0].T, axes[1].T
    covariance: FloatArray = turn @ net.covariance(FREE) @ turn.T
    return covariance


def test_coordinates(net: Adjustment) -> None:
    positions = FRAME.geocentric(net.coordinates)
    for name in FREE:
        expected = np.array(EXPECTED["adjusted"][name], dtype=float)
        np.testing.assert_allclose(positions[net.job.marks.index[name]], expected, rtol=0, atol=HALF_DIGIT + NANOMETRES)


def test_residuals(net: Adjustment) -> None:
    printed_to = 1e-9
    np.testing.assert_allclose(net.residuals[0].residual, EXPECTED["residuals"], rtol=0, atol=printed_to + NANOMETRES)


def test_precision(net: Adjustment, tmp_path: Path) -> None:
    posterior = adjust_net(tmp_path / "posterior", "posterior")
    for basis, adjustment in (("sd_apriori", net), ("sd_aposteriori", posterior)):
        sds = np.sqrt(np.diag(geocentric_covariance(adjustment)))
        expected = np.concatenate([EXPECTED[basis][name] for name in FREE])
        np.testing.assert_allclose(sds, expected, rtol=0, atol=2e-10)  # m: cut to 1e-10, with σ₀ to 1e-8 of itself


def test_joint_covariance(net: Adjustment) -> None:
    expected = np.array(EXPECTED["Qxx"])
    np.testing.assert_allclose(geocentric_covariance(net), expected, rtol=0, atol=1e-14)  # m²: printed to 1e-15


def test_fit(net: Adjustment) -> None:
    """9 degrees of freedom; the test fails as it should: the input covariances are too small by 2.6."""
    solution, test = net.solution, EXPECTED["global_test_95"]
    assert solution.degrees_of_freedom == EXPECTED["dof"]
    assert solution.global_test.statistic == pytest.approx(EXPECTED["vPv"], rel=0, abs=1e-4)  # from nanometres in mm
    assert solution.variance_factor == pytest.approx(EXPECTED["s0_squared"], rel=0, abs=1e-5)
    assert solution.global_test.lower == pytest.approx(test["lower"], rel=1e-12)
    assert solution.global_test.upper == pytest.approx(test["upper"], rel=1e-12)
    assert solution.global_test.passed is test["accepted"]


def test_redundancy_of_each_vector(net: Adjustment) -> None:
    """The three components of a vector share its redundancy."""
    shares = net.residuals[0].redundancy.sum(axis=1)
    np.testing.assert_allclose(shares, EXPECTED["redundancy_per_baseline"], rtol=0, atol=1e-9)

"""The whole adjustment against scipy.optimize.least_squares and dense algebra, on invented networks in both frames.

The reference shares the predicted values with the adjustment and nothing else: its own unknowns, numerical
derivatives, trust-region steps, a dense inverse. The predicted values are checked elsewhere, against PROJ and numbers
worked out apart.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cache, cached_property

import numpy as np
import pytest
from scipy.linalg import block_diag
from scipy.optimize import least_squares

from adjust import Adjustment, Job, adjust
from adjust.arrays import FloatArray
from adjust.frames import Geometry
from adjust.simulate import NETWORKS, observe, true_geometry

SEED = 11
METRES = 2e-8
"""Coordinates: what a last step of less than 0.01 mm leaves of a network's curvature."""
RELATIVE = 2e-6
"""Covariances, in sds of their row and column: derivatives by central differences are good to about 1e-8 of themselves,
and a condition number of about a hundred lies between them and the covariance."""
STEP = 0.05
"""Metres (and radians, in which predictions are linear): geocentric coordinates carry 1e-9 m, which leaves 1e-8 of a
derivative; the curvature over it leaves as little on lines of a hundred metres."""


@dataclass(frozen=True)
class Reference:
    """One job solved by a general-purpose optimiser, from the true coordinates on."""

    job: Job
    start: Geometry
    orientations: FloatArray
    ours: Adjustment

    @cached_property
    def coordinates_sought(self) -> int:
        return int(np.count_nonzero(self.ours.unknowns.sought))

    def geometry(self, unknowns: FloatArray) -> Geometry:
        corrections = np.zeros(self.ours.unknowns.sought.shape)
        corrections[self.ours.unknowns.sought] = unknowns[: self.coordinates_sought]
        return self.start.moved(corrections)

    @cached_property
    def factors(self) -> list[FloatArray]:
        """Cholesky factors of the a-priori covariances at the adjusted marks."""
        return [np.linalg.cholesky(rows.covariance(self.ours.geometry)) for rows in self.job.observations]

    def residuals(self, unknowns: FloatArray) -> FloatArray:
        """Predicted minus observed, each row divided by its Cholesky factor."""
        geometry = self.geometry(unknowns)
        orientations = self.orientations + unknowns[self.coordinates_sought :]
        parts = []
        for rows, factor in zip(self.job.observations, self.factors, strict=True):
            difference = rows.predict(geometry) - rows.observed
            if rows.setup is not None:
                difference = difference - orientations[rows.setup][:, None]
            if rows.unit == "rad":
                difference = (difference + np.pi) % (2 * np.pi) - np.pi
            parts.append(np.linalg.solve(factor, difference[:, :, None]).ravel())
        return np.concatenate(parts)

    def derivatives(self, unknowns: FloatArray) -> FloatArray:
        """Central differences over ±`STEP`."""
        steps = STEP * np.eye(len(unknowns))
        columns = [self.residuals(unknowns + step) - self.residuals(unknowns - step) for step in steps]
        return np.column_stack(columns) / (2 * STEP)

    @cached_property
    def solution(self) -> tuple[FloatArray, FloatArray]:
        """Unknowns and the matrix of derivatives there."""
        found = least_squares(
            self.residuals,
            np.zeros(self.coordinates_sought + len(self.job.setups)),
            jac=self.derivatives,
            x_scale="jac",
            xtol=1e-15,
            ftol=1e-15,
            gtol=1e-15,
        )
        return found.x, found.jac

    @cached_property
    def covariance(self) -> FloatArray:
        jacobian = self.solution[1]
        inverse: FloatArray = np.linalg.inv(jacobian.T @ jacobian)
        return inverse

    @cached_property
    def leverage(self) -> list[FloatArray]:
        """Diagonal blocks of the hat matrix by kind: (rows, components, components)."""
        jacobian = self.solution[1]
        hat = jacobian @ self.covariance @ jacobian.T
        blocks, first = [], 0
        for rows in self.job.observations:
            size = len(rows.components)
            starts = range(first, first + size * len(rows), size)
            blocks.append(np.array([hat[row : row + size, row : row + size] for row in starts]))
            first += size * len(rows)
        return blocks

    def mark_covariances(self) -> FloatArray:
        """(n, 3, 3) along the grid's axes; 0 where a coordinate is not an unknown."""
        sought = self.ours.unknowns.sought
        full = np.zeros((sought.size, sought.size))
        places = np.flatnonzero(sought.ravel())
        full[np.ix_(places, places)] = self.covariance[: len(places), : len(places)]
        rotation = np.nan_to_num(self.job.frame.grid_rotation(self.ours.coordinates))
        axes = [grid_axes(angle) for angle in rotation.tolist()]
        turned = block_diag(*axes) @ full @ block_diag(*axes).T
        return np.array([turned[row : row + 3, row : row + 3] for row in range(0, len(turned), 3)])


def grid_axes(azimuth: float) -> FloatArray:
    """Rows: the grid's east, north and up along east, north, up; `azimuth` is that of grid north."""
    sine, cosine = np.sin(azimuth), np.cos(azimuth)
    return np.array([[cosine, -sine, 0.0], [sine, cosine, 0.0], [0.0, 0.0, 1.0]])


@cache
def reference(name: str) -> Reference:
    plan = NETWORKS[name](np.random.default_rng(SEED))
    job, truth = observe(plan, np.random.default_rng(SEED + 100), start_sd=0.2)
    return Reference(job, true_geometry(plan), truth.orientations, adjust(job))


every = pytest.mark.parametrize("name", NETWORKS)


@every
def test_coordinates_agree(name: str) -> None:
    ref = reference(name)
    expected = ref.geometry(ref.solution[0]).coordinates
    apart = ref.job.frame.displacement(expected, ref.ours.coordinates)
    np.testing.assert_allclose(apart[ref.ours.unknowns.sought], 0.0, rtol=0, atol=METRES)


@every
def test_orientations_agree(name: str) -> None:
    ref = reference(name)
    expected = ref.orientations + ref.solution[0][ref.coordinates_sought :]
    apart = (ref.ours.orientations - expected + np.pi) % (2 * np.pi) - np.pi
    np.testing.assert_allclose(apart, 0.0, rtol=0, atol=1e-10)  # rad: METRES over the shortest sights


@every
def test_weighted_square_sums_agree(name: str) -> None:
    ref = reference(name)
    expected = float(np.sum(ref.residuals(ref.solution[0]) ** 2))
    assert ref.ours.solution.global_test.statistic == pytest.approx(expected, rel=1e-7)  # weights of a last step away
    assert ref.ours.solution.degrees_of_freedom == len(ref.solution[1]) - len(ref.solution[0])


@every
def test_covariances_agree(name: str) -> None:
    """Element by element, measured in the sds of their row and column."""
    ref = reference(name)
    ours, expected = np.nan_to_num(ref.ours.mark_covariances), ref.mark_covariances()
    sd = np.sqrt(np.einsum("nii->ni", expected))
    scale = np.where(sd > 0, sd, 1.0)
    difference = (ours - expected) / (scale[:, :, None] * scale[:, None, :])
    np.testing.assert_allclose(difference, 0.0, rtol=0, atol=RELATIVE)


@every
def test_redundancies_agree(name: str) -> None:
    """For a vector, of its three components together: singly they depend on what a component's own error means."""
    ref = reference(name)
    for ours, leverage in zip(ref.ours.residuals, ref.leverage, strict=True):
        expected = leverage.shape[1] - np.einsum("rii->r", leverage)
        np.testing.assert_allclose(ours.redundancy.sum(axis=1), expected, rtol=0, atol=RELATIVE)


@every
def test_residual_tests_agree(name: str) -> None:
    """w = cᵀPv / √(cᵀPQ_vvPc) from the dense matrices, for every component."""
    ref = reference(name)
    whitened, first = ref.residuals(ref.solution[0]), 0
    for ours, leverage, factor in zip(ref.ours.residuals, ref.leverage, ref.factors, strict=True):
        size = leverage.shape[1]
        v = whitened[first : first + len(leverage) * size].reshape(-1, size)
        first += len(leverage) * size
        inverse = np.linalg.inv(factor)
        weighted = np.einsum("rij,ri->rj", inverse, v)
        precision = np.einsum("rki,rkl,rlj->rij", inverse, np.eye(size) - leverage, inverse)
        shown = np.einsum("rii->ri", precision)
        checked = ours.redundancy > 0
        np.testing.assert_allclose(
            ours.w[checked],
            (weighted / np.sqrt(shown))[checked],
            rtol=0,
            atol=1e-4,  # of an sd: 1e-6 over the root of r
        )


@pytest.mark.parametrize("name", ["triangulation", "total station, ellipsoid", "mixed"])
def test_joint_covariance_of_distant_marks(name: str) -> None:
    ref = reference(name)
    first, last = 1, np.flatnonzero(ref.ours.unknowns.sought[:, 0])[-1]
    names = [ref.job.marks.names[first], ref.job.marks.names[last]]
    columns = ref.ours.unknowns.columns[[first, last]].ravel()
    known = columns >= 0
    expected = np.zeros((6, 6))
    expected[np.ix_(known, known)] = ref.covariance[np.ix_(columns[known], columns[known])]
    rotation = ref.job.frame.grid_rotation(ref.ours.coordinates)[[first, last]]
    turn = block_diag(*(grid_axes(angle) for angle in rotation.tolist()))
    expected = turn @ expected @ turn.T
    scale = np.sqrt(np.diag(expected))
    scale[scale == 0] = 1.0
    apart = (ref.ours.covariance(names) - expected) / np.outer(scale, scale)
    np.testing.assert_allclose(apart, 0.0, rtol=0, atol=RELATIVE)


@pytest.mark.parametrize("name", ["traverses", "mixed"])
def test_posterior_covariances_are_scaled(name: str) -> None:
    ref = reference(name)
    statistics = replace(ref.job.statistics, sd_basis="posterior")
    posterior = adjust(replace(ref.job, statistics=statistics))
    factor = ref.ours.solution.variance_factor
    assert factor is not None
    expected = np.nan_to_num(ref.ours.mark_covariances) * factor
    np.testing.assert_allclose(np.nan_to_num(posterior.mark_covariances), expected, rtol=1e-12, atol=1e-25)  # m²

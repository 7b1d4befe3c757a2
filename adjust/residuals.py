"""The residuals of an adjustment, row by row, with what each observation's fit and geometry allow to be said."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.angles import FULL_TURN
from adjust.arrays import BoolArray, FloatArray
from adjust.model import Block, State, whitened
from adjust.observations import Observations
from adjust.quality import checked_information, minimal_detectable_bias, normalised_residual, studentised_residual


@dataclass(frozen=True)
class TestLevels:
    """What the one-dimensional tests of a job are held against.

    `critical` bounds |w| (σ₀ = 1) or, when `on_tau`, |τ| (σ₀ estimated); `non_centrality` is λ₀ of the minimal
    detectable bias; `variance_factor` is NaN without degrees of freedom.
    """

    critical: float
    on_tau: bool
    non_centrality: float
    variance_factor: float


@dataclass(frozen=True)
class Residuals:
    """All rows of one kind after the adjustment; arrays (rows, components), m or rad, prior basis (σ₀ = 1).

    `residual` is adjusted minus observed. `redundancy` is the diagonal of Q_vv P: the share of an error that shows in
    its own residual; over a whole adjustment it sums to the degrees of freedom. The other figures are those of
    `adjust.quality.residuals` for a bias in the one component: `w`, `tau` and `minimal_detectable_bias` are NaN where
    no other observation checks this one.
    """

    observations: Observations
    adjusted: FloatArray
    residual: FloatArray
    sd: FloatArray
    redundancy: FloatArray
    w: FloatArray
    tau: FloatArray
    minimal_detectable_bias: FloatArray
    suspect: BoolArray


def residuals_of(block: Block, state: State, factor: FloatArray, leverage: FloatArray, levels: TestLevels) -> Residuals:
    """Residuals and tests of one kind.

    `factor` (rows, c, c) is the whitening L⁻¹ and `leverage` (rows, c, c) the whitened Ã C Ãᵀ of each row.
    """
    residual = -block.misclosure(state)
    freedom = np.eye(block.components) - leverage
    lower = np.linalg.inv(factor) if block.components > 1 else 1.0 / factor
    weight = np.einsum("rij,rij->rj", factor, factor)
    information = checked_information(np.einsum("rij,rik,rkj->rj", factor, freedom, factor), weight)
    w = normalised_residual(np.einsum("rij,ri->rj", factor, whitened(factor, residual)), information)
    tau = studentised_residual(w, levels.variance_factor)
    redundancy = np.einsum("rij,rjk,rki->ri", lower, freedom, factor)
    return Residuals(
        observations=block.observations,
        adjusted=_adjusted(block.observations, residual),
        residual=residual,
        sd=np.sqrt(np.einsum("rij,rij->ri", lower, lower)),
        redundancy=np.where(np.isnan(information), 0.0, redundancy),
        w=w,
        tau=tau,
        minimal_detectable_bias=minimal_detectable_bias(information, levels.non_centrality),
        suspect=np.nan_to_num(np.abs(tau if levels.on_tau else w)) > levels.critical,
    )


def _adjusted(observations: Observations, residual: FloatArray) -> FloatArray:
    adjusted = observations.observed + residual
    return adjusted % FULL_TURN if observations.full_circle else adjusted

"""Tests of single observations and how much each is checked by the others.

Notation: v residuals (adjusted − observed), P weights on σ₀ = 1, A the design matrix, C the unknowns' covariance,
Q_vv = P⁻¹ − A C Aᵀ, and c the unit vector of the one observation or component tested. All functions take arrays of
any one shape, elementwise. For an uncorrelated observation of standard deviation σ and redundancy r: the gradient
cᵀPv = v/σ², the weight cᵀPc = 1/σ², the information cᵀPQ_vvPc = r/σ².
"""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray

LEAST_REDUNDANCY = 1e-6
"""Below this an observation counts as unchecked: an error shows by less than a millionth of itself, the least bias that
could be found passes 4000 σ, and rounding leaves about as much of a redundancy that is exactly zero."""


def checked_information(information: FloatArray, weight: FloatArray) -> FloatArray:
    """`information` = cᵀPQ_vvPc, NaN where it is less than `LEAST_REDUNDANCY` of `weight` = cᵀPc: nothing checks c."""
    return np.where(information > LEAST_REDUNDANCY * weight, information, np.nan)


def normalised_residual(gradient: FloatArray, information: FloatArray) -> FloatArray:
    """w = cᵀPv / √(cᵀPQ_vvPc) on σ₀ = 1, standard normal where nothing is wrong; NaN where `information` is.

    The sign is the residual's for uncorrelated observations, positive where adjusted > observed; in general it is
    positive where the observed component is estimated to be too small.
    Source: Baarda (1968), A testing procedure for use in geodetic networks, Netherlands Geodetic Commission 2(5).
    """
    w: FloatArray = gradient / np.sqrt(information)
    return w


def studentised_residual(w: FloatArray, variance_factor: float) -> FloatArray:
    """τ = w / σ̂₀ with σ̂₀² = `variance_factor` = vᵀPv/f; NaN where that is 0 or NaN (no degrees of freedom).

    Source: Pope (1976), The statistics of residuals and the detection of outliers, NOAA Technical Report NOS 65 NGS 1.
    """
    tau: FloatArray = w / (np.sqrt(variance_factor) if variance_factor > 0 else np.nan)
    return tau


def minimal_detectable_bias(information: FloatArray, non_centrality: float) -> FloatArray:
    """The bias found with the power that `non_centrality` λ₀ stands for: √(λ₀ / cᵀPQ_vvPc), in the observation's unit.

    For an uncorrelated observation δ₀ σ/√r with δ₀ = √λ₀. NaN where `information` is. Source: Baarda (1968).
    """
    bias: FloatArray = np.sqrt(non_centrality / information)
    return bias


def external_reliability(information: FloatArray, weight: FloatArray, non_centrality: float) -> FloatArray:
    """What an undetected minimal bias does to the unknowns: √(λ₀ (1 − r)/r) with r = information/weight.

    No coordinate, and no function of the unknowns, is moved by more than this many of its own standard deviations.
    NaN where `information` is. Source: Baarda (1976), Reliability and precision of networks, VII International
    Course for Engineering Surveys of High Precision, Darmstadt (from memory).
    """
    effect: FloatArray = np.sqrt(non_centrality * np.maximum(weight / information - 1, 0))
    return effect

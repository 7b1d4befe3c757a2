"""From standard deviations to figures that hold the truth with a stated probability.

`degrees_of_freedom` None means that the standard deviations are known beforehand (normal distribution); a number
means that they were scaled by the estimated σ₀ (Student's t and Fisher's F). A number below 1 gives NaN: with nothing
to estimate σ₀ from there is no such figure.
"""

from __future__ import annotations

import math

import numpy as np
from scipy.special import ndtri, roots_legendre, stdtrit

from adjust.arrays import FloatArray

QUADRATURE_NODES = 48
"""Enough for 1e-10 of the radius at every axis ratio and every degree of freedom, from a confidence of 0.5 up."""
NEWTON_STEPS = 30
"""A bound, not an expectation: four to six steps settle."""
SETTLED = 1e-13
"""Relative step of the radius at which the iteration ends."""
BLOCK = 4096
"""Ellipses solved together, so that the table of integrand values stays in the cache."""


def interval_factor(confidence: float, degrees_of_freedom: int | None) -> float:
    """Half-interval of one coordinate in units of sd: Φ⁻¹((1 + p)/2), or Student's t."""
    tail = (1 - confidence) / 2
    if degrees_of_freedom is None:
        return float(-ndtri(tail))
    return float(-stdtrit(degrees_of_freedom, tail)) if degrees_of_freedom > 0 else math.nan


def half_interval(sd: FloatArray, confidence: float = 0.95, degrees_of_freedom: int | None = None) -> FloatArray:
    """Half the interval about a height that holds the true one with probability `confidence`, in the unit of `sd`.

    0 for an sd of 0, whatever is known of σ₀. 1.9600 sd at 95 % on known sds: FGDC-STD-007.3-1998, Geospatial
    Positioning Accuracy Standards, part 3.
    """
    return np.where(sd == 0.0, 0.0, sd * interval_factor(confidence, degrees_of_freedom))


def ellipse_factor(confidence: float, degrees_of_freedom: int | None = None) -> float:
    """What turns a standard ellipse into one that holds the truth with probability `confidence`.

    √χ²₂ on known sds, √(2 F₂,f) on the estimated σ₀; both have closed forms, √(−2 ln q) and √(f (q^(−2/f) − 1))
    with q = 1 − confidence. Source: Ghilani, Adjustment Computations, chapter on error ellipses (from memory);
    closed forms by integrating the densities, in docs/methods-quality.md.
    """
    outside = math.log1p(-confidence)
    if degrees_of_freedom is None:
        return math.sqrt(-2 * outside)
    if degrees_of_freedom < 1:
        return math.nan
    return math.sqrt(degrees_of_freedom * math.expm1(-2 * outside / degrees_of_freedom))


def circle_radius(
    semi_major: FloatArray,
    semi_minor: FloatArray,
    confidence: float = 0.95,
    degrees_of_freedom: int | None = None,
) -> FloatArray:
    """Radius (n,) of the circle about a mark that holds the true place with probability `confidence`.

    From standard semi-axes (n,), in their unit; 0 for a point, NaN for NaN. Exact to 1e-10 of the radius (measured in
    the tests): the probability outside the circle, an integral over directions, is solved for the radius by Newton's
    method.
    Source: the distribution of a quadratic form in two normal variates, Hoyt (1947), Probability functions for the
    modulus and angle of the normal complex variate, Bell System Technical Journal 26, pages 318–359; on the
    estimated σ₀ the bivariate t distribution takes its place (Kotz and Nadarajah 2004, Multivariate t distributions
    and their applications, section 1.1). Derivation in docs/methods-quality.md.
    """
    major = np.asarray(semi_major, dtype=float)
    radius = np.where(major == 0, 0.0, np.nan)
    solvable = major > 0
    if degrees_of_freedom is None or degrees_of_freedom > 0:
        ratio = np.asarray(semi_minor, dtype=float)[solvable] / major[solvable]
        blocks = [ratio[first : first + BLOCK] for first in range(0, len(ratio), BLOCK)]
        factors = [_circle_factor(block, confidence, degrees_of_freedom) for block in blocks]
        radius[solvable] = major[solvable] * np.concatenate([np.empty(0), *factors])
    return radius


def _directions() -> tuple[FloatArray, FloatArray]:
    """cos² of the directions (nodes,) from the major axis, over a quarter turn, and their weights, which sum to 1.

    Gauss and Legendre's nodes in s, with the angle from the minor axis (π/2) s³: a flat ellipse bends the integrand
    only near its minor axis, and there the nodes crowd.
    """
    roots, weights = roots_legendre(QUADRATURE_NODES)
    s = (roots + 1) / 2
    cos_square: FloatArray = np.sin(np.pi / 2 * s**3) ** 2
    return cos_square, 1.5 * weights * s**2


def _circle_factor(ratio: FloatArray, confidence: float, degrees_of_freedom: int | None) -> FloatArray:
    """Radius (n,) over the major axis for minor over major `ratio` (n,), by Newton on ln(outside) against ln(radius).

    Near the root that curve is almost straight for heavy tails and bends one way for thin ones, so the start between
    the two limits, a line and a circle, always leads home.
    """
    cos_square, weights = _directions()
    stretch = cos_square + ratio[:, None] ** 2 * (1 - cos_square)
    line = interval_factor(confidence, degrees_of_freedom) ** 2
    circle = ellipse_factor(confidence, degrees_of_freedom) ** 2
    log_radius = np.log(line + (circle - line) * ratio**2) / 2
    target = math.log1p(-confidence)
    for _ in range(NEWTON_STEPS):
        square = np.exp(2 * log_radius)[:, None] / stretch
        outside, slope = _outside(square, degrees_of_freedom)
        probability = outside @ weights
        step = (np.log(probability) - target) * probability / (slope @ weights)
        log_radius += step
        if not np.any(np.abs(step) > SETTLED):
            break
    factor: FloatArray = np.exp(log_radius)
    return factor


def _outside(square: FloatArray, degrees_of_freedom: int | None) -> tuple[FloatArray, FloatArray]:
    """Probability to lie beyond the squared distance in a circular distribution, and minus its slope by its log/2."""
    if degrees_of_freedom is None:
        outside = np.exp(-square / 2)
        return outside, square * outside
    base = 1 + square / degrees_of_freedom
    outside = base ** (-degrees_of_freedom / 2)
    return outside, square * outside / base

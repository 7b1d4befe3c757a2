"""Where a test turns from believing to doubting: quantiles and what is built from them."""

from __future__ import annotations

import math

from scipy.special import chndtrinc, gammainccinv, gammaincinv, ndtri, stdtrit


def chi_square_quantile(probability: float, degrees_of_freedom: float) -> float:
    """The value that χ² with `degrees_of_freedom` stays below with `probability`.

    The regularised incomplete gamma function, inverted on the side of the smaller tail, so that neither tail loses
    digits. Source: NIST Digital Library of Mathematical Functions, section 8.2, with a = f/2 and x = χ²/2.
    """
    half = degrees_of_freedom / 2
    upper = 1 - probability
    return float(2 * (gammaincinv(half, probability) if probability < upper else gammainccinv(half, upper)))


def critical_w(significance: float) -> float:
    """Bound on |w| in the two-sided test of one observation: k = Φ⁻¹(1 − significance/2).

    Source: Baarda (1968), A testing procedure for use in geodetic networks, Netherlands Geodetic Commission 2(5).
    """
    return float(-ndtri(significance / 2))


def critical_tau(significance: float, degrees_of_freedom: int) -> float:
    """Bound on |τ| in the two-sided test of one observation: τ = √f t / √(f − 1 + t²), t of f − 1 degrees of freedom.

    |τ| cannot pass √f. With one degree of freedom it is 1 whatever was observed, and with none it does not exist:
    nothing can be tested, and the bound is infinite. For the largest of n residuals, divide `significance` by n.
    Source: Pope (1976), The statistics of residuals and the detection of outliers, NOAA Technical Report NOS 65 NGS 1.
    """
    if degrees_of_freedom < 2:
        return math.inf
    t = -float(stdtrit(degrees_of_freedom - 1, significance / 2))
    return math.sqrt(degrees_of_freedom) / math.hypot(math.sqrt(degrees_of_freedom - 1) / t, 1)


def non_centrality(significance: float, power: float, dimension: int = 1) -> float:
    """Non-centrality λ₀ that a bias must cause for the test at `significance` to find it with probability `power`.

    Solves P(χ²(dimension, λ₀) > χ²(1 − significance; dimension)) = power exactly. For one dimension it counts both
    tails, so √λ₀ is below the customary k + Φ⁻¹(power) by what the far tail adds: nothing that shows at the usual
    levels (0.001 and 0.80: 4.1321 either way), 0.06 at levels as lax as 0.5 and 0.8.
    Raises ValueError unless 0 < significance < power < 1.
    Source: Baarda (1968), as `critical_w`; the distribution: NIST DLMF, section 8.2, mixed over a Poisson index.
    """
    if not 0 < significance < power < 1:
        raise ValueError(f"a test at significance {significance} cannot have the power {power}")
    bound = 2 * gammainccinv(dimension / 2, significance)
    return float(chndtrinc(bound, dimension, 1 - power))

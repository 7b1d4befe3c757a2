"""How well errors that mistakes could have made fit the error that was found, and how well chance would fit.

With ∇ the estimated error and Q its covariance, a mistake that makes the error e, and leaves b · t open with t standard
normal, has the likelihood

    p(∇ | mistake) = N(∇ − e; 0, Q + b bᵀ)                                                          (1)

and "no common mistake" p(∇ | none) = 1 / (S_q r^q ln R), r = √(∇ᵀQ⁻¹∇): every order of size from one standard
deviation to R of them as likely as the next, in any direction (S_q: the surface of the unit sphere). Posterior odds are
likelihood times prior (Bayes; Kass & Raftery 1995, *Journal of the American Statistical Association* 90, 773–795).

Where the catalogue has many mistakes of about the right size, one of them fits any error. Chance is the share of other
errors of the same order of size for which the mistakes together would be as likely as they are for the one found:
the significance of a test whose statistic is the odds of any mistake against none.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from scipy.special import gammaln, logsumexp

from adjust.angles import FULL_TURN, wrapped
from adjust.arrays import FloatArray
from adjust.blunders.mistakes.priors import NO_COMMON_MISTAKE, ORDERS_OF_SIZE

SAMPLES = 2000
"""Errors that chance is tried on: a share of 5 % comes out within 0.5 %."""
LEAST_SIZE, MOST_SIZE = 0.5, 2.0
"""What "of the same order of size" means, as multiples of the error found."""
BEYOND = 10.0
"""Standard deviations from an error at which a mistake adds e⁻⁵⁰ to its likelihood, whatever the prior: nothing."""
SEED = 1


@dataclass(frozen=True)
class Weighing:
    """The errors (k, q) of mistakes with the loose part (k, q) and the prior (k,) of each, held against `found` (q,) of
    `covariance` (q, q). `circle`: errors a full turn apart are the same."""

    found: FloatArray
    covariance: FloatArray
    errors: FloatArray
    loose: FloatArray
    priors: FloatArray
    circle: bool

    @cached_property
    def _whitening(self) -> FloatArray:
        """L⁻¹ (q, q) of Q = L Lᵀ."""
        inverse: FloatArray = np.linalg.inv(np.linalg.cholesky(self.covariance))
        return inverse

    @cached_property
    def _size(self) -> int:
        return len(self.found)

    @cached_property
    def _open(self) -> FloatArray:
        """L⁻¹b (k, q)."""
        return self.loose @ self._whitening.T

    def _away(self, found: FloatArray) -> FloatArray:
        """L⁻¹(∇ − e) (m, k, q) of errors (m, q)."""
        away = found[:, None, :] - self.errors
        if self.circle:
            away = wrapped(away)
        whitened: FloatArray = away @ self._whitening.T
        return whitened

    def _squares(self, found: FloatArray) -> FloatArray:
        """(∇ − e)ᵀ (Q + b bᵀ)⁻¹ (∇ − e) (m, k), by the formula of Sherman and Morrison."""
        away = self._away(found)
        along = np.einsum("mkq,kq->mk", away, self._open)
        squares: FloatArray = np.einsum("mkq,mkq->mk", away, away) - along**2 / (1.0 + self._open_square)
        return squares

    @cached_property
    def _open_square(self) -> FloatArray:
        square: FloatArray = np.einsum("kq,kq->k", self._open, self._open)
        return square

    def _weights(self, squares: FloatArray) -> FloatArray:
        """Logarithm (…, k) of prior times (1), but for |Q|^(−1/2), which all share."""
        scale = 0.5 * self._size * math.log(FULL_TURN) + 0.5 * np.log1p(self._open_square)
        weights: FloatArray = np.log(self.priors) - scale - 0.5 * squares
        return weights

    def _none(self, found: FloatArray) -> FloatArray:
        """The same (m,) for no common mistake."""
        half = self._size / 2
        surface = math.log(2.0) + half * math.log(math.pi) - float(gammaln(half))
        radius = np.maximum(np.linalg.norm(found @ self._whitening.T, axis=1), 1.0)
        prior = math.log(NO_COMMON_MISTAKE / math.log(ORDERS_OF_SIZE))
        none: FloatArray = prior - surface - self._size * np.log(radius)
        return none

    @cached_property
    def misfits(self) -> FloatArray:
        """Normalised misfit (k,) of each."""
        misfits: FloatArray = np.sqrt(self._squares(self.found[None])[0])
        return misfits

    @cached_property
    def weights(self) -> FloatArray:
        """Logarithm (k,) of prior times likelihood of each, on the scale of `none`."""
        return self._weights(self._squares(self.found[None])[0])

    @cached_property
    def none(self) -> float:
        """The same for no common mistake."""
        return float(self._none(self.found[None])[0])

    def stood_for(self, place: int) -> FloatArray:
        """The error (q,) that one of them stands for here: e, and of the loose part what fits best."""
        away = self._away(self.found[None])[0, place]
        share = float(away @ self._open[place]) / (1.0 + float(self._open_square[place]))
        error: FloatArray = self.errors[place] + share * self.loose[place]
        return error

    @cached_property
    def chance(self) -> float:
        """Share of errors of the same order of size that would be explained as well by something."""
        generator = np.random.default_rng(SEED)
        directions = generator.standard_normal((SAMPLES, self._size))
        directions /= np.linalg.norm(directions, axis=1)[:, None]
        sizes = self._radius * np.linspace(LEAST_SIZE, MOST_SIZE, SAMPLES)
        others = (sizes[:, None] * directions) @ np.linalg.inv(self._whitening).T
        near = self._near
        explained = np.concatenate([near._explained(part) for part in np.array_split(others, near._parts)])
        return float(np.mean(explained >= near._explained(self.found[None])[0]))

    @cached_property
    def _radius(self) -> float:
        """Size of the error found, in standard deviations."""
        return float(np.linalg.norm(self._whitening @ self.found))

    @property
    def _near(self) -> Weighing:
        """Only mistakes that could pass for an error of about the size of the one found, and those that leave
        something open."""
        radius = np.linalg.norm(self._away(np.zeros((1, self._size)))[0], axis=1)
        least, most = LEAST_SIZE * self._radius - BEYOND, MOST_SIZE * self._radius + BEYOND
        chosen = self._open.any(axis=1) | ((radius >= least) & (radius <= most))
        return replace(self, errors=self.errors[chosen], loose=self.loose[chosen], priors=self.priors[chosen])

    @property
    def _parts(self) -> int:
        """Into how many parts the trial errors are cut, so that the arrays of many candidates stay small."""
        return 1 + SAMPLES * self.errors.size // 1_000_000

    def _explained(self, found: FloatArray) -> FloatArray:
        """Logarithm (m,) of the odds of any mistake against none."""
        explained: FloatArray = logsumexp(self._weights(self._squares(found)), axis=1) - self._none(found)
        return explained

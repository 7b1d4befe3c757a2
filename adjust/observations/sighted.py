"""Kinds observed with one instrument on one mark towards others: scalar values with an instrument's precision."""

from __future__ import annotations

from abc import abstractmethod
from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import Geometry, Sight
from adjust.observations.base import Observations, Precision


@dataclass(frozen=True, kw_only=True)
class SightedObservations(Observations):
    """A scalar kind whose precision comes from the row or from its instrument."""

    precision: Precision

    def covariance(self, geometry: Geometry) -> FloatArray:
        """Variance (rows, 1, 1) by the law of propagation, of uncorrelated errors.

        The row's own sd wins; else sd² = constant² + (proportional · observed)² + centring. The law: JCGM 100:2008,
        5.1.2, equation 10.
        """
        precision = self.precision
        own = precision.constant**2 + (precision.proportional * self.observed[:, 0]) ** 2
        if np.any(precision.centring) or np.any(precision.target_centring) or np.any(precision.heights):
            own = own + self._set_up_variance(self.differentiate(geometry)[:, 0])
        return np.where(np.isnan(precision.stated), own, precision.stated**2)[:, None, None]

    def _set_up_variance(self, derivatives: FloatArray) -> FloatArray:
        """What centring adds to the variance (rows,); `derivatives` (rows, roles, 3).

        An instrument or a target off its mark acts as a displacement of that mark would, so that each horizontal axis
        adds (centring · derivative)²: for an angle the D₃ / (D₁ D₂) of the instrument and the 1 / D of the targets.
        """
        variance = np.zeros(len(self))
        for role, name in enumerate(self.roles):
            centring = self.precision.centring if name == "at" else self.precision.target_centring
            variance += centring**2 * np.sum(derivatives[:, role, :2] ** 2, axis=1)
        return variance


@dataclass(frozen=True, kw_only=True)
class SingleSight(SightedObservations):
    """A kind that is a function of one line of sight: it says which, the value and its gradient."""

    roles = ("at", "to")

    @abstractmethod
    def sight(self, geometry: Geometry) -> Sight:
        """The lines of sight, in the axes that the kind is observed in."""

    @abstractmethod
    def value(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """Predicted values (rows,) of sights (rows, 3) along east, north, up."""

    @abstractmethod
    def gradient(self, enu: FloatArray, geometry: Geometry) -> FloatArray:
        """Derivatives (rows, 3) of the value by the sight's east, north, up."""

    def predict(self, geometry: Geometry) -> FloatArray:
        """The value of each sight (rows, 1)."""
        return self.value(self.sight(geometry).enu, geometry)[:, None]

    def differentiate(self, geometry: Geometry) -> FloatArray:
        """Chain rule over the sight: (rows, 1, 2, 3)."""
        return self.linearise(geometry)[1]

    def linearise(self, geometry: Geometry) -> tuple[FloatArray, FloatArray]:
        """Prediction and derivatives of the same sights."""
        sight = self.sight(geometry)
        derivatives = sight.differentiate(self.gradient(sight.enu, geometry))
        return self.value(sight.enu, geometry)[:, None], derivatives[:, None]


@dataclass(frozen=True, kw_only=True)
class HeightedSight(SingleSight):
    """A sight between an instrument and a target that stand above their marks."""

    heights: FloatArray
    """(rows, 2): instrument and target height along the normal, metres; 0 where the row is mark to mark."""

    def _set_up_variance(self, derivatives: FloatArray) -> FloatArray:
        """Centring, and the errors of the two measured heights, which raise the ends as a rise of the marks would."""
        by_heights: FloatArray = np.sum(derivatives[:, :, 2] ** 2, axis=1)
        return super()._set_up_variance(derivatives) + self.precision.heights**2 * by_heights

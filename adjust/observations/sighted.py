"""Kinds observed with one instrument on one mark towards another: scalar values with an instrument's precision."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames import Geometry
from adjust.observations.base import Observations, Precision


@dataclass(frozen=True, kw_only=True)
class SightedObservations(Observations):
    """A scalar kind whose precision comes from the row or from its instrument."""

    precision: Precision

    def covariance(self, geometry: Geometry) -> FloatArray:
        """Variance (rows, 1, 1) by the law of propagation.

        A centring error moves the station or the target as a displacement of its mark would, so its effect is the
        derivative by that mark; the error of a measured instrument or target height acts as a height displacement.
        Uncorrelated errors assumed (law of propagation of variances: JCGM 100:2008, 5.1.2, equation 10).
        """
        own = self.precision.constant**2 + (self.precision.proportional * self.observed[:, 0]) ** 2
        derivatives = self.differentiate(geometry)[:, 0]
        for role, name in enumerate(self.roles):
            station = name == "at"
            centring = self.precision.centring if station else self.precision.target_centring
            own = own + centring**2 * np.sum(derivatives[:, role, :2] ** 2, axis=1)
            own = own + self.precision.heights**2 * derivatives[:, role, 2] ** 2
        stated = self.precision.stated
        return np.where(np.isnan(stated), own, stated**2)[:, None, None]

"""Sights on the ellipsoid: what a line of sight does when its ends move over the curved surface."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray
from adjust.frames.base import Sight
from adjust.frames.reference_ellipsoid import Stations, local_axes


def astronomic_axes(coordinates: FloatArray, deflection: FloatArray) -> FloatArray:
    """Axes (n, 3, 3) of the plumb line, rows as in `local_axes`, from deflections (n, 2), radians.

    Astronomic latitude Φ = φ + ξ, astronomic longitude Λ = λ + η / cos φ, with ξ and η the north and east components
    (Heiskanen & Moritz 1967, *Physical Geodesy*, chapter 2; from memory).
    """
    longitude, latitude = coordinates[:, 0], coordinates[:, 1]
    return local_axes(longitude + deflection[:, 1] / np.cos(latitude), latitude + deflection[:, 0])


@dataclass(frozen=True)
class EllipsoidSight(Sight):
    """Sights whose axes turn as the station moves, and whose instruments and targets lean with their marks' normals.

    `axes` (rows, 3, 3) are those that the components refer to; `heights` (rows, 2) as in `Frame.sight`; `deflection`
    (rows, 2) that of the station.
    """

    axes: FloatArray
    station: Stations
    target: Stations
    heights: FloatArray
    deflection: FloatArray

    def differentiate(self, gradient: FloatArray) -> FloatArray:
        """See `Sight.differentiate`; derived in docs/methods-observations.md."""
        geocentric: FloatArray = np.einsum("rij,ri->rj", self.axes, gradient)
        derivatives = np.empty((len(gradient), 2, 3))
        derivatives[:, 0] = -_by_step(geocentric, self.station, self.heights[:, :1])
        derivatives[:, 1] = _by_step(geocentric, self.target, self.heights[:, 1:])
        derivatives[:, 0, :2] += self._by_turn(gradient)
        return derivatives

    def _by_turn(self, gradient: FloatArray) -> FloatArray:
        """What the turn of the axes under a fixed line adds, by metres east and north of the station (rows, 2).

        From R(Φ, Λ): ∂(e, n, u)/∂Φ = (0, −u, n) and ∂(e, n, u)/∂Λ = (n sin Φ − u cos Φ, −e sin Φ, e cos Φ).
        """
        east, north, up = self.enu.T
        by_east, by_north, by_up = gradient.T
        sine, cosine = self.axes[:, 2, 2], self.axes[:, 1, 2]
        by_latitude = north * by_up - up * by_north
        by_longitude = (north * sine - up * cosine) * by_east + east * (cosine * by_up - sine * by_north)
        geodetic_sine, geodetic_cosine = self.station.axes[:, 2, 2], self.station.axes[:, 1, 2]
        by_latitude += by_longitude * self.deflection[:, 1] * geodetic_sine / geodetic_cosine**2
        return np.column_stack([by_longitude / geodetic_cosine, by_latitude]) / self.station.radii


def _by_step(geocentric: FloatArray, stations: Stations, heights: FloatArray) -> FloatArray:
    """Derivatives (rows, 3) by metres at marks of what changes by `geocentric` (rows, 3) a metre at their tips.

    The tips stand `heights` (rows, 1) up the normals. A normal leans by 1 / radius for each metre, so that its tip runs
    ahead of the mark.
    """
    along: FloatArray = np.einsum("rij,rj->ri", stations.axes, geocentric)
    along[:, :2] *= 1.0 + heights / stations.radii
    return along

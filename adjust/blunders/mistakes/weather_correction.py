"""The correction of distances for the air applied twice, or not at all."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect


class WeatherCorrection:
    """Known only where the weather stands in the book: distances reduced from pointings."""

    name = "weather correction"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Corrected again what the instrument had corrected; or not corrected, by the mean of the other sights."""
        pointings = suspect.job.reduction.pointings
        if pointings is None or not len(pointings.velocity):
            return None
        if suspect.kind != "slope_distance" and suspect.nature != "distance scale":
            return None
        velocity = self._velocity(suspect)
        if velocity is None:
            return None
        size = suspect.observed if suspect.kind else np.ones(1)
        known = pointings.velocity[pointings.velocity != 1.0]
        if velocity != 1.0:
            what = f"corrected for the air twice ({parts_per_million(velocity - 1)})"
            return self._told(suspect, size * (velocity - 1) / velocity, what)
        if not len(known):
            return None
        usual, spread = float(known.mean()) - 1, float(known.std())
        what = f"not corrected for the air (about {parts_per_million(usual)})"
        told = self._told(suspect, -size * usual, what)
        return Candidates(told.errors, told.shares, told.remedy, np.array([size * spread]))

    @staticmethod
    def _told(suspect: Suspect, error: FloatArray, what: str) -> Candidates:
        if len(suspect.values) == 1 and suspect.lines[0][0] == suspect.context.source:
            entry = suspect.values[0]
            return entry.valued(entry.value - error, lambda place: what)
        return Candidates.listed([error], [Remedy(what)])

    @staticmethod
    def _velocity(suspect: Suspect) -> float | None:
        """The factor that the suspect's distances were multiplied by; None where it is not known."""
        pointings = suspect.job.reduction.pointings
        assert pointings is not None
        place = pointings.slopes.means.provenance
        files = suspect.context.observations.provenance
        if suspect.nature == "distance scale":
            file = files.files[files.file[suspect.context.row]]
            return float(pointings.velocity.mean()) if file in place.files else None
        labels = (row for row in range(len(place.line)) if place.label(row) == suspect.context.source)
        row = next(labels, None)
        return None if row is None else float(pointings.velocity[row])


def parts_per_million(ratio: float) -> str:
    """A small ratio in words."""
    return f"{ratio * 1e6:+.1f} ppm"

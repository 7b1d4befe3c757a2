"""The correction of distances for the air applied twice, or not at all."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect
from adjust.reductions.outcome import PointingsReduced


class WeatherCorrection:
    """Known only where the weather stands in the book: distances reduced from pointings."""

    name = "weather correction"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Corrected again what the instrument had corrected; or not corrected, by the mean of the other sights."""
        pointings = suspect.job.reduction.pointings
        if pointings is None or (suspect.kind != "slope_distance" and suspect.nature != "distance scale"):
            return None
        sights = Sights.of(suspect, pointings)
        if not len(sights.rows) or not np.any(sights.rate):
            return None
        found = sights.twice() if np.any(sights.rate[sights.rows]) else sights.not_at_all()
        return Candidates(
            found.errors * sights.size, found.shares, found.remedy, found.open_part * sights.size, found.rarity
        )


@dataclass(frozen=True)
class Sights:
    """The slope distances (sights,) of a book, the `rate` (sights,) at which each was corrected for the air, and the
    `rows` of the suspect among them. `size` turns a rate into the suspect's error."""

    rate: FloatArray
    length: FloatArray
    rows: IntArray
    size: float

    @classmethod
    def of(cls, suspect: Suspect, pointings: PointingsReduced) -> Sights:
        """Those of a job; no rows where the suspect is not one of them."""
        means, context = pointings.slopes.means, suspect.context
        place, here = means.provenance, context.observations.provenance
        file = here.files[here.file[context.row]]
        of_file = np.array([name == file for name in place.files])[place.file]
        if suspect.nature == "distance scale":
            return cls(pointings.velocity - 1.0, means.value, np.flatnonzero(of_file), 1.0)
        same = of_file & (place.line == here.line[context.row])
        return cls(pointings.velocity - 1.0, means.value, np.flatnonzero(same), float(suspect.observed[0]))

    def twice(self) -> Candidates:
        """The correction that stands in the value, once too often; of several sights the mean, long ones first."""
        rate, weight = self.rate[self.rows], self.length[self.rows] ** 2
        mean = float(np.average(rate, weights=weight))
        spread = np.sqrt(np.average((rate - mean) ** 2, weights=weight) / len(rate))
        what = f"corrected for the air twice ({parts_per_million(mean)})"
        return _rated(mean / (1.0 + mean), what, spread)

    def not_at_all(self) -> Candidates:
        """What other sights were corrected by, left out."""
        known = self.rate[self.rate != 0.0]
        what = f"not corrected for the air (about {parts_per_million(float(known.mean()))})"
        found = _rated(-float(known.mean()), what, float(known.std()))
        return Candidates(found.errors, found.shares, found.remedy, found.loose, float(np.mean(self.rate == 0.0)))


def _rated(rate: float, what: str, spread: float) -> Candidates:
    return Candidates(np.array([[rate]]), np.ones(1), lambda place, error: Remedy(what), np.array([[spread]]))


def parts_per_million(ratio: float) -> str:
    """A small ratio in words."""
    return f"{ratio * 1e6:+.1f} ppm"

"""The height of a GNSS antenna wrong at one end of a vector."""

from __future__ import annotations

import numpy as np

from adjust.arrays import FloatArray
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect
from adjust.frames import EllipsoidFrame

USUAL = 1.5
"""Metres, 1σ of what an antenna height is wrong by: a tripod's when it was left out, less when it was misread. A guess,
no source."""


class AntennaHeight:
    """A vector that is wrong along the vertical, and nowhere else."""

    name = "antenna height"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Any height; at either end, which over a few kilometres comes to the same."""
        frame = suspect.job.frame
        if suspect.kind != "vector" or suspect.size < 3 or not isinstance(frame, EllipsoidFrame):
            return None
        ends = suspect.row_itself.marks[0]
        up = frame.axes(suspect.context.geometry.coordinates[ends])[:, 2].mean(axis=0)
        names = " or ".join(suspect.job.marks.names[mark] for mark in ends)

        def remedy(place: int, error: FloatArray) -> Remedy:
            what = f"antenna height at {names} wrong by {abs(float(error @ up)):.3f} m"
            corrections = tuple(
                entry.correction(entry.notation.write(entry.value - part))
                for entry, part in zip(suspect.values, error.tolist(), strict=True)
            )
            return Remedy(what, ", ".join(correction.text for correction in corrections), corrections)

        return Candidates(np.zeros((1, 3)), np.ones(1), remedy, USUAL * up[None])

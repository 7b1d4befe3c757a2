"""The addition constant of a target left out, applied twice, or that of another target."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import permutations

import numpy as np

from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect

USUAL = (0.030, 0.0344)
"""Metres by which the constants of common prisms differ from each other, where the job file names no targets: from
memory."""
LEFT_OUT, ANOTHER, TWICE = 5.0, 3.0, 1.0
"""How often each slip happens, as multiples: a guess, no source."""


class TargetConstant:
    """Every distance to the target is wrong by one constant."""

    name = "target constant"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The constants that the job file names, and their differences; else the usual ones."""
        if suspect.kind not in ("slope_distance", "horizontal_distance") and suspect.nature != "distance constant":
            return None
        whats, errors, shares = zip(*slips(suspect.job.target_constants), strict=True)
        if len(suspect.values) == 1:
            entry = suspect.values[0]
            return entry.valued(entry.value - np.array(errors), whats.__getitem__, np.array(shares))
        return Candidates.listed(np.array(errors)[:, None], [Remedy(what) for what in whats], shares)


def slips(constants: Mapping[str, float]) -> list[tuple[str, float, float]]:
    """What was done, by how much distances are wrong then, metres, and how often."""
    found = []
    for name, constant in constants.items():
        if constant:
            found.append((f"constant of {name} left out ({millimetres(constant)})", -constant, LEFT_OUT))
            found.append((f"constant of {name} applied twice ({millimetres(constant)})", constant, TWICE))
    for used, right in permutations([name for name, constant in constants.items() if constant], 2):
        difference = constants[used] - constants[right]
        if difference:
            found.append((f"constant of {used} in place of that of {right}", difference, ANOTHER))
    return found or [
        (f"target constant wrong by {millimetres(error)}", error, ANOTHER)
        for constant in USUAL
        for error in (constant, -constant)
    ]


def millimetres(constant: float) -> str:
    """A constant in words."""
    return f"{constant * 1e3:+.1f} mm"

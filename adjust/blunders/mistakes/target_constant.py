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


class TargetConstant:
    """Every distance to the target is wrong by one constant."""

    name = "target constant"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The constants that the job file names, and their differences; else the usual ones."""
        if suspect.kind not in ("slope_distance", "horizontal_distance") and suspect.nature != "distance constant":
            return None
        errors = errors_of(suspect.job.target_constants)
        values = suspect.values
        if values and len(values) == 1:
            whats = list(errors)
            return values[0].valued(values[0].value - np.array([*errors.values()]), whats.__getitem__)
        return Candidates.listed([np.array([error]) for error in errors.values()], [Remedy(what) for what in errors])


def errors_of(constants: Mapping[str, float]) -> dict[str, float]:
    """Distances wrong by so much, metres, by what was done."""
    named = {name: constant for name, constant in constants.items() if constant}
    errors: dict[str, float] = {}
    for name, constant in named.items():
        errors[f"constant of {name} left out ({millimetres(constant)})"] = -constant
        errors[f"constant of {name} applied twice ({millimetres(constant)})"] = constant
    for used, right in permutations(constants, 2):
        difference = constants[used] - constants[right]
        if difference and constants[used] and constants[right]:
            errors[f"constant of {used} in place of that of {right}"] = difference
    if errors:
        return errors
    return {
        f"target constant wrong by {millimetres(sign * constant)}": sign * constant
        for constant in USUAL
        for sign in (1, -1)
    }


def millimetres(constant: float) -> str:
    """A constant in words."""
    return f"{constant * 1e3:+.1f} mm"

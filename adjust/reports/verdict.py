"""What a surveyor wants to know first: do the observations hold, and what has to be borne in mind?"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterator

import numpy as np

from adjust.adjustment import Adjustment
from adjust.quality import LEAST_REDUNDANCY
from adjust.reports.selection import listed_observations
from adjust.reports.wording import between, counted, what
from adjust.unknowns import UP

NAMED = 5
"""Names in one sentence: enough to find the place, few enough to read."""

FEWEST_DIGITS = 6
"""Significant digits of the solution below which a caution is due: a tenth of a millimetre in a hundred metres."""

LEAST_PLAIN = 0.095
"""Below this two decimals would leave one figure or none of vᵀPv and its bounds, which may lie close together."""

LARGEST_GAP = 1e-5
"""Metres (or radians of an orientation): the iteration's own standstill. Two solutions of a system agree better."""

FEW_DEGREES_OF_FREEDOM = 10
"""Below this the estimated σ₀ is itself uncertain by more than a fifth: its relative sd is about 1/√(2f)."""

DECIDED = {
    "correct": ("entry is corrected", "entries are corrected"),
    "leave_out": ("line is left out", "lines are left out"),
}
"""Decisions that change what counts, and what one and several of them do."""


def verdict(adjustment: Adjustment) -> str:
    """One plain sentence or two: whether the observations fit what was claimed of them, and what stands out."""
    test = adjustment.solution.global_test
    if test.passed is None:
        return (
            "Nothing checks these coordinates: there are only as many observations as unknowns, "
            "so any blunder goes straight into them."
        )
    statistic, lower, upper = map(_two_decimals_or_more, (test.statistic, test.lower, test.upper))
    expected = f"vᵀPv is {statistic}, expected between {lower} and {upper}"
    if test.passed:
        fit = "The observations agree as well as their sds promise"
    elif test.statistic > test.upper:
        fit = "The observations disagree more than their sds allow"
    else:
        fit = "The observations agree better than their sds promise; the sds are probably too large"
    return f"{fit}: {expected}. {_suspicion(adjustment)}"


def _two_decimals_or_more(value: float) -> str:
    """Two decimals; of what they would print as nothing, or nearly, two figures."""
    return f"{value:.2f}" if value >= LEAST_PLAIN else f"{value:.1e}" if value else "0"


def _suspicion(adjustment: Adjustment) -> str:
    suspects = adjustment.suspects
    if not suspects:
        return "No observation is suspect."
    worst = listed_observations(adjustment, "worst", 1)[0]
    named = f"{what(worst)} {between(worst)} ({worst['source']})"
    if len(suspects) == 1:
        return f"One observation is suspect: {named}."
    return f"{len(suspects)} observations are suspect, worst {named}."


def digits_left(condition_number: float) -> float:
    """Significant digits that orthogonal factors leave in double precision: −log₁₀(κ ε).

    Source: Higham (2002), Accuracy and stability of numerical algorithms, section 20.1, for small residuals.
    """
    return max(0.0, -math.log10(condition_number * np.finfo(float).eps)) if condition_number > 0 else 0.0


def cautions(adjustment: Adjustment) -> tuple[str, ...]:
    """What a user of the figures must not overlook, short, for every output."""
    return tuple(_cautions(adjustment))


def _cautions(adjustment: Adjustment) -> Iterator[str]:
    solution = adjustment.solution
    if solution.global_test.passed is not True:
        yield verdict(adjustment)
    elif adjustment.suspects:
        yield _suspicion(adjustment)
    yield from _decided(adjustment)
    yield from _unchecked(adjustment)
    yield from _basis(adjustment)
    digits = digits_left(solution.condition_number)
    if digits < FEWEST_DIGITS:
        yield (
            f"The network is nearly undetermined: of 16 digits about {digits:.0f} are left "
            f"(condition number {solution.condition_number:.1e})."
        )
    if not solution.second_opinion_gap <= LARGEST_GAP:
        yield f"A second solution of the same system differs by {solution.second_opinion_gap:.1e} m: do not rely on it."


def _decided(adjustment: Adjustment) -> Iterator[str]:
    """That the field book does not stand as it was written."""
    made: Counter[str] = Counter(each.decision for each in adjustment.job.decisions)
    parts = [counted(made[name], *words) for name, words in DECIDED.items() if made[name]]
    if parts:
        yield f"The field book does not count as written: by decision {' and '.join(parts)}, for the reasons given."


def _unchecked(adjustment: Adjustment) -> Iterator[str]:
    """Observations that no other checks."""
    places: list[str] = []
    for table in adjustment.residuals:
        rows = np.flatnonzero((table.redundancy < LEAST_REDUNDANCY).any(axis=1))
        places += [table.observations.provenance.label(int(row)) for row in rows]
    if not places or adjustment.solution.degrees_of_freedom == 0:
        return
    shown = ", ".join(places[:NAMED]) + (f" and {len(places) - NAMED} more" if len(places) > NAMED else "")
    if len(places) == 1:
        yield f"Nothing checks the observation {shown}: a blunder in it would go unseen."
    else:
        yield f"Nothing checks {len(places)} observations: a blunder in one would go unseen ({shown})."


def _basis(adjustment: Adjustment) -> Iterator[str]:
    """What the sds rest on."""
    solution = adjustment.solution
    if solution.datum_defect:
        yield from _free_network(adjustment)
    if solution.sd_basis == "posterior":
        if solution.degrees_of_freedom == 0:
            yield "The sds were to be scaled with the estimated σ₀, which does not exist without degrees of freedom."
        elif solution.degrees_of_freedom < FEW_DEGREES_OF_FREEDOM:
            spread = 100 / math.sqrt(2 * solution.degrees_of_freedom)
            yield (
                f"The sds are scaled with a σ₀ estimated from {solution.degrees_of_freedom} degrees of freedom, "
                f"itself uncertain by about {spread:.0f} %."
            )


def _free_network(adjustment: Adjustment) -> Iterator[str]:
    """What the coordinates of a free network refer to, where any were given and where none were."""
    sought = adjustment.unknowns.sought
    given = ~np.isnan(adjustment.job.marks.given) & sought
    if given.any():
        yield "Free network: coordinates and sds refer to the fit on the given coordinates, not to outside control."
    if sought[:, :UP].any() and not given[:, :UP].any():
        yield (
            "Free network, and no plan coordinates were given: its position, its north unless an azimuth holds it, "
            "and its scale unless distances hold it are arbitrary."
        )
    if sought[:, UP].any() and not given[:, UP].any():
        yield "Free network, and no heights were given: they count from an arbitrary level."

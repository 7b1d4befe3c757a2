"""What to do next about a blunder, in one plain sentence."""

from __future__ import annotations

from collections.abc import Sequence

from adjust.blunders.context import Explanation
from adjust.blunders.hypothesis import Hypothesis

_OF_GROUPS = {
    "instrument height": "Look for the {name} in the notes of the setup; if it cannot be settled, leave its sights "
    "out, with a reason.",
    "station": "Find out on what the instrument stood: compare the {name} with notes and sketch, or set up again.",
    "target": "Find out what was sighted: compare the {name} with notes and sketch, or sight it again.",
    "distance constant": "Look up which target was used and its constant in job.toml: the {name} is common to all of "
    "them.",
    "distance scale": "Look up the weather and the calibration of the instrument: the {name} is common to all of them.",
    "staff scale": "Look up the calibration of the staves: the {name} is common to all of them.",
}
_OF_GROUPS["target height"] = _OF_GROUPS["instrument height"]


CONVINCING = 20.0
"""Odds of an explanation from which on the book is looked at before anything is measured again: one in twenty errs, the
usual level of a test."""

UNSETTLED = (
    "Begin with the closures (hubtack check) and with what the book itself shows; mend the plainest error, then search "
    "again: the sizes here are not to be relied on."
)


def advice(
    suspect: Hypothesis,
    explanations: Sequence[Explanation],
    alternatives: Sequence[Hypothesis],
    deciding: str | None,
    all_held: bool,
    settled: bool = True,
) -> str:
    """One sentence; `deciding` is the source of the observation whose repetition tells the alternatives apart.

    `all_held`: the suspect and all that could stand in its place are coordinates of control, which nobody measures
    again. `settled`: the search came to rest.
    """
    if not settled:
        return UNSETTLED
    others = any(other.name != suspect.name for other in alternatives)
    corrections = explanations[0].corrections if explanations else ()
    if corrections and (not others or explanations[0].odds >= CONVINCING):
        wanted = " and ".join(f"{each.title} {each.text or 'blank'}" for each in corrections)
        where = " and ".join(dict.fromkeys(each.source for each in corrections))
        otherwise = _continued(_among(deciding, all_held)) if others else _ELSE[suspect.single]
        return (
            f"Look at {where} in the book: if it should be {wanted}, correct it, with the reason; if not, {otherwise}."
        )
    return _among(deciding, all_held) if others else _by_itself(suspect)


def _among(deciding: str | None, all_held: bool) -> str:
    """Where several errors cannot be told apart."""
    if all_held:
        return "Look up each of these coordinates where they came from: all of them are given, none was measured here."
    if deciding:
        return f"Measure {deciding} again: that tells which of these it is."
    return "No single repetition tells which of these it is: compare each with the book, and measure them all again."


def _continued(sentence: str) -> str:
    """A sentence as the last part of another."""
    return sentence[0].lower() + sentence[1:].rstrip(".")


def _by_itself(suspect: Hypothesis) -> str:
    """Where nothing else could be wrong in its place, and no common mistake says how."""
    if suspect.nature == "control":
        return f"Look up the {suspect.name} where it came from; if it stands there as written, hold it no longer."
    if suspect.nature in _OF_GROUPS:
        return _OF_GROUPS[suspect.nature].format(name=suspect.name)
    return f"Look at {suspect.name} in the book, and measure it again if you can; else leave it out, with a reason."


_ELSE = {
    True: "measure it again or leave it out",
    False: "look it up where it came from",
}

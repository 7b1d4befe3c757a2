"""What the search for blunders found, in the words of the page."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray
from adjust.reports.wording import NAMES, between, decimals, dms
from adjust.units import ARCSEC

if TYPE_CHECKING:
    from adjust.blunders import Blunder, Explanation, Findings, Hypothesis

SMALL = {"m": (1e-3, "mm"), "rad": (ARCSEC, "″"), "1": (1e-6, "ppm")}
"""In which errors are printed, by the unit of a hypothesis."""
RECORD = {"at": None, "from": None, "to": None}
MOST_SOURCES = 5
"""Sources that are named of an error that many rows share."""


@dataclass(frozen=True)
class BlunderWords:
    """One blunder as printed; `marks` link it to the map, `""` stands for what cannot be said."""

    what: str
    name: str
    sources: str
    marks: tuple[int, ...]
    off_by: str
    expected: str
    test: str
    critical: str
    alternatives: tuple[str, ...]
    deciding: str
    explanations: tuple[str, ...]


def blunder_words(adjustment: Adjustment, findings: Findings | None) -> list[BlunderWords]:
    """All blunders, the plainest first; none where nobody searched."""
    return [] if findings is None else [_words(adjustment, blunder) for blunder in findings.blunders]


def _words(adjustment: Adjustment, blunder: Blunder) -> BlunderWords:
    hypothesis = blunder.hypothesis
    others = len(blunder.sources) - MOST_SOURCES
    sources = ", ".join(blunder.sources[:MOST_SOURCES]) + (f" and {others} more" if others > 0 else "")
    return BlunderWords(
        what=_what(adjustment, hypothesis),
        name=blunder.name,
        sources="" if sources == blunder.name else sources,
        marks=_marks(adjustment, hypothesis),
        off_by=_errors(hypothesis, blunder.estimated_error, blunder.sd),
        expected=_values(hypothesis, blunder.expected_value),
        test=decimals(blunder.test, 2),
        critical=decimals(blunder.critical, 2),
        alternatives=tuple(each.name for each in blunder.alternatives),
        deciding="" if blunder.deciding is None else blunder.deciding[0],
        explanations=tuple(map(_explanation, blunder.explanations)),
    )


def _marks(adjustment: Adjustment, hypothesis: Hypothesis) -> tuple[int, ...]:
    """The mark of a group, or the marks of a single row."""
    if hypothesis.mark is not None:
        return (hypothesis.mark,)
    kind, rows = hypothesis.rows[0]
    if not hypothesis.single:
        return ()
    return tuple(adjustment.job.observations[kind].marks[int(rows[0])].tolist())


def _what(adjustment: Adjustment, hypothesis: Hypothesis) -> str:
    """The kind and the marks of a single row; "" of a group, whose name says it."""
    if not hypothesis.single:
        return ""
    observations = adjustment.job.observations[hypothesis.rows[0][0]]
    names = [adjustment.job.marks.names[mark] for mark in _marks(adjustment, hypothesis)]
    return f"{NAMES[observations.kind][0]} {between(dict(RECORD, **dict(zip(observations.roles, names, strict=True))))}"


def _errors(hypothesis: Hypothesis, errors: FloatArray, sds: FloatArray) -> str:
    scale, unit = SMALL[hypothesis.unit]
    return "; ".join(
        f"{name} {decimals(error / scale, 2, signed=True)} ± {decimals(sd / scale, 2)} {unit}".strip()
        for name, error, sd in zip(hypothesis.components, errors.tolist(), sds.tolist(), strict=True)
    )


def _values(hypothesis: Hypothesis, values: FloatArray | None) -> str:
    if values is None or hypothesis.unit == "1":
        return ""
    degrees = 1 / ARCSEC / 3600
    texts = [f"{decimals(value, 4)} m" if hypothesis.unit == "m" else dms(value * degrees, 1) for value in values.flat]
    names = hypothesis.components if len(texts) == len(hypothesis.components) else ("",) * len(texts)
    return "; ".join(f"{name} {text}".strip() for name, text in zip(names, texts, strict=True))


def _explanation(explanation: Explanation) -> str:
    """The mistake, what it leaves, and how it stands against all other explanations."""
    odds = f"{explanation.odds:.0f} to 1" if explanation.odds >= 1 else f"1 to {1 / max(explanation.odds, 1e-9):.0f}"
    text = explanation.mistake[:1].upper() + explanation.mistake[1:]
    return f"{text}; mended, its misfit is {decimals(explanation.w_after, 1)} sd; odds {odds} against all else."

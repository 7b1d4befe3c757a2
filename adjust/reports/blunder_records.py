"""Blunders for programs: the records of `blunders` in results.json and in blunders.json, SI and degrees."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from adjust.arrays import FloatArray
from adjust.job import Job
from adjust.reports.blunder_words import marks_of
from adjust.reports.records import CONTROL_COMPONENTS, Record, number

if TYPE_CHECKING:
    from adjust.blunders import Blunder, Explanation, Findings, Hypothesis


def blunder_records(job: Job, findings: Findings) -> Iterator[Record]:
    """One record a blunder, the plainest first."""
    for blunder in findings.blunders:
        yield blunder_record(job, blunder)


def blunder_record(job: Job, blunder: Blunder) -> Record:
    """`source` names a single row, `group` what many rows share; the other is None."""
    suspect = blunder.hypothesis
    names = _components(job, suspect)
    return {
        "source": blunder.name if suspect.single else None,
        "group": None if suspect.single else blunder.name,
        "nature": suspect.nature,
        "kind": job.observations[suspect.rows[0][0]].kind if suspect.single else None,
        "component": names[0] or None if len(names) == 1 else None,
        "marks": [job.marks.names[mark] for mark in marks_of(job, suspect)],
        "sources": list(blunder.sources),
        "unit": "deg" if suspect.unit == "rad" else suspect.unit,
        "estimated_error": _figure(suspect, names, blunder.estimated_error),
        "sd": _figure(suspect, names, blunder.sd),
        "expected_value": _figure(suspect, names, blunder.expected_value),
        "test": number(blunder.test),
        "critical": number(blunder.critical),
        "alternatives": [each.name for each in blunder.alternatives],
        "alternative_mistakes": [each and each.mistake for each in blunder.instead_explained],
        "deciding": None if blunder.deciding is None else blunder.deciding[0],
        "written": [
            {"source": each.source, "column": each.title, "text": each.text, "expected": each.expected or None}
            for each in blunder.booked
        ],
        "explanations": [_explanation(job, suspect, each) for each in blunder.explanations],
        "advice": blunder.advice,
    }


def _components(job: Job, suspect: Hypothesis) -> tuple[str, ...]:
    """Names of the components: easting, northing and height of control."""
    return tuple(CONTROL_COMPONENTS[axis] for axis in suspect.given_axes(job)) or suspect.components


def _figure(suspect: Hypothesis, names: Sequence[str], values: FloatArray | None) -> Any:
    """One number, or one for each component by its name; degrees for radians; None where there is none."""
    if values is None:
        return None
    figures = np.degrees(values) if suspect.unit == "rad" else values
    if figures.size == 1:
        return number(float(figures.flat[0]))
    return {name: number(float(value)) for name, value in zip(names, figures.flat, strict=True)}


def _explanation(job: Job, suspect: Hypothesis, explanation: Explanation) -> Record:
    names = job.observations[suspect.rows[0][0]].components
    return {
        "mistake": explanation.mistake,
        "names": list(explanation.names),
        "corrected_value": _figure(suspect, names, explanation.corrected_value),
        "corrections": [
            {"source": each.source, "column": each.title, "value": each.text} for each in explanation.corrections
        ],
        "w_after": number(explanation.w_after),
        "odds": number(explanation.odds),
    }

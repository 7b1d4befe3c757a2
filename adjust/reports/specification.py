"""The adjusted network held against its specification: every mark and every pair, the worst first."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from adjust.adjustment import PUBLISHED, Adjustment
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.quality import ellipse_factor, half_interval, standard_ellipse
from adjust.reports.records import MILLIMETRES, Record, number
from adjust.standards import ACCURACY_STANDARDS, Assessment, Measure, assess

LISTED = 20
"""Least number of marks or pairs that are listed for each figure, as far as there are so many: all that fail are."""

MOST_FOR_ALL_PAIRS = 1000
"""Marks up to which all pairs are assessed: half a million pairs, from a dense covariance of 72 MB."""

EDITION = "Check the edition in force where you work."
RECALLED = "figure from memory, without the page at hand"


@dataclass(frozen=True)
class Pairs:
    """Pairs of marks with what is known of each: `distance`, `plan` (semi-major) and `height`, at 95 %, metres."""

    marks: IntArray
    distance: FloatArray
    plan: FloatArray
    height: FloatArray


@dataclass(frozen=True)
class Specified:
    """What came of the specification of a job; `note` says what could not be assessed as asked, "" for nothing."""

    adjustment: Adjustment
    pairs: Pairs
    assessments: tuple[Assessment, ...]
    note: str

    @property
    def passed(self) -> bool | None:
        """Whether everything keeps within; None where nothing was asked for or could be assessed."""
        answers = [assessment.passed for assessment in self.assessments if assessment.passed is not None]
        return all(answers) if answers else None

    def names(self, assessment: Assessment, place: int) -> list[str]:
        """The mark, or both marks of the pair, at a place of an assessment."""
        item = int(assessment.items[place])
        rows = self.pairs.marks[item] if assessment.requirement.measure.of_pairs else [item]
        return [self.adjustment.job.marks.names[row] for row in rows]


def specified(adjustment: Adjustment) -> Specified:
    """Hold an adjustment against the specification of its job."""
    specification = adjustment.job.specification
    requirements = specification.requirements
    of_pairs = any(requirement.measure.of_pairs for requirement in requirements)
    too_many = len(adjustment.job.marks) > MOST_FOR_ALL_PAIRS
    every = specification.pairs == "all" and of_pairs and not too_many
    pairs = _every_pair(adjustment) if every else _observed_pairs(adjustment)
    chosen = _chosen(adjustment)
    figures = {
        Measure.MARK_PLAN: adjustment.horizontal_95,
        Measure.MARK_HEIGHT: adjustment.height_95,
        Measure.PAIR_PLAN: pairs.plan,
        Measure.PAIR_HEIGHT: pairs.height,
    }
    assessments = []
    for requirement in requirements:
        paired = requirement.measure.of_pairs
        distance = pairs.distance if paired else np.zeros(len(chosen))
        applies = np.all(chosen[pairs.marks], axis=1) if paired else chosen
        assessments.append(assess(requirement, figures[requirement.measure], distance, applies))
    note = _too_many_words(adjustment) if specification.pairs == "all" and of_pairs and too_many else ""
    return Specified(adjustment, pairs, tuple(assessments), note)


def _too_many_words(adjustment: Adjustment) -> str:
    return (
        f"All pairs were asked for; of {len(adjustment.job.marks)} marks only the observed pairs were assessed "
        f"(all pairs up to {MOST_FOR_ALL_PAIRS} marks)."
    )


def _chosen(adjustment: Adjustment) -> BoolArray:
    marks = adjustment.job.specification.marks
    chosen = np.full(len(adjustment.job.marks), not marks)
    chosen[list(marks)] = True
    return chosen


def _observed_pairs(adjustment: Adjustment) -> Pairs:
    return _pairs(adjustment, adjustment.lines, adjustment.line_covariances)


def _every_pair(adjustment: Adjustment) -> Pairs:
    """All pairs, from the joint covariance of all marks."""
    count = len(adjustment.job.marks)
    first, second = np.triu_indices(count, 1)
    joint = adjustment.covariance(adjustment.job.marks.names).reshape(count, 3, count, 3).transpose(0, 2, 1, 3)
    own = joint[np.arange(count), np.arange(count)]
    across = joint[first, second]
    differences = own[first] + own[second] - across - across.transpose(0, 2, 1)
    unknown = np.isnan(adjustment.standard_deviations)
    missing = unknown[first] | unknown[second]
    differences[missing[:, :, None] | missing[:, None, :]] = np.nan
    return _pairs(adjustment, np.column_stack([first, second]), differences)


def _pairs(adjustment: Adjustment, marks: IntArray, covariances: FloatArray) -> Pairs:
    used = adjustment.degrees_of_freedom_used
    return Pairs(
        marks=marks,
        distance=adjustment.geometry.level_distance(marks[:, 0], marks[:, 1])[0],
        plan=standard_ellipse(covariances[:, :2, :2]).semi_major * ellipse_factor(PUBLISHED, used),
        height=half_interval(np.sqrt(covariances[:, 2, 2]), PUBLISHED, used),
    )


def specification_record(held: Specified) -> Record:
    """The specification for `results.json`: standards, whether all passed, and each figure with its worst items."""
    job = held.adjustment.job
    return {
        "passed": held.passed,
        "pairs": job.specification.pairs,
        "marks": [job.marks.names[mark] for mark in job.specification.marks],
        "standards": [
            {"name": name, "source": ACCURACY_STANDARDS[name].source, "year": year_of(name), "recalled": recalled(name)}
            for name in job.specification.standards
        ],
        "checks": [_check(held, assessment) for assessment in held.assessments],
        "note": held.note,
    }


def recalled(name: str) -> bool:
    """Whether a standard has a figure from memory."""
    return ACCURACY_STANDARDS[name].recalled


def year_of(name: str) -> int | None:
    """The year of the edition, as its source states it; None where it does not."""
    years = re.findall(r"(?:\(|-)((?:19|20)\d\d)\b", ACCURACY_STANDARDS[name].source)
    return int(years[0]) if years else None


def _check(held: Specified, assessment: Assessment) -> Record:
    rule = assessment.requirement.rule
    return {
        "measure": assessment.requirement.measure.name.lower(),
        "words": assessment.requirement.measure.value,
        "rule": rule.printed,
        "standard": rule.source or None,
        "recalled": rule.recalled,
        "assessed": len(assessment.items),
        "failing": int(np.count_nonzero(assessment.fails)),
        "passed": assessment.passed,
        "worst": list(_worst(held, assessment)),
    }


def _worst(held: Specified, assessment: Assessment) -> Iterator[Record]:
    """All that fail, and at least `LISTED`, the worst first."""
    shown = max(int(np.count_nonzero(assessment.fails)), min(LISTED, len(assessment.items)))
    figures, allowed, share = assessment.figure * MILLIMETRES, assessment.allowed * MILLIMETRES, assessment.share
    paired = assessment.requirement.measure.of_pairs
    for place in range(shown):
        distance = held.pairs.distance[assessment.items[place]] if paired else np.nan
        yield {
            "marks": held.names(assessment, place),
            "distance_m": number(distance),
            "figure_mm": float(figures[place]),
            "allowed_mm": float(allowed[place]),
            "share": float(share[place]),
            "passed": bool(share[place] <= 1.0),
        }

"""What the page says around its tables: the verdict, the figures that carry it, and the smaller sections."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from adjust.adjustment import Adjustment
from adjust.network.closures.check import Check
from adjust.observations import KIND_NAMES
from adjust.quality import critical_tau, critical_w, non_centrality
from adjust.reports.check_records import check_record
from adjust.reports.check_words import NAMES as CLOSURES
from adjust.reports.check_words import check_verdict
from adjust.reports.records import MILLIMETRES, Record
from adjust.reports.selection import listed_observations
from adjust.reports.specification import EDITION, Specified, specification_record
from adjust.reports.verdict import cautions, verdict
from adjust.reports.weights import component_records, weight_records
from adjust.reports.wording import (
    ARCSECONDS,
    between,
    counted,
    decimals,
    observed,
    small,
    small_unit,
    what,
)
from adjust.variance_components import VarianceComponent

MOST_SUSPECTS = 200
"""Suspects of the page's own section, the worst; the table of observations has the others."""


@dataclass(frozen=True)
class Figure:
    """A number as printed, with the number itself and where `results.json` has it; "" for plain words."""

    text: str
    value: float | int | None = None
    key: str = ""


@dataclass(frozen=True)
class Card:
    """One of the few figures that carry the verdict. `state` is "good", "bad" or "plain"."""

    name: str
    figure: Figure
    detail: tuple[Figure, ...]
    state: str = "plain"


@dataclass(frozen=True)
class Verdict:
    """The answer ahead of everything: its state, a word for it, and two or three sentences."""

    state: str
    word: str
    sentences: tuple[str, ...]


def page_verdict(adjustment: Adjustment, held: Specified) -> Verdict:
    """Is it good, where is it weak, does it meet its specification?"""
    passed = adjustment.solution.global_test.passed
    if passed is None:
        state, word = "open", "Unchecked"
    elif adjustment.accepted and held.passed is not False:
        state, word = "good", "Accepted"
    else:
        state, word = "bad", "Look into it"
    sentences = (verdict(adjustment), _weakest_words(adjustment), _specification_words(held))
    return Verdict(state, word, tuple(sentence for sentence in sentences if sentence))


def weakest(adjustment: Adjustment) -> tuple[int, str, float] | None:
    """The mark with the largest 95 % circle, or 95 % height where no plan was adjusted; its key; metres."""
    for key, figures in (("horizontal_95_mm", adjustment.horizontal_95), ("height_95_mm", adjustment.height_95)):
        if np.any(figures > 0):
            mark = int(np.nanargmax(figures))
            return mark, key, float(figures[mark])
    return None


def _weakest_words(adjustment: Adjustment) -> str:
    found = weakest(adjustment)
    if found is None:
        return ""
    mark, key, metres = found
    name, size = adjustment.job.marks.names[mark], decimals(metres * MILLIMETRES, 1)
    if key == "horizontal_95_mm":
        return f"The weakest mark is {name}: its true place lies within {size} mm with a probability of 95 %."
    return f"The weakest mark is {name}: its true height lies within ± {size} mm with a probability of 95 %."


def _specification_words(held: Specified) -> str:
    if not held.assessments or held.passed is None:
        return ""
    names = list(dict.fromkeys(each.requirement.rule.source or "the job's own figures" for each in held.assessments))
    failing = [each for each in held.assessments if each.passed is False]
    if not failing:
        return f"The network meets {' and '.join(names)}."
    wrong = list(dict.fromkeys(each.requirement.rule.source or "the job's own figures" for each in failing))
    return f"The network does not meet {' and '.join(wrong)}."


def cards(adjustment: Adjustment, held: Specified) -> list[Card]:
    """The handful of figures below the verdict."""
    return [
        *_test_cards(adjustment),
        *_weakest_card(adjustment),
        *_suspect_card(adjustment),
        *_specification_card(held),
    ]


def _test_cards(adjustment: Adjustment) -> Iterator[Card]:
    solution, test = adjustment.solution, adjustment.solution.global_test
    if test.passed is not None:
        bounds = tuple(
            Figure(decimals(value, 2), value, f"solution.global_test.{key}")
            for value, key in ((test.lower, "lower"), (test.upper, "upper"))
        )
        statistic = Figure(decimals(test.statistic, 2), test.statistic, "solution.global_test.statistic")
        detail = (Figure("vᵀPv"), statistic, Figure("expected"), bounds[0], Figure("to"), bounds[1])
        yield Card(
            "Global test", Figure("passed" if test.passed else "failed"), detail, "good" if test.passed else "bad"
        )
    counts = (
        Figure(str(solution.observations), solution.observations, "solution.observations"),
        Figure("observations,"),
        Figure(str(solution.unknowns), solution.unknowns, "solution.unknowns"),
        Figure("unknowns"),
    )
    freedom = solution.degrees_of_freedom
    yield Card(
        "Degrees of freedom",
        Figure(str(freedom), freedom, "solution.degrees_of_freedom"),
        counts,
        "plain" if freedom else "bad",
    )


def _weakest_card(adjustment: Adjustment) -> Iterator[Card]:
    found = weakest(adjustment)
    if found is not None:
        mark, key, metres = found
        size = metres * MILLIMETRES
        words = "95 % circle of" if key == "horizontal_95_mm" else "95 % height of"
        name = adjustment.job.marks.names[mark]
        yield Card(
            "Weakest mark",
            Figure(f"{decimals(size, 2)} mm", size, f"marks[{mark}].{key}"),
            (Figure(f"{words} {name}"),),
        )


def _suspect_card(adjustment: Adjustment) -> Iterator[Card]:
    count = len(adjustment.suspects)
    yield Card(
        "Suspects",
        Figure(str(count), count, "len(suspects)"),
        (Figure(f"worst {adjustment.suspects[0]}" if count else "no observation stands out"),),
        "bad" if count else "good",
    )


def _specification_card(held: Specified) -> Iterator[Card]:
    if held.passed is not None:
        met = sum(each.passed is True for each in held.assessments)
        asked = sum(each.passed is not None for each in held.assessments)
        yield Card(
            "Specification",
            Figure("met" if held.passed else "not met"),
            (Figure(f"{met} of {counted(asked, 'requirement', 'requirements')}"),),
            "good" if held.passed else "bad",
        )


@dataclass(frozen=True)
class Suspect:
    """A suspect observation in words."""

    source: str
    what: str
    between: str
    marks: tuple[int, ...]
    observed: str
    test: Figure
    off_by: str


def suspects(adjustment: Adjustment) -> list[Suspect]:
    """The suspects, worst first."""
    key = "tau" if adjustment.solution.sd_basis == "posterior" else "w"
    statistics = adjustment.job.statistics
    shift = non_centrality(statistics.significance, statistics.power) ** 0.5
    found = [record for record in listed_observations(adjustment, "worst", MOST_SUSPECTS) if record["suspect"]]
    return [_suspect(adjustment, record, key, shift) for record in found]


def _suspect(adjustment: Adjustment, record: Record, key: str, shift: float) -> Suspect:
    index = adjustment.job.marks.index
    error = dict(record, error=-record["w"] * record["minimal_detectable_bias"] / shift)
    return Suspect(
        source=record["source"],
        what=what(record) if record["component"] else KIND_NAMES[record["kind"]][0],
        between=between(record),
        marks=tuple(index[record[role]] for role in ("at", "from", "to") if record[role] is not None),
        observed=observed(record),
        test=Figure(decimals(record[key], 2, signed=True), record[key], key),
        off_by=f"{small(error, 'error', signed=True)} {small_unit(record)}",
    )


def test_words(adjustment: Adjustment) -> str:
    """What makes an observation suspect."""
    statistics, solution = adjustment.job.statistics, adjustment.solution
    if solution.sd_basis == "prior":
        return f"suspect where |w| is beyond {critical_w(statistics.significance):.2f}"
    if solution.degrees_of_freedom < 2:
        return "nothing is left to test an observation against"
    return f"suspect where |τ| is beyond {critical_tau(statistics.significance, solution.degrees_of_freedom):.2f}"


@dataclass(frozen=True)
class WeightRow:
    """One kind's weights as printed."""

    name: str
    record: Record
    cells: tuple[Figure, ...]
    unit: str


def weight_rows(adjustment: Adjustment) -> list[WeightRow]:
    """How much each kind weighs."""
    rows = []
    for place, record in enumerate(weight_records(adjustment)):
        scale, unit = (MILLIMETRES, "mm") if record["unit"] == "m" else (ARCSECONDS, "″")
        cells = [Figure(str(record["observations"]), record["observations"], f"weights[{place}].observations")]
        cells += [
            Figure(decimals(record[key] * scale, 2), record[key] * scale, f"weights[{place}].{key}")
            for key in ("sd_smallest", "sd_median", "sd_largest")
        ]
        cells += [
            Figure(decimals(record[key], 2) or "–", record[key], f"weights[{place}].{key}")
            for key in ("redundancy", "weighted_square_sum")
        ]
        rows.append(WeightRow(KIND_NAMES[record["kind"]][1], record, tuple(cells), unit))
    return rows


@dataclass(frozen=True)
class ComponentRow:
    """How well the sds of one group were stated, as printed."""

    name: str
    cells: tuple[Figure, ...]
    differs: bool


def component_rows(components: Sequence[VarianceComponent]) -> list[ComponentRow]:
    """The variance components."""
    rows = []
    for place, record in enumerate(component_records(components)):
        key = f"variance_components[{place}]"
        cells = [Figure(str(record["observations"]), record["observations"], f"{key}.observations")]
        cells += [
            Figure(decimals(record[name], 2) or "–", record[name], f"{key}.{name}")
            for name in ("redundancy", "factor", "sd", "lower", "upper")
        ]
        rows.append(ComponentRow(record["name"], tuple(cells), record["differs"] is True))
    return rows


@dataclass(frozen=True)
class ClosureRow:
    """One check before the adjustment as printed."""

    name: str
    cells: tuple[Figure, ...]
    exceeds: bool


def closure_rows(check: Check) -> list[ClosureRow]:
    """The checks before the adjustment."""
    rows = []
    for place, judged in enumerate(check.closures):
        record = check_record(judged)
        cells = [Figure(str(record[key]), record[key], f"closures[{place}].{key}") for key in ("closures", "exceeding")]
        share = record["largest_share"]
        cells.append(Figure(decimals(share, 2) or "–", share, f"closures[{place}].largest_share"))
        rows.append(ClosureRow(CLOSURES[record["check"]][1], tuple(cells), record["exceeding"] > 0))
    return rows


def closure_words(check: Check | None) -> str:
    """The verdict on the closures."""
    return "" if check is None else check_verdict(check)


def specification(held: Specified) -> Record:
    """The specification's record with the standing advice."""
    return {**specification_record(held), "edition": EDITION}


def page_cautions(adjustment: Adjustment, standing: str) -> tuple[str, ...]:
    """What must not be overlooked, the standing caution last."""
    return (*cautions(adjustment), standing)

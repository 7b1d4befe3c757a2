"""`results.json`: everything an adjustment found, for programs. docs/results.md describes every key."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, TextIO

from adjust.adjustment import Adjustment
from adjust.reports.blunder_records import blunder_records
from adjust.reports.decision_words import decision_records
from adjust.reports.records import (
    Figures,
    Record,
    job_record,
    line_figures,
    mark_figures,
    number,
    observation_figures,
)
from adjust.reports.specification import specification_record, specified
from adjust.reports.weights import component_records, weight_records

if TYPE_CHECKING:
    from adjust.blunders import Findings
    from adjust.variance_components import VarianceComponent

SCHEMA = "hubtack-results/1"

_ENCODER = json.JSONEncoder(ensure_ascii=False, allow_nan=False)
"""Floats in the shortest digits that read back as the same number; NaN is refused rather than written."""


def write_results(
    adjustment: Adjustment,
    cautions: Iterable[str],
    path: Path,
    closures: Iterable[Record] = (),
    findings: Findings | None = None,
    components: Sequence[VarianceComponent] | None = None,
) -> None:
    """One key a line, and one line for each mark, observation and pair, so that results compare line by line.

    `closures` are the records of the checks before the adjustment, as `check.json` has them; `findings` what a search
    for blunders found, None where nobody searched; `components` are the variance components, None where nobody asked
    for them. Text is made column by column and some rows at a time: a million observations never stand in memory as
    objects.
    """
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(f'{{\n"schema": {_ENCODER.encode(SCHEMA)},\n')
        file.write(f'"job": {_ENCODER.encode(job_record(adjustment.job) | {"heights": _heights(adjustment)})},\n')
        file.write(f'"solution": {_ENCODER.encode(solution_record(adjustment))},\n')
        _write_records(file, "marks", mark_figures(adjustment))
        _write_records(file, "observations", observation_figures(adjustment))
        _write_records(file, "relative", line_figures(adjustment))
        write_list(file, "suspects", iter(adjustment.suspects))
        write_list(file, "cautions", iter(cautions))
        write_list(file, "notes", iter(adjustment.notes))
        file.write(f'"specification": {_ENCODER.encode(specification_record(specified(adjustment)))},\n')
        write_list(file, "weights", weight_records(adjustment))
        _write_list_or_null(file, "variance_components", None if components is None else component_records(components))
        write_list(file, "closures", iter(closures))
        _write_list_or_null(file, "blunders", None if findings is None else blunder_records(adjustment.job, findings))
        write_list(file, "decisions", decision_records(adjustment.job), last=True)
        file.write("}\n")


def write_list(file: TextIO, key: str, entries: Iterator[Record] | Iterator[str], *, last: bool = False) -> None:
    """Write a list under `key`, one entry a line."""
    _write_lines(file, key, ([_ENCODER.encode(entry)] for entry in entries), last)


def _write_list_or_null(file: TextIO, key: str, entries: Iterator[Record] | None) -> None:
    if entries is None:
        file.write(f'"{key}": null,\n')
    else:
        write_list(file, key, entries)


def _write_records(file: TextIO, key: str, chunks: Iterator[Figures]) -> None:
    """Write the rows of columns under `key`, one record a line."""
    _write_lines(file, key, map(_record_texts, chunks), last=False)


def _write_lines(file: TextIO, key: str, blocks: Iterator[list[str]], last: bool) -> None:
    separator = f'"{key}": [\n'
    empty = True
    for block in blocks:
        file.write(separator + ",\n".join(block))
        separator, empty = ",\n", False
    file.write((f'"{key}": []' if empty else "\n]") + ("\n" if last else ",\n"))


def _record_texts(figures: Figures) -> list[str]:
    """JSON of each row of columns: the columns' texts, put into one template."""
    template = "{" + ", ".join(f"{_ENCODER.encode(key)}: %s" for key in figures) + "}"
    return [template % row for row in zip(*map(_texts, figures.values()), strict=True)]


def _texts(column: Any) -> list[str]:
    """JSON of each entry of a column: nested columns, matrices, text, or else numbers and truth values."""
    if isinstance(column, dict):
        return _record_texts(column)
    kinds = set(map(type, column))
    if list in kinds:
        return [_ENCODER.encode(entry) for entry in column]
    if str in kinds:
        known = {entry: _ENCODER.encode(entry) for entry in dict.fromkeys(column)}
        return [known[entry] for entry in column]
    return _ENCODER.encode(column)[1:-1].split(", ")


def _heights(adjustment: Adjustment) -> str | None:
    """What heights mean; None in a plane frame, where the field book does not say."""
    if adjustment.job.frame.kind == "plane":
        return None
    return "orthometric" if adjustment.job.orthometric else "ellipsoidal"


def solution_record(adjustment: Adjustment) -> Record:
    """The scalars of the adjustment."""
    solution, test = adjustment.solution, adjustment.solution.global_test
    return {
        "observations": solution.observations,
        "unknowns": solution.unknowns,
        "datum_defect": solution.datum_defect,
        "degrees_of_freedom": solution.degrees_of_freedom,
        "iterations": solution.iterations,
        "converged": solution.converged,
        "variance_factor": number(solution.variance_factor),
        "global_test": {
            "statistic": number(test.statistic),
            "lower": number(test.lower),
            "upper": number(test.upper),
            "confidence": test.confidence,
            "passed": test.passed,
        },
        "condition_number": number(solution.condition_number),
        "sd_basis": solution.sd_basis,
        "second_opinion_gap": number(solution.second_opinion_gap),
    }

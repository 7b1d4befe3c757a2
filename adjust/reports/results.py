"""`results.json`: everything an adjustment found, for programs. docs/results.md describes every key."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import TextIO

from adjust.adjustment import Adjustment
from adjust.frames import EllipsoidFrame
from adjust.reports.records import Record, line_records, mark_records, number, observation_records

SCHEMA = "hubtack-results/1"

_ENCODER = json.JSONEncoder(ensure_ascii=False, allow_nan=False)
"""Floats in the shortest digits that read back as the same number; NaN is refused rather than written."""


def write_results(adjustment: Adjustment, cautions: Iterable[str], path: Path) -> None:
    """One key a line, and one line for each mark, observation and pair, so that results compare line by line.

    Records are written as they are made: a million observations never stand in memory as objects.
    """
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(f'{{\n"schema": {_ENCODER.encode(SCHEMA)},\n')
        file.write(f'"job": {_ENCODER.encode(job_record(adjustment))},\n')
        file.write(f'"solution": {_ENCODER.encode(solution_record(adjustment))},\n')
        write_list(file, "marks", mark_records(adjustment))
        write_list(file, "observations", observation_records(adjustment))
        write_list(file, "relative", line_records(adjustment))
        write_list(file, "suspects", iter(adjustment.suspects))
        write_list(file, "cautions", iter(cautions))
        write_list(file, "notes", iter(adjustment.notes), last=True)
        file.write("}\n")


def write_list(file: TextIO, key: str, entries: Iterator[Record] | Iterator[str], *, last: bool = False) -> None:
    separator = f'"{key}": [\n'
    empty = True
    for entry in entries:
        file.write(separator + _ENCODER.encode(entry))
        separator, empty = ",\n", False
    file.write((f'"{key}": []' if empty else "\n]") + ("\n" if last else ",\n"))


def job_record(adjustment: Adjustment) -> Record:
    """What was adjusted; `crs` is None in a plane frame."""
    job = adjustment.job
    return {
        "title": job.title,
        "frame": job.frame.kind,
        "crs": job.frame.crs if isinstance(job.frame, EllipsoidFrame) else None,
        "input_sha256": job.input_sha256,
        "date": job.date,
    }


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

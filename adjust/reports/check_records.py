"""`check.json`: everything a check found, for programs. docs/closures.md describes every key."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from adjust.arrays import FloatArray
from adjust.network.closures.check import Check
from adjust.network.closures.closures import Judged
from adjust.reports.check_words import observations, rests_on
from adjust.reports.records import Record, job_record, number
from adjust.reports.results import write_list
from adjust.tolerances import STANDARDS

SCHEMA = "hubtack-check/1"
_ENCODER = json.JSONEncoder(ensure_ascii=False, allow_nan=False)
ANGULAR_FIGURES = frozenset(("sum", "angular"))
"""Figures that are angles."""


def write_check(check: Check, path: Path) -> None:
    """One key a line, and one line for each closure, so that checks compare line by line."""
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(f'{{\n"schema": {_ENCODER.encode(SCHEMA)},\n')
        for key, value in summary_record(check).items():
            file.write(f"{_ENCODER.encode(key)}: {_ENCODER.encode(value)},\n")
        write_list(file, "checks", (check_record(judged) for judged in check.closures))
        write_list(file, "closures", closure_records(check))
        write_list(file, "traverses", traverse_records(check))
        write_list(file, "remarks", remark_records(check))
        write_list(file, "look_first", suspicion_records(check))
        write_list(file, "shared_lines", shared_records(check))
        write_list(file, "clues", clue_records(check))
        write_list(file, "notes", iter(check.notes), last=True)
        file.write("}\n")


def summary_record(check: Check) -> Record:
    """The job, whether it passed, and by what it was judged."""
    job, tolerances = check.job, check.job.tolerances
    return {
        "job": job_record(job),
        "passed": check.passed,
        "exceeding": check.exceeding,
        "standards": [{"name": name, "source": STANDARDS[name].source} for name in tolerances.standards],
        "confidence": tolerances.confidence,
    }


def check_record(judged: Judged) -> Record:
    """How a check went as a whole."""
    return {
        "check": judged.closures.check,
        "closures": len(judged.closures),
        "exceeding": int(judged.exceeds.sum()),
        "largest_share": number(float(judged.severity.max(initial=0.0))),
    }


def closure_records(check: Check) -> Iterator[Record]:
    """One record for each closure, in the order of the checks."""
    for judged in check.closures:
        exceeds, names = judged.exceeds.tolist(), check.job.marks.names
        for closure in range(len(judged.closures)):
            yield {
                "check": judged.closures.check,
                "marks": [names[mark] for mark in judged.closures.marks[closure].tolist()],
                "observations": rests_on(check, judged, closure),
                **_figures(judged, closure),
                "rule": str(judged.rules[int(judged.rule[closure])]),
                "exceeds": exceeds[closure],
            }


def _figures(judged: Judged, closure: int) -> Record:
    """Misclosure, sd and allowance by component, length, number of angles and what else the check has."""
    closures = judged.closures
    angular = closures.unit == "rad"
    scale = np.degrees(1.0) if angular else 1.0
    allowed = np.broadcast_to(judged.allowed, closures.misclosure.shape)
    record: Record = {"unit": "deg" if angular else "m"}
    for name, values in (("misclosure", closures.misclosure), ("sd", closures.sd), ("allowed", allowed)):
        figures = [number(float(value) * scale) for value in values[closure]]
        record[name] = figures[0] if len(figures) == 1 else dict(zip(closures.components, figures, strict=True))
    record["length_m"] = number(float(closures.length[closure]))
    record["angles"] = int(closures.angles[closure])
    for name, column in closures.figures.items():
        value = float(column[closure])
        record[f"{name}_deg" if name in ANGULAR_FIGURES else name] = number(
            float(np.degrees(value)) if name in ANGULAR_FIGURES else value
        )
    return record


def traverse_records(check: Check) -> Iterator[Record]:
    """Traverses that set out from control, with what the compass rule makes of the marks on the way."""
    for traverse in check.traverses:
        if traverse.positions is not None and len(traverse.positions):
            yield {
                "marks": [check.job.marks.names[mark] for mark in traverse.marks],
                "length_m": traverse.length,
                "angular_misclosure_deg": float(np.degrees(traverse.angular)),
                "east_m": float(traverse.misclosure[0]),
                "north_m": float(traverse.misclosure[1]),
                "compass_rule": _positions(check, traverse.marks[1:-1], traverse.positions),
            }


def _positions(check: Check, on_the_way: list[int], positions: FloatArray) -> list[Record]:
    """Marks on the way, in grid coordinates; None in a frame without a grid."""
    grid = check.job.frame.grid_coordinates(positions)
    return [
        {"mark": check.job.marks.names[mark], "easting_m": number(float(east)), "northing_m": number(float(north))}
        for mark, (east, north) in zip(on_the_way, grid, strict=True)
    ]


def remark_records(check: Check) -> Iterator[Record]:
    """What is odd about marks and rows."""
    for remark in check.remarks:
        yield {
            "check": remark.check,
            "text": remark.text,
            "marks": [check.job.marks.names[mark] for mark in remark.marks],
            "observations": observations(check, remark.rows),
            "exceeds": remark.exceeds,
        }


def suspicion_records(check: Check) -> Iterator[Record]:
    """What to look at first, the likeliest first; entries of one list cannot be told apart."""
    for suspicion in check.suspicions:
        yield {
            "observations": observations(check, suspicion.rows),
            "control": [check.job.marks.names[mark] for mark in suspicion.marks],
            "failing": suspicion.failing,
            "passing": suspicion.passing,
        }


def shared_records(check: Check) -> Iterator[Record]:
    """Pairs of failing closures of one check with exactly one line in common."""
    names = check.job.marks.names
    marks = {judged.closures.check: judged.closures.marks for judged in check.closures}
    for shared in check.shared:
        walks = [marks[shared.check][closure].tolist() for closure in (shared.first, shared.second)]
        yield {
            "check": shared.check,
            "closures": [[names[mark] for mark in walk] for walk in walks],
            "line": [names[mark] for mark in shared.marks],
            "observations": observations(check, shared.rows),
        }


def clue_records(check: Check) -> Iterator[Record]:
    """What single failing closures suggest."""
    names = check.job.marks.names
    marks = {judged.closures.check: judged.closures.marks for judged in check.closures}
    for clue in check.clues:
        yield {
            "check": clue.check,
            "marks": [names[mark] for mark in marks[clue.check][clue.closure].tolist()],
            "text": clue.text,
            "observations": observations(check, clue.rows),
        }

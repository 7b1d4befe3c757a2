"""The two files of a search for blunders."""

from __future__ import annotations

import json
from pathlib import Path

from adjust.adjustment import Adjustment
from adjust.blunders import Findings
from adjust.job import Job
from adjust.reports.blunder_records import blunder_records
from adjust.reports.blunder_words import blunder_lines, findings_verdict, none_found
from adjust.reports.decision_words import decision_records, decision_section
from adjust.reports.detectability import detectability, detectability_lines, unchecked_words
from adjust.reports.layout import paragraph, title
from adjust.reports.publish import publish
from adjust.reports.records import Record, job_record
from adjust.reports.results import write_list

BLUNDER_REPORTS = ("blunders.json", "blunders.txt")
SCREEN = 20
"""Blunders told on the screen; `blunders.txt` goes on."""
SCHEMA = "hubtack-blunders/1"
UNSETTLED = (
    "The adjustment does not settle with these errors in it: the search began where most observations agree, and how "
    "small an error would show cannot be told before they are out."
)
STANDING_CAUTION = (
    "A proposal is no proof: nothing is corrected or left out until the surveyor decides so and says why "
    "(hubtack blunders JOB --write FILE, then hubtack adjust JOB --decisions FILE)."
)
_ENCODER = json.JSONEncoder(ensure_ascii=False, allow_nan=False)


def write_blunder_reports(job: Job, findings: Findings, adjustment: Adjustment | None, folder: Path) -> None:
    """Write all `BLUNDER_REPORTS` into `folder`, or none: earlier files stay as they were when anything fails.

    `adjustment` is None where it does not settle. Raises OutputError where the folder cannot be written.
    """
    publish(
        folder,
        {
            "blunders.json": lambda path: _write_records(job, findings, adjustment, path),
            "blunders.txt": lambda path: _write_listing(job, findings, adjustment, path),
        },
    )


def _write_listing(job: Job, findings: Findings, adjustment: Adjustment | None, path: Path) -> None:
    heading = job.title if job.date is None else f"{job.title}, {job.date}"
    lines = [
        *paragraph(heading),
        "",
        *paragraph(findings_verdict(job, findings)),
        *decision_section(job),
        *title("What would show"),
        *checked_lines(findings, adjustment),
        *([*title("Blunders"), *blunder_lines(job, findings)] if findings.blunders else []),
        *title("Caution"),
        *paragraph(STANDING_CAUTION),
    ]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8", newline="\n")


def told(job: Job, findings: Findings, adjustment: Adjustment | None) -> list[str]:
    """What goes to the screen: what would show at all, then what was found."""
    found = blunder_lines(job, findings, SCREEN) if findings.blunders else [none_found(job, findings)]
    return [*checked_lines(findings, adjustment), "", *found]


def checked_lines(findings: Findings, adjustment: Adjustment | None) -> list[str]:
    """Observations without any check, and the smallest error that shows in the others."""
    unchecked = paragraph(unchecked_words(findings.unchecked))
    if adjustment is None:
        return [*paragraph(UNSETTLED), *unchecked]
    return [*unchecked, *detectability_lines(adjustment, detectability(adjustment))]


def _write_records(job: Job, findings: Findings, adjustment: Adjustment | None, path: Path) -> None:
    """One key a line, and one line for each blunder."""
    kinds = [] if adjustment is None else [kind.record() for kind in detectability(adjustment)]
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(f'{{\n"schema": {_ENCODER.encode(SCHEMA)},\n')
        for key, value in _summary(job, findings, adjustment).items():
            file.write(f"{_ENCODER.encode(key)}: {_ENCODER.encode(value)},\n")
        write_list(file, "unchecked", iter(findings.unchecked))
        write_list(file, "detectability", iter(kinds))
        write_list(file, "blunders", blunder_records(job, findings))
        write_list(file, "decisions", decision_records(job), last=True)
        file.write("}\n")


def _summary(job: Job, findings: Findings, adjustment: Adjustment | None) -> Record:
    """The job, and by what level it was searched."""
    return {
        "job": job_record(job),
        "adjusted": adjustment is not None,
        "settled": findings.settled,
        "significance": findings.significance,
        "sd_basis": "posterior" if findings.estimated else "prior",
    }

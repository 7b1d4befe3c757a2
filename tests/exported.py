"""Saved results for the tests of exports: jobs adjusted, written and read back, with what a test changes of them."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from functools import cache
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

from adjust import Adjustment, adjust, read_job
from adjust.blunders import find_blunders
from adjust.network.closures import check_job
from adjust.reports.check_records import check_record
from adjust.reports.results import write_results
from adjust.reports.saved import SavedResults
from adjust.reports.verdict import cautions
from adjust.reports.weights import components_of
from adjust.standards import Specification
from tests.adjusted_networks import JOBS, adjusted

FIELD_DATA = Path(__file__).parent.parent / "field_data"
DEMOS = tuple(sorted(path.name for path in FIELD_DATA.iterdir() if path.is_dir()))
SPECIFIED = "dam_control with a specification"
HOSTILE = ("=1+1", "007", "a,b;c", "<script>alert(1)</script>", "%%c^I", "Ünd 'q' \"dd\"", "#N/A")
"""Names of marks that some format would take for something else than text."""


@cache
def adjustment_of(name: str) -> Adjustment:
    if name == SPECIFIED:
        standards = Specification(("ALTA/NSPS 2026", "LINZ 2009 order 5"), pairs="all")
        return adjust(replace(read_job(FIELD_DATA / "dam_control"), specification=standards))
    return adjust(read_job(FIELD_DATA / name)) if name in DEMOS else adjusted(name)


@cache
def text_of(name: str) -> str:
    """What `results.json` of a demonstration or of an invented network holds."""
    adjustment = adjustment_of(name)
    closures = [check_record(judged) for judged in check_job(adjustment.job).closures]
    with TemporaryDirectory() as folder:
        findings = find_blunders(adjustment)
        components = components_of(adjustment, findings)
        write_results(adjustment, cautions(adjustment), Path(folder, "results.json"), closures, findings, components)
        return Path(folder, "results.json").read_text("utf-8")


def plain_of(name: str) -> dict[str, Any]:
    """The same as plain JSON, the caller's own."""
    plain: dict[str, Any] = json.loads(text_of(name))
    return plain


def saved(name: str, change: Callable[[dict[str, Any]], None] = lambda plain: None) -> SavedResults:
    """The same read back, after a change."""
    plain = plain_of(name)
    change(plain)
    return SavedResults.model_validate_json(json.dumps(plain))


def with_hostile_names(plain: dict[str, Any]) -> None:
    """Give the first marks names that some format would take for something else."""
    new = dict(zip((mark["mark"] for mark in plain["marks"]), HOSTILE, strict=False))
    for records, keys in (("marks", ["mark"]), ("observations", ["at", "from", "to"]), ("relative", ["from", "to"])):
        for record in plain[records]:
            record.update({key: new.get(record[key], record[key]) for key in keys})


ALL = (*DEMOS, SPECIFIED, *JOBS)

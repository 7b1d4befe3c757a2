"""What the surveyor decided of the field book, in sentences: the trail for whoever checks the work later."""

from __future__ import annotations

from collections.abc import Iterator

from adjust.field_book.decided_sheet import BLANK
from adjust.job import Decision, Job
from adjust.reports.layout import paragraph, title
from adjust.reports.records import Record


def decision_records(job: Job) -> Iterator[Record]:
    """One record a decision, in the order of their table; None for what it does not say."""
    for each in job.decisions:
        yield {
            "source": each.source,
            "decision": each.decision,
            "column": each.column or None,
            "written": each.written,
            "value": _value(each),
            "reason": each.reason,
        }


def _value(decision: Decision) -> str | None:
    if decision.decision != "correct":
        return None
    return "" if decision.value == BLANK else decision.value


def decision_section(job: Job) -> list[str]:
    """The section of a listing; nothing without decisions. No reason is ever shortened."""
    lines = [line for decision in job.decisions for line in paragraph(sentence(decision))]
    return [*title("Decisions on the field book"), *lines] if lines else []


def sentence(decision: Decision) -> str:
    """`distances.csv:13: horizontal_m 168.561 corrected to 168.651. Reason: digits exchanged.`"""
    cell = f"{decision.column} {decision.written or 'blank'}" if decision.column else "the line"
    done = {
        "keep": f"{cell} kept",
        "leave_out": f"{cell} left out" if cell == "the line" else f"left out ({cell})",
        "correct": f"{cell} corrected to {_value(decision) or 'blank'}",
    }[decision.decision]
    reason = decision.reason.rstrip(".")
    return f"{decision.source}: {done}." + (f" Reason: {reason}." if reason else "")

"""`check.txt`: the check for people, the verdict first."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np

from adjust.network.closures.check import Check
from adjust.network.closures.closures import Judged
from adjust.reports.check_words import (
    NAMES,
    by_file,
    check_verdict,
    observations,
    rests_on,
    rules_used,
    small,
    suspected,
    walk,
)
from adjust.reports.layout import GAP, Column, facts, paragraph, table, title
from adjust.reports.records import MILLIMETRES
from adjust.reports.wording import counted, decimals
from adjust.tolerances import STANDARDS
from adjust.units import format_dms

LISTED = 100
"""Closures of one check in the listing, the worst; check.json has them all."""
REMARKS = 10
"""Remarks in the brief section of an adjustment's listing; check.txt has them all."""
TRAVERSES = 20
"""Traverses whose compass-rule coordinates are listed, in the order found; check.json has them all."""
STANDING_CAUTION = (
    "A job that closes may still be wrong: closures see nothing of a mistake that no loop passes through. "
    "Compass-rule coordinates are a familiar comparison; the result is the adjustment."
)


def write_check_listing(check: Check, path: Path) -> None:
    """Write the listing."""
    path.write_text("\n".join(check_listing(check)) + "\n", encoding="utf-8", newline="\n")


def check_listing(check: Check) -> list[str]:
    """The lines of the listing."""
    job = check.job
    heading = job.title if job.date is None else f"{job.title}, {job.date}"
    return [
        *paragraph(heading),
        "",
        *paragraph(check_verdict(check)),
        *_look_first(check),
        *_remarks(check),
        *summary(check),
        *(line for judged in check.closures for line in _closures(check, judged)),
        *_compass_rule(check),
        *_tolerances(check),
        *_sentences("Notes", check.notes),
        *_sentences("Caution", (STANDING_CAUTION,)),
    ]


def check_section(check: Check) -> list[str]:
    """The check in brief, for the listing of the adjustment: the verdict, how it went, and what cannot be right."""
    beyond = [remark.text for remark in check.remarks if remark.exceeds][:REMARKS]
    return [
        *title("Checks before the adjustment"),
        *paragraph(check_verdict(check)),
        *[line for text in beyond for line in paragraph(text)],
        *(["", *_summary_table(check)] if check.closures else []),
    ]


def _sentences(heading: str, sentences: tuple[str, ...]) -> list[str]:
    lines = [line for sentence in sentences for line in paragraph(sentence)]
    return [*title(heading), *lines] if lines else []


def _look_first(check: Check) -> list[str]:
    sentences = [*_shared(check), *_suspicions(check)]
    lines = [line for sentence in sentences for line in paragraph(sentence)]
    return [*title("Look at these first"), *lines] if lines else []


def _shared(check: Check) -> Iterator[str]:
    by_name = {judged.closures.check: judged for judged in check.closures}
    names = check.job.marks.names
    for shared in check.shared:
        judged = by_name[shared.check]
        one, other = (walk(check, judged, closure) for closure in (shared.first, shared.second))
        line = "–".join(names[mark] for mark in shared.marks)
        rows = f", {', '.join(observations(check, shared.rows))}" if shared.rows else ""
        yield f"The {NAMES[shared.check][1]} {one} and {other} exceed and share one line only: {line}{rows}."


def _suspicions(check: Check) -> Iterator[str]:
    for suspicion in check.suspicions:
        passing = f"{counted(suspicion.passing, 'closes', 'close')}" if suspicion.passing else "none closes"
        rests = counted(suspicion.failing, "closure that exceeds", "closures that exceed")
        yield f"{suspected(check, suspicion)}: in {rests}; of the others that rest on it {passing}."


def _remarks(check: Check) -> list[str]:
    beyond = tuple(remark.text for remark in check.remarks if remark.exceeds)
    to_see = tuple(remark.text for remark in check.remarks if not remark.exceeds)
    return [*_sentences("Marks and rows that cannot be right", beyond), *_sentences("Worth a look", to_see)]


def summary(check: Check) -> list[str]:
    """How many closures there are of each kind, how many exceed, and the largest share of the allowance."""
    return [*title("Closures"), *_summary_table(check)] if check.closures else []


def _summary_table(check: Check) -> list[str]:
    columns = (Column("Closures", text=True), Column("Number"), Column("Exceed"), Column("Largest", "of allowed"))
    rows = [
        (
            NAMES[judged.closures.check][1],
            str(len(judged.closures)),
            str(int(judged.exceeds.sum())),
            decimals(float(judged.severity.max()), 2),
        )
        for judged in check.closures
    ]
    return table(columns, rows)


def _closures(check: Check, judged: Judged) -> list[str]:
    """One check: what is allowed, the closures, the worst first, and what the failing ones suggest."""
    worst = np.argsort(-judged.severity, kind="stable")
    shown: list[int] = worst[:LISTED].tolist()
    name = NAMES[judged.closures.check][1]
    left = len(worst) - len(shown)
    lines = [*title(name[0].upper() + name[1:]), *paragraph(f"Allowed: {'; '.join(rules_used(judged))}."), ""]
    lines += table(_columns(judged), [_row(check, judged, closure) for closure in shown])
    lines += [f"… and {left} more, better than these; check.json has them."] if left else []
    failing = [closure for closure in shown if judged.exceeds[closure]]
    return lines + [line for closure in failing for line in paragraph(_failing(check, judged, closure), GAP)]


def _failing(check: Check, judged: Judged, closure: int) -> str:
    """What a failing closure rests on, and what it suggests."""
    check_name = judged.closures.check
    clues = [clue.text for clue in check.clues if clue.check == check_name and clue.closure == closure]
    suggests = "".join(f"; {clue}" for clue in clues)
    return f"! {walk(check, judged, closure)} rests on {by_file(rests_on(check, judged, closure))}{suggests}."


def _columns(judged: Judged) -> list[Column]:
    unit, figures = small(judged).unit, judged.closures.figures
    heading = "linear" if "precision" in figures else "misclosure"
    components = [Column(component or heading, unit) for component in judged.closures.components]
    further = [Column(heading, figure_unit) for name, heading, figure_unit in FIGURES if name in figures]
    return [
        Column(""),
        Column("through", text=True),
        Column("length", "km"),
        Column("n"),
        *components,
        *([Column("allowed", unit)] if len(components) == 1 else []),
        Column("share"),
        *further,
    ]


FIGURES = (
    ("sum", "sum", ""),
    ("angular", "angular", '"'),
    ("east", "east", "mm"),
    ("north", "north", "mm"),
    ("precision", "1 :", ""),
    ("refraction", "k", ""),
    ("refraction_sd", "sd of k", ""),
)
"""Further columns of some checks: name, heading, unit."""


def _row(check: Check, judged: Judged, closure: int) -> list[str]:
    closures, form = judged.closures, small(judged)
    length = float(closures.length[closure]) / 1000.0
    signed = "precision" not in closures.figures
    values = (float(value) * form.scale for value in closures.misclosure[closure])
    misclosures = [decimals(value, form.places, signed=signed) for value in values]
    allowed = [decimals(float(judged.allowed[closure, 0]) * form.scale, form.places)] if len(misclosures) == 1 else []
    further = [
        _figure(name, float(closures.figures[name][closure])) for name, _, _ in FIGURES if name in closures.figures
    ]
    return [
        "!" if judged.exceeds[closure] else "",
        walk(check, judged, closure),
        decimals(length, 3) if length else "",
        str(closures.angles[closure]) if closures.angles[closure] else "",
        *misclosures,
        *allowed,
        decimals(float(judged.severity[closure]), 2),
        *further,
    ]


def _figure(name: str, value: float) -> str:
    if not np.isfinite(value):
        return ""
    if name == "sum":
        return format_dms(value, 1)
    if name == "precision":
        return f"{value:.0f}"
    if name == "angular":
        return decimals(float(np.degrees(value)) * 3600.0, 1, signed=True)
    if name in ("east", "north"):
        return decimals(value * MILLIMETRES, 1, signed=True)
    return decimals(value, 2)


def _compass_rule(check: Check) -> list[str]:
    """Familiar coordinates of the marks on the way, for comparison only."""
    lines: list[str] = []
    names = check.job.marks.names
    found = [(traverse, traverse.positions) for traverse in check.traverses if traverse.positions is not None]
    for traverse, positions in [pair for pair in found if len(pair[1])][:TRAVERSES]:
        grid = check.job.frame.grid_coordinates(positions)
        rows = [
            (names[mark], decimals(float(east), 3), decimals(float(north), 3))
            for mark, (east, north) in zip(traverse.marks[1:-1], grid, strict=True)
        ]
        lines += ["", f"{names[traverse.marks[0]]} to {names[traverse.marks[-1]]}, {traverse.length:.3f} m"]
        lines += table((Column("mark", text=True), Column("easting", "m"), Column("northing", "m")), rows)
    return [*title("Compass-rule coordinates, for comparison"), *lines[1:]] if lines else []


def _tolerances(check: Check) -> list[str]:
    chosen = [(name, STANDARDS[name].source) for name in check.job.tolerances.standards]
    return [*title("Standards"), *facts(chosen)] if chosen else []

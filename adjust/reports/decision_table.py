"""A table of decisions for the surveyor to edit: every line of every suspect, kept until somebody writes otherwise."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, fields
from pathlib import Path

from adjust.blunders import Blunder, Findings, Hypothesis
from adjust.errors import OutputError
from adjust.field_book.cells import table_text
from adjust.field_book.decided_sheet import BLANK
from adjust.field_book.schema import AXES
from adjust.field_book.written import Line, separator, written
from adjust.job import Job
from adjust.reports.blunder_words import MOST_ALTERNATIVES, likeliest, off_by, what_of
from adjust.reports.publish import publish

HEIGHTS = {"instrument height": "instrument_height", "target height": "target_height"}
COORDINATES = (("easting", "longitude"), ("northing", "latitude"), ("height",))
HELD = ("plan_control", "plan_control", "height_control")
"""Columns of a mark by axis: east, north, up."""
FREE = "free"
READINGS = {
    "direction": {"direction", "circle"},
    "angle": {"angle"},
    "azimuth": {"azimuth"},
    "slope_distance": {"slope"},
    "horizontal_distance": {"horizontal"},
    "zenith": {"zenith"},
    "height_difference": {"rise", "backsight", "intermediate", "foresight"},
}
"""The columns that hold the observed value of each kind, or the readings it was made of."""
COMMENTS = (
    "decision: keep, leave_out or correct (then value stands in place of what is written). Both need a reason.",
    "A value beside keep is a proposal and counts for nothing. Apply: hubtack adjust JOB --decisions THIS FILE",
)

Place = tuple[str, int]


@dataclass(frozen=True)
class Row:
    """One row of the table; columns that begin with `x_`, and the note, only inform."""

    source: str
    column: str
    written: str
    value: str = ""
    decision: str = "keep"
    reason: str = ""
    proposal: str = ""
    x_what: str = ""
    x_off_by: str = ""
    x_expected: str = ""
    note: str = ""


ORDER = ("source", "decision", "column", "value", "reason", "written", "proposal")


def write_decisions(job: Job, findings: Findings, folder: Path, path: Path, *, earlier: bool = False) -> int:
    """Write the table, if there is anything to decide, and return its number of rows. Decisions of the job stand first.

    `folder` is where the job was read from; `earlier` says that `path` holds the job's own decisions. Raises
    OutputError where there is another table already, which may hold somebody's decisions, or the disk says no.
    """
    if path.exists() and not earlier:
        raise OutputError(
            f"{path}: is there already and may hold decisions; choose another name, or give it with --decisions too "
            "to have new suspects added to it"
        )
    rows = list(decision_rows(job, findings, folder))
    if not rows:
        return 0
    names = [*ORDER, *(field.name for field in fields(Row) if field.name not in ORDER)]
    table = {name: [getattr(row, name) for row in rows] for name in names}
    text = table_text(table, COMMENTS, separator(folder, _first_file(rows, job)))
    publish(path.parent, {path.name: lambda place: _write(place, text)})
    return len(rows)


def _write(place: Path, text: str) -> None:
    place.write_text(text, encoding="utf-8", newline="\n")


def _first_file(rows: list[Row], job: Job) -> str:
    """The file whose separator the table takes over."""
    return rows[0].source.rpartition(":")[0] if rows else job.marks.provenance.files[0]


def decision_rows(job: Job, findings: Findings, folder: Path) -> Iterator[Row]:
    """The decisions that stand, then each suspect and what could stand in its place, every cell of the book once."""
    suspects = [
        (blunder, suspect) for blunder in findings.blunders for suspect in (blunder.hypothesis, *_instead(blunder))
    ]
    lines = written(folder, (place for _, suspect in suspects for place in _lines(job, suspect)))
    decided = [each for each in job.decisions if each.decision != "keep" or each.reason]
    yield from (Row(each.source, each.column, each.written, each.value, each.decision, each.reason) for each in decided)
    known = {(each.source, each.column) for each in decided}
    known |= {(each.source, "") for each in decided if each.decision == "leave_out"}
    for blunder, suspect in suspects:
        for row in _rows(job, blunder, suspect, lines):
            if (row.source, row.column) not in known and (row.source, "") not in known:
                known.add((row.source, row.column))
                yield row


def _instead(blunder: Blunder) -> Iterable[Hypothesis]:
    """Alternatives that are few enough rows to be decided one by one."""
    some = blunder.alternatives[:MOST_ALTERNATIVES]
    return (each for each in some if each.single or each.nature in ("control", *HEIGHTS))


def _lines(job: Job, suspect: Hypothesis) -> Iterator[Place]:
    """File and line of every line behind a suspect; of control that of the mark."""
    if suspect.nature == "control" and suspect.mark is not None:
        place = job.marks.provenance
        yield place.files[place.file[suspect.mark]], int(place.line[suspect.mark])
        return
    for kind, rows in suspect.rows:
        place = job.observations[kind].provenance
        for row in rows.tolist():
            further = () if place.further is None else place.further[row]
            yield from ((place.files[place.file[row]], int(line)) for line in (place.line[row], *further))


def _rows(job: Job, blunder: Blunder, suspect: Hypothesis, lines: Mapping[Place, Line]) -> Iterator[Row]:
    """The cells of a suspect, with what is proposed for them where it is the blunder itself."""
    own = suspect is blunder.hypothesis
    proposals = _proposals(blunder, suspect, lines) if own else {}
    expected = {(each.source, each.title): each.expected for each in blunder.booked}
    places = dict.fromkeys(_lines(job, suspect))
    cells = {
        (f"{file}:{number}", cell.title): cell.text
        for file, number in places
        for name, cell in lines.get((file, number), {}).items()
        if name in _names(job, suspect)
    }
    for source, title in dict.fromkeys((*cells, *proposals)):
        proposal = proposals.get((source, title), FREE if title in HELD else "")
        yield Row(
            source=source,
            column=title,
            written=cells.get((source, title), _text(lines, source, title)),
            value=proposal,
            proposal=proposal,
            x_what=what_of(job, suspect) or suspect.name,
            x_off_by=off_by(blunder) if own else "",
            x_expected=expected.get((source, title), ""),
            note=likeliest(blunder) if own else f"may be wrong in place of {blunder.name}",
        )


def _text(lines: Mapping[Place, Line], source: str, title: str) -> str:
    """What stands in a cell of the book; blank where nothing does."""
    file, _, number = source.rpartition(":")
    return next((cell.text for cell in lines.get((file, int(number)), {}).values() if cell.title == title), "")


def _names(job: Job, suspect: Hypothesis) -> set[str]:
    """Plain names of the columns that a suspect is a matter of."""
    if suspect.nature in HEIGHTS:
        return {HEIGHTS[suspect.nature]}
    axes = suspect.given_axes(job)
    if axes:
        return {name for axis in axes for name in (*COORDINATES[axis], HELD[axis])}
    kind = job.observations[suspect.rows[0][0]].kind
    if kind == "vector":
        return {f"d{component}" for component in suspect.components if component in AXES}
    return READINGS[kind]


def _proposals(blunder: Blunder, suspect: Hypothesis, lines: Mapping[Place, Line]) -> dict[tuple[str, str], str]:
    """Values by source and title that the likeliest explanation proposes; a shared height for each line with it."""
    corrections = blunder.explanations[0].corrections if blunder.explanations else ()
    proposals = {(each.source, each.title): each.text or BLANK for each in corrections}
    if suspect.nature in HEIGHTS and len(corrections) == 1:
        (wanted,) = corrections
        for (file, number), line in lines.items():
            cell = line.get(HEIGHTS[suspect.nature])
            if cell is not None and f"{file}:{number}" in _sources(blunder) and cell.title == wanted.title:
                proposals[f"{file}:{number}", cell.title] = wanted.text or BLANK
    return proposals


def _sources(blunder: Blunder) -> set[str]:
    """Every line behind a blunder by itself: of a mean all of its lines."""
    parted = (source.rpartition(":") for source in blunder.sources)
    return {f"{file}:{number}" for file, _, numbers in parted for number in numbers.split("+")}

"""The page on closures says what the program does: its checks, its keys, and the table of published classes."""

from __future__ import annotations

import re
from pathlib import Path

from adjust.reports.check_words import NAMES
from adjust.tolerances import STANDARDS, Quantity, Standard

PAGE = Path(__file__).parents[1] / "docs" / "closures.md"
MARKERS = ("<!-- standards: begin -->\n", "<!-- standards: end -->\n")
COLUMNS = (Quantity.LEVEL_RUNS, Quantity.LEVEL_LOOP, Quantity.ANGLES, Quantity.POSITION)
REMARKS = ("two_names", "two_places", "exchanged", "height_range", "off_extent")
REMARKS += ("rough_coordinates", "heights_differ", "duplicate_rows")


def standards_table() -> str:
    """Every class with its figures as printed; those from memory in italics."""
    heads = ("`standard`", "runs", "loops", "angles", "position")
    lines = [f"| {' | '.join(heads)} |", "| --- | --- | --- | --- | --- |"]
    lines += [f"| {standard.name} | {' | '.join(_figures(standard))} |" for standard in STANDARDS.values()]
    by_source: dict[str, list[str]] = {}
    for standard in STANDARDS.values():
        by_source.setdefault(standard.source, []).append(standard.name)
    sources = [
        f"- {names[0]}{' and the like' if len(names) > 1 else ''}: {source}." for source, names in by_source.items()
    ]
    return "\n".join([*lines, "", "Figures in italics were written down from memory.", "", *sources]) + "\n"


def _figures(standard: Standard) -> list[str]:
    cells = []
    for quantity in COLUMNS:
        rules = [figure.rule for figure in standard.figures if figure.quantity is quantity]
        cells.append("; ".join(f"*{rule.printed}*" if rule.recalled else rule.printed for rule in rules))
    return cells


def test_table_of_standards_is_that_of_the_program() -> None:
    text = PAGE.read_text(encoding="utf-8")
    block = text.split(MARKERS[0])[1].split(MARKERS[1])[0]
    assert block == standards_table()


def test_every_check_is_described() -> None:
    text = PAGE.read_text(encoding="utf-8")
    for check in (*NAMES, *REMARKS):
        assert f"`{check}`" in text, check


def test_every_remark_of_the_program_is_on_the_page() -> None:
    closures = Path(__file__).parents[1] / "adjust" / "network" / "closures"
    made = {
        name
        for file in closures.glob("*.py")
        for name in re.findall(r'Remark\("(\w+)"', file.read_text(encoding="utf-8"))
    }
    assert made == set(REMARKS)


if __name__ == "__main__":
    page = PAGE.read_text(encoding="utf-8")
    head, rest = page.split(MARKERS[0])
    PAGE.write_text(head + MARKERS[0] + standards_table() + MARKERS[1] + rest.split(MARKERS[1])[1], encoding="utf-8")

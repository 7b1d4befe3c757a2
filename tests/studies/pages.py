"""Tables that a study writes into a page of the documentation."""

from __future__ import annotations

from pathlib import Path

DOCS = Path(__file__).parents[2] / "docs"


def rewrite(page: str, section: str, text: str) -> None:
    """Replace what stands in a page between the markers of a section."""
    path = DOCS / page
    begin, end = (f"<!-- {section}: {part} -->\n" for part in ("begin", "end"))
    before, rest = path.read_text(encoding="utf-8").split(begin)
    after = rest.split(end)[1]
    path.write_text(before + begin + text + end + after, encoding="utf-8", newline="\n")

"""The tables of the reference page docs/job-folder.md, written from the schema.

`python -m adjust.field_book.reference docs/job-folder.md` brings the page up to date after a change of the schema.
"""

from __future__ import annotations

import re
import sys
from pathlib import Path

from adjust.field_book.schema import LENGTH, TABLES, Column, Quantity, Table

_PART = re.compile(r"(<!-- table (\w+) -->\n).*?(<!-- end -->)", re.DOTALL)


def refreshed(page: str) -> str:
    """The page with the part of every table written anew. Raises KeyError where a part names no table."""

    def written(part: re.Match[str]) -> str:
        return f"{part[1]}{described(TABLES[part[2]])}\n{part[3]}"

    return _PART.sub(written, page)


def described(table: Table) -> str:
    """A table as Markdown: what a row is, its columns, and which of them go together."""
    rows = "\n".join(
        f"| `{column.written}` | {_need(column)} | {_values(column)} | {column.meaning} |" for column in table.columns
    )
    lines = [f"One row is {table.row}.", "", "| column | | values | meaning |", "| --- | --- | --- | --- |", rows]
    rules = _rules(table)
    return "\n".join([*lines, "", *rules] if rules else lines)


def _need(column: Column) -> str:
    return "required" if column.required else ""


def _values(column: Column) -> str:
    if column.quantity is Quantity.CHOICE:
        first, *others = (f"`{word}`" for word in column.choices)
        return ", ".join([f"{first} (default)", *others])
    if column.rule is None or column.rule is LENGTH:
        return str(column.quantity.value)
    expected: str = re.split("[:;(]", column.rule.expected)[0]
    return expected.strip()


def _rules(table: Table) -> list[str]:
    def named(names: tuple[str, ...]) -> list[str]:
        return [f"`{table.column(name).written}`" for name in names]

    one_of = [f"- At least one of {' and '.join(named(group))} is there." for group in table.one_of]
    together = [f"- {', '.join(named(group))} stand together or not at all." for group in table.together]
    apart = [f"- {' and '.join(named(pair))} exclude each other." for pair in table.apart]
    return one_of + together + apart


if __name__ == "__main__":
    place = Path(sys.argv[1])
    place.write_text(refreshed(place.read_text(encoding="utf-8")), encoding="utf-8")

"""The header row: which column of the file is which column of the schema, in which unit."""

from __future__ import annotations

from dataclasses import dataclass

from adjust.field_book.mistakes import Likeness, Mistakes, listed
from adjust.field_book.schema import Column, Quantity, Table
from adjust.field_book.sheet import Sheet
from adjust.units import shown


@dataclass(frozen=True)
class Place:
    """Where a file holds a column: its position in the row, its title in the header row, its unit ending."""

    column: Column
    position: int
    title: str
    ending: str


def read_header(sheet: Sheet, table: Table, mistakes: Mistakes) -> dict[str, Place]:
    """The places of the table's columns by name, after noting every mistake of the header row."""
    known = {title: column for column in table.columns for title in column.titles}
    places: dict[str, Place] = {}
    meant: set[str] = set()
    for position, title in enumerate(sheet.titles):
        if not title or title == "note" or title.startswith("x_"):
            continue
        column = known.get(title)
        if column is None:
            guess, message = _guess(title, table, known)
            meant.add(guess)
        elif column.name in places:
            message = _twice(title, places[column.name].title)
        else:
            ending = title.removeprefix(column.name).removeprefix("_")
            places[column.name] = Place(column, position, title, ending)
            continue
        mistakes.add(sheet.file, sheet.header_line, shown(title), message)
    for name, message in _omissions(table, places, meant) if sheet.titles else ():
        mistakes.add(sheet.file, sheet.header_line, name, message)
    return places


def _guess(title: str, table: Table, known: dict[str, Column]) -> tuple[str, str]:
    """The column that an unknown title probably means ("" where it is like none), and what to say of the title."""
    stem = title.rpartition("_")[0]
    for column in table.columns:
        if column.quantity.endings and column.name in (title, stem):
            titles = " or ".join(f"'{other}'" for other in column.titles)
            return column.name, f"{column.quantity.value} has its unit in the column name, expected {titles}"
    nearest = Likeness(known).nearest(title)
    if nearest is not None:
        return known[nearest].name, f"unknown column; did you mean '{nearest}'? ('note' and 'x_…' are ignored)"
    written = listed((column.written for column in table.columns), most=len(table.columns))
    return "", f"unknown column; {table.name}.csv has {written}; name it 'x_…' to have it ignored"


def _twice(title: str, earlier: str) -> str:
    if title == earlier:
        return "this column stands twice in the header row; remove one of them"
    return f"'{earlier}' gives the same quantity in another unit; keep exactly one of them"


def _omissions(table: Table, places: dict[str, Place], meant: set[str]) -> list[tuple[str, str]]:
    """Columns that are missing, or that exclude each other, each with its message.

    A column that was `meant` by a misspelt title is not missed again.
    """
    there = set(places) | meant
    found = [
        (name, f"this column is missing; {_wanted(table, name)}") for name in _required(table) if name not in there
    ]
    for group in table.one_of:
        if not there.intersection(group):
            written = " or ".join(f"'{table.column(name).written}'" for name in group)
            found.append((table.column(group[0]).written, f"this column is missing; expected {written}"))
    for group in table.together:
        present = [name for name in group if name in there]
        missing = [name for name in group if name not in there] if present else []
        found += [(name, f"this column is missing; it goes with '{present[0]}'") for name in missing]
    for first, second in table.apart:
        if first in places and second in places:
            message = f"'{places[first].title}' says the same; keep one of the two ways"
            found.append((places[second].title, message))
    return found


def _required(table: Table) -> list[str]:
    return [column.name for column in table.columns if column.required]


def _wanted(table: Table, name: str) -> str:
    titles = table.column(name).titles
    if len(titles) == 1:
        return f"every row of {table.name}.csv needs it"
    unit = "length" if table.column(name).quantity is Quantity.LENGTH else "angle"
    return f"every row of {table.name}.csv needs this {unit}, as {' or '.join(titles)}"

"""A page taken apart: its figures as the reader sees them, for comparison with results.json."""

from __future__ import annotations

import json
import re

import html5lib

XHTML = "{http://www.w3.org/1999/xhtml}"


def parsed(page):
    """The page's tree; raises on the first breach of the HTML standard."""
    return html5lib.HTMLParser(strict=True).parse(page)


def text_of(element):
    return "".join(element.itertext())


def figures_of(tree):
    """The data that the page's script works on."""
    (script,) = [node for node in tree.iter(f"{XHTML}script") if node.get("id") == "figures"]
    return json.loads(text_of(script))


def column_cells(column):
    return column if isinstance(column, list) else column["text"].split(column["by"])


def table_columns(figures, name):
    """Columns of a table by their keys, as text, and the marks of its rows by name."""
    table = figures["tables"][name]
    columns = {}
    for heading, column in zip(table["headings"], table["columns"], strict=True):
        if heading["nature"] == "marks":
            continue
        cells = column_cells(column)
        if heading["nature"] == "choice":
            cells = [column["words"][int(cell)] for cell in cells]
        elif heading["nature"] == "source":
            parts = [cell.split(":", 1) for cell in cells]
            cells = [f"{column['words'][int(file)]}:{line}" for file, line in parts]
        columns[heading["key"]] = cells
    names = figures["names"]
    return columns, [tuple(names[int(mark)] for mark in marks.split()) for marks in column_cells(table["marks"])]


def number(text):
    """A printed number and half a unit of its last digit; degrees of d-m-s text; None for no figure."""
    if text in ("", "–"):
        return None
    parts = re.fullmatch(r"(-?)(\d+)-(\d\d)-(\d\d(?:\.(\d+))?)", text)
    if parts:
        value = int(parts[2]) + int(parts[3]) / 60 + float(parts[4]) / 3600
        return (-value if parts[1] else value), 0.5 * 10.0 ** -len(parts[5] or "") / 3600
    decimals = len(text.partition(".")[2])
    return float(text), 0.5 * 10.0**-decimals


def same(text, value):
    """Whether a printed figure is a number of results.json, rounded."""
    printed = number(text)
    if printed is None or value is None:
        return printed is None and value is None
    return abs(printed[0] - value) <= printed[1] * (1 + 1e-6) + 1e-12


def at(results, key):
    """The figure of results.json that `solution.global_test.lower` or `weights[2].redundancy` names."""
    if key.startswith("len("):
        return len(results[key[4:-1]])
    value = results
    for part in re.findall(r"[^.\[\]]+", key):
        value = value[int(part)] if isinstance(value, list) else value[part]
    return value

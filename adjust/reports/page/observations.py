"""The long table of observations, made kind by kind: a hundred thousand rows in a few seconds."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import IntArray
from adjust.observations import KIND_NAMES
from adjust.reports.page.table import Heading, PageTable
from adjust.reports.page.tables import MOST_ROWS, fixed, page_table
from adjust.reports.records import MILLIMETRES, Figures, records, scalar_figures
from adjust.reports.selection import tested, worst_first
from adjust.reports.wording import ARCSECONDS, between, dms, what
from adjust.residuals import Residuals

SECONDS = "″"
ROLES = ("at", "from", "to")
TESTED = {
    "w": "residual over its own standard deviation, on σ₀ = 1",
    "tau": "residual over its own standard deviation, on the estimated σ₀",
}
REDUNDANCY = "share of an error of this observation that shows in its residual: 0 nothing checks it, 1 all of it"

Columns = dict[str, list[str]]


def observations_table(adjustment: Adjustment) -> PageTable:
    """All observations with their tests, the worst fit first."""
    order = worst_first(tested(adjustment), MOST_ROWS)
    in_book = np.sort(order)
    columns, marks, suspect = _in_book_order(adjustment, in_book)
    places = np.searchsorted(in_book, order).tolist()
    headings = _headings(adjustment)
    return page_table(
        "observations",
        "Observations",
        [(heading, [columns[heading.key][place] for place in places]) for heading in headings],
        [marks[place] for place in places],
        order="the worst fit first",
        left_out=adjustment.solution.observations - len(order),
        flagged=frozenset(row for row, place in enumerate(places) if suspect[place]),
        flag="suspect",
    )


def _headings(adjustment: Adjustment) -> list[Heading]:
    key, symbol = ("tau", "τ") if adjustment.solution.sd_basis == "posterior" else ("w", "w")
    found = f"smallest error that the test finds {100 * adjustment.job.statistics.power:g} times in 100"
    return [
        Heading("marks", "marks", "", "marks", "from → to; of an angle at: from → to"),
        Heading("kind", "what", "", "choice", "kind of the observation"),
        Heading(key, symbol, "", "number", TESTED[key]),
        Heading("residual", "residual", "", "number", "adjusted minus observed"),
        Heading("sd", "sd", "", "number", "standard deviation as claimed beforehand"),
        Heading("unit", "of", "", "choice", "unit of residual, sd and least bias"),
        Heading("redundancy", "r", "", "number", REDUNDANCY),
        Heading("minimal_detectable_bias", "least bias", "", "number", found),
        Heading("observed", "observed", "m or d-m-s", "dms", "as the field book has it"),
        Heading("adjusted", "adjusted", "m or d-m-s", "dms", "observed plus residual"),
        Heading("source", "source", "", "source", "file and line of the field book"),
    ]


def _in_book_order(adjustment: Adjustment, scalars: IntArray) -> tuple[Columns, list[tuple[int, ...]], list[bool]]:
    """Texts by column, marks and doubt of the scalars, which count through all kinds and rise."""
    columns: Columns = {}
    marks: list[tuple[int, ...]] = []
    suspect: list[bool] = []
    first = 0
    for table in adjustment.residuals:
        last = first + table.residual.size
        here = scalars[(scalars >= first) & (scalars < last)] - first
        first = last
        figures = scalar_figures(adjustment, table, here)
        for key, texts in _texts(table, figures).items():
            columns.setdefault(key, []).extend(texts)
        marks += map(tuple, table.observations.marks[here // len(table.observations.components)].tolist())
        suspect += figures["suspect"]
    return columns, marks, suspect


def _texts(table: Residuals, figures: Figures) -> Columns:
    """The columns of one kind as printed."""
    angular = table.observations.unit == "rad"
    scale = ARCSECONDS if angular else MILLIMETRES

    def small(key: str, *, signed: bool = False) -> list[str]:
        return fixed([None if value is None else value * scale for value in figures[key]], 2, signed=signed)

    def value(column: Sequence[float | None]) -> list[str]:
        return [dms(each, 1) for each in column] if angular else fixed(column, 4)

    return {
        "marks": [between(record) for record in records({role: figures[role] for role in ROLES})],
        "kind": _kinds(figures),
        "tau": fixed(figures["tau"], 2, signed=True),
        "w": fixed(figures["w"], 2, signed=True),
        "residual": small("residual", signed=True),
        "sd": small("sd"),
        "unit": [SECONDS if angular else "mm"] * len(figures["unit"]),
        "redundancy": fixed(figures["redundancy"], 2),
        "minimal_detectable_bias": small("minimal_detectable_bias"),
        "observed": value(figures["observed"]),
        "adjusted": value(figures["adjusted"]),
        "source": figures["source"],
    }


def _kinds(figures: Figures) -> list[str]:
    kinds = records({"kind": figures["kind"], "component": figures["component"]})
    return [what(record) if record["component"] is not None else KIND_NAMES[record["kind"]][0] for record in kinds]

"""The listing's tables of observations: all with their tests, and the suspects."""

from __future__ import annotations

import math

import numpy as np

from adjust.adjustment import Adjustment
from adjust.quality import critical_tau, critical_w, non_centrality
from adjust.reports.layout import Column, paragraph, shown_of, table, title
from adjust.reports.records import Record
from adjust.reports.selection import Order, listed_observations
from adjust.reports.wording import between, decimals, observed, small, small_unit, what

SOURCE = Column("source", text=True, ending=True)


def _test(adjustment: Adjustment) -> tuple[str, str, float]:
    """Key and symbol of the figure that is tested, and its bound."""
    statistics, solution = adjustment.job.statistics, adjustment.solution
    if solution.sd_basis == "posterior":
        return "tau", "τ", critical_tau(statistics.significance, solution.degrees_of_freedom)
    return "w", "w", critical_w(statistics.significance)


def observations(adjustment: Adjustment, order: Order, most: int) -> list[str]:
    """Observations with their residuals and tests."""
    key, symbol, bound = _test(adjustment)
    records = listed_observations(adjustment, order, most)
    columns = (
        Column(symbol),
        Column("residual"),
        Column("sd"),
        Column("least", "bias"),
        Column("", text=True),
        Column("r"),
        Column("observed"),
        Column("what", text=True),
        Column("marks", text=True),
        SOURCE,
    )
    lines = title("Observations, worst first" if order == "worst" else "Observations, in the order of the book")
    lines += table(columns, [_observation_cells(record, key) for record in records])
    return lines + _observation_notes(adjustment, symbol, bound, len(records))


def _observation_cells(record: Record, key: str) -> list[str]:
    return [
        (decimals(record[key], 2, signed=True) or "–") + ("!" if record["suspect"] else " "),
        small(record, "residual", signed=True),
        small(record, "sd"),
        small(record, "minimal_detectable_bias") or "–",
        small_unit(record),
        decimals(record["redundancy"], 2),
        observed(record),
        what(record),
        between(record),
        record["source"],
    ]


def _observation_notes(adjustment: Adjustment, symbol: str, bound: float, shown: int) -> list[str]:
    doubt = f"beyond {bound:.2f} it is suspect (!)" if math.isfinite(bound) else "nothing is left to test it against"
    sentences = (
        "Residual: adjusted minus observed.",
        f"{symbol}: the residual on its own sd; {doubt}.",
        f"Least bias: the smallest error that is found {100 * adjustment.job.statistics.power:g} times in 100.",
        "r: the share of an error that shows in the residual; –: nothing checks this observation.",
        "Observed lengths are metres, angles degrees-minutes-seconds.",
    )
    total = adjustment.solution.observations
    return paragraph(" ".join(sentences)) + shown_of(shown, total, "those that fit worst", "residuals.csv")


def suspects(adjustment: Adjustment, most: int) -> list[str]:
    """Suspect observations and what each would be off by if it alone were wrong."""
    key, symbol, _ = _test(adjustment)
    found = [record for record in listed_observations(adjustment, "worst", most) if record["suspect"]]
    if not found:
        return []
    statistics = adjustment.job.statistics
    shift = non_centrality(statistics.significance, statistics.power) ** 0.5
    columns = (
        SOURCE,
        Column("what", text=True),
        Column("marks", text=True),
        Column("observed"),
        Column(symbol),
        Column("off by"),
        Column("", text=True),
    )
    cells = [_suspect_cells(record, key, shift) for record in found]
    lines = [*title("Suspect observations"), *table(columns, cells)]
    lines += paragraph(
        "Off by: observed minus true, if this observation alone is wrong. One blunder makes its neighbours look bad "
        "too: look into the first, decide on it with its reason (--decisions), and adjust again."
    )
    return lines + shown_of(len(found), _suspect_scalars(adjustment), "the worst", "residuals.csv")


def _suspect_scalars(adjustment: Adjustment) -> int:
    return int(sum(np.count_nonzero(kind.suspect) for kind in adjustment.residuals))


def _suspect_cells(record: Record, key: str, shift: float) -> list[str]:
    error = dict(record, error=-record["w"] * record["minimal_detectable_bias"] / shift)
    return [
        record["source"],
        what(record),
        between(record),
        observed(record),
        decimals(record[key], 2, signed=True),
        small(error, "error", signed=True),
        small_unit(record),
    ]

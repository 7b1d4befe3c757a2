"""The five files of an adjustment."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from adjust.adjustment import Adjustment
from adjust.network.closures.check import Check
from adjust.reports.check_records import check_record
from adjust.reports.listing import write_listing
from adjust.reports.page import write_page
from adjust.reports.publish import Writer, publish
from adjust.reports.results import write_results
from adjust.reports.selection import Order
from adjust.reports.tables import write_coordinates, write_residuals
from adjust.reports.verdict import cautions
from adjust.reports.weights import components_of

if TYPE_CHECKING:
    from adjust.blunders import Findings

REPORTS = ("results.json", "coordinates.csv", "residuals.csv", "listing.txt", "report.html")


def write_reports(
    adjustment: Adjustment,
    folder: Path,
    order: Order = "worst",
    check: Check | None = None,
    findings: Findings | None = None,
) -> None:
    """Write all `REPORTS` into `folder`, or none: earlier files stay as they were when anything fails.

    `order` is that of the listing's observations; `check` is what was said of the job before it was adjusted,
    `findings` what a search for blunders found (`adjust.blunders.find_blunders`); without it the reports say nothing of
    blunders. Raises OutputError where the folder cannot be written.
    """
    warned = cautions(adjustment)
    components = components_of(adjustment, findings)
    closures = [] if check is None else [check_record(judged) for judged in check.closures]
    writers: dict[str, Writer] = {
        "results.json": lambda path: write_results(adjustment, warned, path, closures, findings, components),
        "coordinates.csv": lambda path: write_coordinates(adjustment, warned, path),
        "residuals.csv": lambda path: write_residuals(adjustment, warned, path),
        "listing.txt": lambda path: write_listing(adjustment, order, path, check, findings, components),
        "report.html": lambda path: write_page(adjustment, path, check, findings, components),
    }
    publish(folder, writers)

"""The two files of a check."""

from __future__ import annotations

from pathlib import Path

from adjust.network.closures.check import Check
from adjust.reports.check_listing import write_check_listing
from adjust.reports.check_records import write_check
from adjust.reports.publish import publish

CHECK_REPORTS = ("check.json", "check.txt")


def write_check_reports(check: Check, folder: Path) -> None:
    """Write all `CHECK_REPORTS` into `folder`, or none: earlier files stay as they were when anything fails.

    Raises OutputError where the folder cannot be written.
    """
    publish(
        folder,
        {
            "check.json": lambda path: write_check(check, path),
            "check.txt": lambda path: write_check_listing(check, path),
        },
    )

"""Reports: what an adjustment found, written for people and for programs."""

from adjust.reports.files import REPORTS, write_reports
from adjust.reports.selection import Order
from adjust.reports.verdict import cautions, verdict

__all__ = ["REPORTS", "Order", "cautions", "verdict", "write_reports"]

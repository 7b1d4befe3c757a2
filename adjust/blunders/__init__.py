"""Which observations are wrong, by how much, and what somebody probably did."""

from adjust.blunders.context import Context, Correction, Explanation
from adjust.blunders.finding import find_blunders, find_blunders_of
from adjust.blunders.findings import Blunder, Findings
from adjust.blunders.hypothesis import Hypothesis
from adjust.field_book.written import Cell

__all__ = [
    "Blunder",
    "Cell",
    "Context",
    "Correction",
    "Explanation",
    "Findings",
    "Hypothesis",
    "find_blunders",
    "find_blunders_of",
]

"""Which observations are wrong, by how much, and what somebody probably did."""

from adjust.blunders.context import Context, Correction, Explanation
from adjust.blunders.hypothesis import Hypothesis
from adjust.field_book.written import Cell

__all__ = ["Cell", "Context", "Correction", "Explanation", "Hypothesis"]

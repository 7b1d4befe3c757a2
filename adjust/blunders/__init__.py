"""Which observations are wrong, by how much, and what somebody probably did."""

from adjust.blunders.context import Cell, Context, Correction, Explanation
from adjust.blunders.hypothesis import Hypothesis

__all__ = ["Cell", "Context", "Correction", "Explanation", "Hypothesis"]

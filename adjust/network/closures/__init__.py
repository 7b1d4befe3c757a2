"""Everything that closes before an adjustment: loops, lines, traverses, angle sums, and marks that cannot be right."""

from adjust.network.closures.check import Check, check_job

__all__ = ["Check", "check_job"]

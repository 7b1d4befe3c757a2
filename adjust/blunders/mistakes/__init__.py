"""The catalogue of mistakes: what somebody probably did, one small file for each sort of mistake."""

from adjust.blunders.mistakes.catalogue import MISTAKES
from adjust.blunders.mistakes.explaining import explain
from adjust.blunders.mistakes.priors import NO_COMMON_MISTAKE, PRIORS

__all__ = ["MISTAKES", "NO_COMMON_MISTAKE", "PRIORS", "explain"]

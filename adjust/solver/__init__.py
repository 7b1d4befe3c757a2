"""Sparse linear least squares by block orthogonal decomposition; knows rows, columns and groups of columns only."""

from adjust.solver.analysis import Analysis, analyse
from adjust.solver.covariance import SelectedCovariance
from adjust.solver.factor import Factor, rows_weighted
from adjust.solver.opinion import SecondOpinion
from adjust.solver.rank import RankDefect

__all__ = ["Analysis", "Factor", "RankDefect", "SecondOpinion", "SelectedCovariance", "analyse", "rows_weighted"]

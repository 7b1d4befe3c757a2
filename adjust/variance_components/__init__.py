"""How well the sds of each group of observations were stated: variance components, estimated and never applied."""

from adjust.variance_components.component import VarianceComponent
from adjust.variance_components.judging import variance_components

__all__ = ["VarianceComponent", "variance_components"]

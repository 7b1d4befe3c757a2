"""What coordinates have to be good for: published accuracy standards as data, and the figures a job asks for itself."""

from adjust.standards.evaluation import Assessment, assess
from adjust.standards.published import ACCURACY_STANDARDS, AccuracyStandard
from adjust.standards.requirements import Measure, Requirement
from adjust.standards.specification import Specification

__all__ = [
    "ACCURACY_STANDARDS",
    "AccuracyStandard",
    "Assessment",
    "Measure",
    "Requirement",
    "Specification",
    "assess",
]

"""What closures and field data may miss by: published classes as data, and the figures a job chooses."""

from adjust.tolerances.published import STANDARDS, Figure, Standard
from adjust.tolerances.rules import Quantity, Rule
from adjust.tolerances.settings import Tolerances

__all__ = ["STANDARDS", "Figure", "Quantity", "Rule", "Standard", "Tolerances"]

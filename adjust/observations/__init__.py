"""Kinds of observation, one file each, and the registry that lists them."""

from adjust.observations.base import Observations, Precision, Provenance
from adjust.observations.direction import Directions

KINDS: tuple[type[Observations], ...] = (Directions,)
"""Every kind, in the order in which results list them."""

__all__ = ["KINDS", "Directions", "Observations", "Precision", "Provenance"]

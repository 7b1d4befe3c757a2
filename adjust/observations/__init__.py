"""Kinds of observation, one file each, and the registry that lists them."""

from adjust.observations.angle import Angles
from adjust.observations.azimuth import Azimuths
from adjust.observations.base import Labels, Observations, Precision, Provenance, concatenated
from adjust.observations.control import ControlCoordinates
from adjust.observations.direction import Directions
from adjust.observations.height_difference import HeightDifferences
from adjust.observations.horizontal_distance import HorizontalDistances
from adjust.observations.slope_distance import SlopeDistances
from adjust.observations.vector import Vectors
from adjust.observations.words import KIND_NAMES
from adjust.observations.zenith import ZenithAngles

KINDS: tuple[type[Observations], ...] = (
    Directions,
    Angles,
    Azimuths,
    SlopeDistances,
    HorizontalDistances,
    ZenithAngles,
    HeightDifferences,
    Vectors,
    ControlCoordinates,
)
"""Every kind, in the order in which results list them."""

__all__ = [
    "KINDS",
    "KIND_NAMES",
    "Angles",
    "Azimuths",
    "ControlCoordinates",
    "Directions",
    "HeightDifferences",
    "HorizontalDistances",
    "Labels",
    "Observations",
    "Precision",
    "Provenance",
    "SlopeDistances",
    "Vectors",
    "ZenithAngles",
    "concatenated",
]

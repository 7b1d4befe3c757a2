"""Invented networks with known truth: for demonstrations, tests and studies.

A plan is a `Job` whose marks stand at their true coordinates; `observe` measures it and returns the job a surveyor
would have, with the truth beside it.
"""

from adjust.simulate.equipment import Equipment
from adjust.simulate.layout import Layout, mark_names, tied_traverses, triangulated_grid
from adjust.simulate.networks import (
    NETWORKS,
    WEIGHTED_SD,
    assemble,
    gnss_net,
    levelling_net,
    mixed_net,
    place_marks,
    total_station_net,
    total_station_net_on_ellipsoid,
    traverse_net,
    triangulation_grid,
)
from adjust.simulate.observing import Blunder, Truth, observe, true_geometry

__all__ = [
    "NETWORKS",
    "WEIGHTED_SD",
    "Blunder",
    "Equipment",
    "Layout",
    "Truth",
    "assemble",
    "gnss_net",
    "levelling_net",
    "mark_names",
    "mixed_net",
    "observe",
    "place_marks",
    "tied_traverses",
    "total_station_net",
    "total_station_net_on_ellipsoid",
    "traverse_net",
    "triangulated_grid",
    "triangulation_grid",
    "true_geometry",
]

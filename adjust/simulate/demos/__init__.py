"""The demonstration jobs of `field_data/`: invented, seeded, the same to the last byte whenever they are made."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from adjust.simulate.demos.dam_control import dam_control
from adjust.simulate.demos.demo import Demo
from adjust.simulate.demos.fen_levels import fen_levels
from adjust.simulate.demos.quarry_raw import quarry_raw
from adjust.simulate.demos.town_traverse import town_traverse

DEMOS: dict[str, Callable[[], Demo]] = {
    "fen_levels": fen_levels,
    "town_traverse": town_traverse,
    "dam_control": dam_control,
    "quarry_raw": quarry_raw,
}
"""Makers of the demonstrations by the names of their folders."""


def write_demos(parent: Path) -> None:
    """Write every demonstration into a folder of its own below `parent`."""
    for name, make in DEMOS.items():
        make().write(parent / name)


__all__ = ["DEMOS", "Demo", "dam_control", "fen_levels", "quarry_raw", "town_traverse", "write_demos"]

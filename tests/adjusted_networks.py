"""Adjusted invented networks of every shape that reports have to print; each is adjusted once a session."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np

from adjust import Adjustment, Job, adjust
from adjust.job import Datum, Statistics
from adjust.simulate import (
    Blunder,
    gnss_net,
    levelling_net,
    mixed_net,
    observe,
    total_station_net,
    traverse_net,
    triangulation_grid,
)
from adjust.units import ARCSEC
from tests.building import build_job, exact, truth_of


def _seeded(plan: Job, *blunders: Blunder) -> Job:
    return observe(plan, np.random.default_rng(8), blunders, start_sd=0.02)[0]


def _unchecked() -> Job:
    """A triangle side carried to one mark by an azimuth and a distance: as many observations as unknowns."""
    job = build_job(
        {"A": (0.0, 0.0, 0.0), "B": (100.0, 50.0, None)},
        fixed=["A"],
        azimuths=[("A", "B", None)],
        horizontals=[("A", "B", None)],
    )
    return exact(job, truth_of(job, {"A": (0, 0, 0), "B": (100, 50, 0)}))


def _free() -> Job:
    return replace(_seeded(total_station_net(np.random.default_rng(4))), datum=Datum("inner"))


JOBS = {
    "levelling": lambda: _seeded(levelling_net(np.random.default_rng(1))),
    "blunder": lambda: _seeded(
        triangulation_grid(np.random.default_rng(2), 3, 4), Blunder("directions.csv:20", 60 * ARCSEC)
    ),
    "total station": lambda: _seeded(total_station_net(np.random.default_rng(3))),
    "free": _free,
    "gnss": lambda: _seeded(gnss_net(np.random.default_rng(5))),
    "mixed": lambda: _seeded(mixed_net(np.random.default_rng(6))),
    "posterior": lambda: replace(
        _seeded(traverse_net(np.random.default_rng(7), 3)), statistics=Statistics(sd_basis="posterior")
    ),
    "unchecked": _unchecked,
}


@cache
def adjusted(name: str) -> Adjustment:
    """The adjusted network of that name."""
    return adjust(JOBS[name]())

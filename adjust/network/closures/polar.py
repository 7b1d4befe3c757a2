"""Places where single sights with their distances put a mark: one name may stand for two places."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.network.closures.lines import Lines, PairIndex
from adjust.network.closures.observed import Observed
from adjust.network.closures.positions import local_plan
from adjust.network.closures.ragged import Ragged
from adjust.network.closures.remarks import Remark
from adjust.network.closures.stations import Stations
from adjust.network.consensus import group_circular_medians
from adjust.observations.direction import azimuth_of

TWO_PLACES = 1.0
"""Metres, and `TWO_PLACES_SHARE` of the job's extent: start coordinates agree with themselves better than that, marks
that share a name lie further apart. Common practice, no source."""
TWO_PLACES_SHARE = 2e-4


def two_place_remarks(observed: Observed, stations: Stations, lines: Lines) -> Iterator[Remark]:
    """Names that at least two stations see at one place and at least two more at another.

    Each station is oriented by the median of its sights to where the marks are thought to lie, so that a name that is
    wrong at one place does not turn the station.
    """
    sights, shift = _polar_shifts(observed, stations, lines)
    marks = observed.job.marks
    limit = TWO_PLACES + TWO_PLACES_SHARE * _extent(observed)
    by_target = Ragged.grouped(sights[:, 1], len(marks))
    away = np.hypot(*shift.T) > limit
    for target in np.unique(sights[away, 1]).tolist():
        seen = by_target[target]
        here, there = seen[~away[seen]], seen[away[seen]]
        there = there[np.hypot(*(shift[there] - np.median(shift[there], axis=0)).T) < limit]
        if len(here) < 2 or len(there) < 2:
            continue
        name, apart = marks.names[target], float(np.hypot(*np.median(shift[there], axis=0)))
        here_names, there_names = (", ".join(marks.names[at] for at in sights[rows, 0]) for rows in (here, there))
        text = (
            f"{name} as seen from {there_names} lies {apart:.2f} m from {name} as seen from {here_names}: "
            "one name, two places?"
        )
        yield Remark("two_places", text, (target,), exceeds=True)


def _extent(observed: Observed) -> float:
    """Diagonal of the box that holds all marks, metres."""
    plan = local_plan(observed, observed.geometry.coordinates)
    known = plan[np.isfinite(plan).all(axis=1)]
    return float(np.hypot(*np.ptp(known, axis=0))) if len(known) else 0.0


def _polar_shifts(observed: Observed, stations: Stations, lines: Lines) -> tuple[IntArray, FloatArray]:
    """Sights (sights, 2) with a measured distance, and how far (sights, 2) east and north of where it is thought to lie
    each puts its target."""
    sights = stations.readings.sights
    azimuth = azimuth_of(observed.geometry.sight(*sights.T, plumb=True).enu)
    node = np.flatnonzero(np.isfinite(azimuth))
    reading, group = stations.reading[node], stations.group[node]
    groups, orientation = group_circular_medians(group, azimuth[node] - reading)
    line = PairIndex(lines.lengths.marks, stations.marks).of(np.sort(sights[node], axis=1))
    apart = observed.geometry.level_distance(*sights[node].T)[0]
    bearing = reading + orientation[np.searchsorted(groups, group)]
    length = np.append(lines.lengths.length, np.nan)[line]
    seen = length[:, None] * np.column_stack([np.sin(bearing), np.cos(bearing)])
    thought = apart[:, None] * np.column_stack([np.sin(azimuth[node]), np.cos(azimuth[node])])
    known = np.isfinite(length)
    return sights[node][known], (seen - thought)[known]

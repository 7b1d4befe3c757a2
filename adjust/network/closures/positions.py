"""Marks whose positions cannot be right: one under two names, exchanged coordinates, far from everything else."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.frames import EllipsoidFrame
from adjust.network.closures.lines import Lines, PairIndex
from adjust.network.closures.observed import Observed
from adjust.network.closures.remarks import Remark
from adjust.tolerances import Tolerances

OFF_EXTENT = 50.0
"""Times the distance from the middle that half of the marks keep within: a mark further out is another job's, or
mistyped. Common practice, no source; a distant reference station is one too, so that it is a remark and no more."""
BACK_WITHIN = 10.0
"""Times that distance within which exchanged coordinates have to fall to be believed."""
MOST_HEIGHT = 1000.0
"""Metres from the median height that no remark is made of, whatever the relief: survey jobs cross mountains."""
FEWEST = 4
"""Marks with coordinates that make an extent to judge by."""
ROUGH = 1.0
"""Metres, and `ROUGH_SHARE` of the distance: by more than that rough coordinates are not rough but wrong."""
ROUGH_SHARE = 0.02


def position_remarks(observed: Observed, lines: Lines, tolerances: Tolerances) -> list[Remark]:
    """Remarks on marks, in the order of `marks.csv`."""
    return [
        *_two_names(observed, lines, tolerances.same_mark),
        *_outliers(observed),
        *_heights_off(observed),
        *_rough_coordinates(observed, lines),
    ]


def local_plan(observed: Observed, coordinates: FloatArray) -> FloatArray:
    """Metres east and north (n, 2) of the first mark with coordinates; NaN where there are none."""
    known = np.flatnonzero(np.isfinite(coordinates[:, :2]).all(axis=1))
    if not len(known):
        return np.full((len(coordinates), 2), np.nan)
    flat = coordinates * (1.0, 1.0, 0.0) if isinstance(observed.job.frame, EllipsoidFrame) else coordinates
    flat = np.nan_to_num(flat) + np.where(np.isfinite(coordinates[:, :1]), 0.0, np.nan)
    origin = np.repeat(flat[known[:1]], len(flat), axis=0)
    return observed.job.frame.displacement(origin, flat)[:, :2]


def _two_names(observed: Observed, lines: Lines, tolerance: float) -> Iterator[Remark]:
    plan = local_plan(observed, observed.geometry.coordinates)
    known = np.flatnonzero(np.isfinite(plan).all(axis=1))
    if not (np.diff(np.sort(plan[known, 0])) <= tolerance).any():
        # no two marks share an easting: nothing to search, nor a library to load
        return
    from shapely import STRtree, points

    places = points(plan[known])
    one, other = STRtree(places).query(places, predicate="dwithin", distance=tolerance)
    pairs = np.sort(np.column_stack([known[one], known[other]])[one < other], axis=1)
    names, heights = observed.job.marks.names, observed.geometry.coordinates[:, 2]
    for pair in _sorted(pairs[~_told_apart(observed, lines, pairs, tolerance)]):
        first, second = pair
        apart = float(np.hypot(*(plan[second] - plan[first])))
        height = heights[second] - heights[first]
        level = f", {height:+.3f} m in height" if np.isfinite(height) else ""
        text = f"{names[first]} and {names[second]} lie {apart:.3f} m apart{level}: one mark under two names?"
        yield Remark("two_names", text, (first, second), exceeds=True)


def _told_apart(observed: Observed, lines: Lines, pairs: IntArray, tolerance: float) -> BoolArray:
    """Pairs (pairs, 2) that lie apart in height, or that something was observed between."""
    height = observed.geometry.coordinates[:, 2][pairs]
    apart: BoolArray = np.abs(np.nan_to_num(height[:, 1] - height[:, 0])) > tolerance
    joined = [np.sort(rows.marks[:, :2], axis=1) for rows in observed.job.observations if len(rows.roles) == 2]
    both = PairIndex(np.vstack([np.empty((0, 2), np.int64), *joined]), len(observed.job.marks)).of(pairs) >= 0
    return apart | both


def _sorted(pairs: IntArray) -> list[list[int]]:
    ordered: list[list[int]] = np.unique(pairs, axis=0).tolist()
    return ordered


def _outliers(observed: Observed) -> Iterator[Remark]:
    """Given coordinates far from all others; exchanged ones are known by falling among the others when put right."""
    job = observed.job
    given, first, second = _as_given(observed)
    known = np.flatnonzero(np.isfinite(given).all(axis=1))
    if len(known) < FEWEST:
        return
    centre = np.median(given[known], axis=0)
    away = np.hypot(*(given[known] - centre).T)
    back = np.hypot(*(given[known][:, ::-1] - centre).T)
    usual = float(np.median(away))
    for place in np.flatnonzero(away > OFF_EXTENT * usual).tolist():
        mark = int(known[place])
        name, source = job.marks.names[mark], job.marks.provenance.label(mark)
        if back[place] < BACK_WITHIN * usual:
            text = f"{source}: {name} lies among the others if its {first} and {second} are exchanged"
            yield Remark("exchanged", text, (mark,), exceeds=True)
        else:
            text = f"{source}: {name} lies {away[place] / usual:.0f} times as far out as half of the marks"
            yield Remark("off_extent", text, (mark,))


def _as_given(observed: Observed) -> tuple[FloatArray, str, str]:
    """Coordinates (n, 2) in the two figures that a surveyor typed, and what they are called."""
    job = observed.job
    grid = job.frame.grid_coordinates(job.marks.given)
    if isinstance(job.frame, EllipsoidFrame) and job.frame.is_geographic:
        return job.marks.given[:, :2], "latitude", "longitude"
    return grid, "easting", "northing"


def _heights_off(observed: Observed) -> Iterator[Remark]:
    job = observed.job
    heights = job.marks.given[:, 2]
    known = np.flatnonzero(np.isfinite(heights))
    if len(known) < FEWEST:
        return
    away = np.abs(heights[known] - np.median(heights[known]))
    limit = max(OFF_EXTENT * float(np.median(away)), MOST_HEIGHT)
    for mark in known[away > limit].tolist():
        text = (
            f"{job.marks.provenance.label(mark)}: {job.marks.names[mark]} at {heights[mark]:.3f} m, unlike all others"
        )
        yield Remark("off_extent", text, (mark,))


def _rough_coordinates(observed: Observed, lines: Lines) -> Iterator[Remark]:
    """Measured lengths against coordinates that were given as a start."""
    job, lengths = observed.job, lines.lengths
    given = np.asarray(np.isfinite(job.marks.given[:, :2]).all(axis=1))
    between = np.flatnonzero(np.take(given, lengths.marks).all(axis=1) & ~observed.held[lengths.marks, 0].all(axis=1))
    marks, measured = lengths.marks[between], lengths.value[between, 0]
    computed = observed.given_geometry.level_distance(*marks.T)[0]
    for place in np.flatnonzero(np.abs(measured - computed) > ROUGH + ROUGH_SHARE * measured).tolist():
        one, other = marks[place].tolist()
        rows = tuple(lengths.rows[int(between[place])].tolist())
        sources = ", ".join(observed.source(row) for row in rows)
        text = (
            f"{job.marks.names[one]} – {job.marks.names[other]}: measured {measured[place]:.3f} m ({sources}), "
            f"{computed[place]:.3f} m between the given coordinates"
        )
        yield Remark("rough_coordinates", text, (one, other), rows)

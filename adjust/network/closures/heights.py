"""Loops of trigonometric rises, together with whatever was levelled between the same marks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.network.closures.closures import Closures
from adjust.network.closures.differences import Differences
from adjust.network.closures.levelling import height_loops, levelled, loop_closures
from adjust.network.closures.lines import Lines
from adjust.network.closures.observed import Observed
from adjust.network.closures.ragged import joined


def height_closures(observed: Observed, lines: Lines) -> Closures:
    """Loops, and lines between marks of known height, with at least one trigonometric rise in them.

    Levelled rises and trigonometric ones between the same marks make two edges, hence a loop of their own. Repeats are
    averaged first; a loop of levelling alone is a level loop and not listed again. On the ellipsoid levelled rises are
    taken to it through the geoid, where its heights are known.
    """
    edges = _together(_above_ellipsoid(observed, levelled(observed).means()), lines.rises.means())
    loops = height_loops(observed, edges, observed.geometry.spatial[:, 2])
    sighted = np.isin(loops.rows.values, lines.zenith_rows)
    some = loops.rows.total(sighted.astype(np.float64)) > 0
    return loop_closures("height_loop", loops, None).take(some)


def _together(one: Differences, other: Differences) -> Differences:
    return Differences(
        np.vstack([one.marks, other.marks]),
        np.vstack([one.value, other.value]),
        np.vstack([one.covariance, other.covariance]),
        np.concatenate([one.length, other.length]),
        joined([one.rows, other.rows]),
    )


def _above_ellipsoid(observed: Observed, levels: Differences) -> Differences:
    geoid = observed.geometry.geoid
    step = np.nan_to_num(geoid[levels.marks[:, 1]] - geoid[levels.marks[:, 0]])
    return replace(levels, value=levels.value + step[:, None])

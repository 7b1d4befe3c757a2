"""Coordinates of control as they were written, and how far off they would be if others were right."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from adjust.adjusting import grid_axes
from adjust.arrays import FloatArray
from adjust.blunders.context import Context
from adjust.frames import EllipsoidFrame

AXES = {"easting": 0, "northing": 1, "longitude": 0, "latitude": 1, "height": 2}
"""The place of each coordinate among those of a frame."""


def alternative_coordinates(context: Context, mark: int, name: str) -> Callable[[FloatArray], FloatArray] | None:
    """Errors (k, q) of a mark's control, grid axes, if its coordinate `name` had other values (k,); None where that
    does not move it along a suspected axis."""
    axes = list(context.hypothesis.given_axes(context.job))
    if AXES[name] not in axes and (name in ("easting", "northing", "height") or not {0, 1} & set(axes)):
        return None

    def error_of(others: FloatArray) -> FloatArray:
        given = np.repeat(context.job.marks.given[mark : mark + 1], len(others), axis=0)
        return written_minus(context, mark, placed(context, given, name, others))[:, axes]

    return error_of


def placed(context: Context, given: FloatArray, name: str, others: FloatArray) -> FloatArray:
    """Coordinates (k, 3) of the frame, with `name` replaced by `others` (k,)."""
    frame, result = context.job.frame, given.copy()
    if name in ("easting", "northing") and isinstance(frame, EllipsoidFrame) and frame.projection is not None:
        grid = frame.grid_coordinates(given)
        grid[:, AXES[name]] = others
        result[:, :2] = frame.projection.inverse(grid)
    else:
        result[:, AXES[name]] = others
    return result


def written_minus(context: Context, mark: int, others: FloatArray) -> FloatArray:
    """The given coordinates of a mark minus others (k, 3), metres along the grid's east, north and up."""
    given = np.repeat(context.job.marks.given[mark : mark + 1], len(others), axis=0)
    displacement = np.nan_to_num(context.job.frame.displacement(given, others))
    away: FloatArray = -displacement @ grid_axes(context.geometry)[mark].T
    return away

"""One traverse to look at, and the closures of all."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.network.closures.closures import Closures
from adjust.network.closures.compass_rule import compass_rule
from adjust.network.closures.linear import Traversing
from adjust.network.closures.ragged import Ragged
from adjust.tolerances import Quantity


@dataclass(frozen=True)
class Traverse:
    """One traverse; metres.

    `marks` as walked; `steps` (legs, 2) east and north with the angular misclosure (`angular`, radians, with its sd)
    shared out, or `unbalanced`; `arrival` (2,) is what they ought to sum to, and the `misclosure` (2,) their sum minus
    that. `leg_rows` are the observations of each leg's length, `corner_rows` those of the angle at the start of a leg
    (the number of legs: at the end). `positions` (legs − 1, 3) are the frame's coordinates of the marks on the way by
    the compass rule, their heights not the traverse's; None where it does not set out from control.
    """

    marks: list[int]
    steps: FloatArray
    unbalanced: FloatArray
    arrival: FloatArray
    length: float
    angular: float
    angular_sd: float
    leg_rows: list[list[int]]
    corner_rows: dict[int, list[int]]
    positions: FloatArray | None

    @property
    def misclosure(self) -> FloatArray:
        """East and north (2,)."""
        closing: FloatArray = self.steps.sum(axis=0) - self.arrival
        return closing


def traverse_at(traverses: Traversing, number: int) -> Traverse:
    """One of the traverses."""
    legs, corners = traverses.legs.of[number], traverses.corners.of[number]
    rows = traverses.lines.lengths.rows
    marks = traverses.courses[number].marks
    steps, reference = traverses.steps[legs], traverses.reference[legs]
    return Traverse(
        marks,
        steps,
        traverses.unbalanced[legs],
        reference.sum(axis=0),
        float(traverses.length[number]),
        float(traverses.angular[number]),
        float(traverses.angular_sd[number]),
        [rows[line].tolist() for line in traverses.legs.line[legs].tolist()],
        {int(traverses.corners.first[corner] - legs[0]): traverses.corners.rows[corner].tolist() for corner in corners},
        _positions(traverses, marks, steps, reference, traverses.leg_length[legs])
        if traverses.from_control[number]
        else None,
    )


def _positions(
    traverses: Traversing, marks: list[int], steps: FloatArray, reference: FloatArray, length: FloatArray
) -> FloatArray:
    """Coordinates (legs − 1, 3) by the compass rule of the marks on the way."""
    coordinates = traverses.geometry.coordinates
    balanced = compass_rule(steps, length, reference.sum(axis=0))
    if not traverses.curved:
        plan = coordinates[marks[0], :2] + np.cumsum(balanced.steps, axis=0)[:-1]
        return np.column_stack([plan, np.full(len(plan), np.nan)])
    shift = np.cumsum(balanced.steps - reference, axis=0)[:-1]
    return traverses.geometry.frame.moved(coordinates[marks[1:-1]], np.column_stack([shift, np.zeros(len(shift))]))


def traverse_closures(traverses: Traversing) -> list[Closures]:
    """Linear misclosures of closed traverses, and of those from one mark of control to another.

    `precision` is N of 1 : N, `east` and `north` the misclosure's parts (towards an arbitrary north where nothing
    orients the traverse), `angular` what was shared out before.
    """
    closed = traverses.closed
    return [_closures("traverse_loop", traverses, closed), _closures("traverse_link", traverses, ~closed)]


def _closures(check: str, traverses: Traversing, chosen: BoolArray) -> Closures:
    places: IntArray = np.flatnonzero(chosen)
    parts, length = traverses.misclosure[places], traverses.length[places]
    linear = np.hypot(*parts.T)
    with np.errstate(divide="ignore"):
        precision = length / linear
    return Closures(
        check,
        "m",
        linear[:, None],
        traverses.sd[places, None],
        Ragged.of([traverses.courses[place].marks for place in places.tolist()]),
        _rows(traverses).take(places),
        length,
        traverses.legs.of.lengths[places],
        Quantity.POSITION,
        figures={
            "east": parts[:, 0],
            "north": parts[:, 1],
            "precision": precision,
            "angular": traverses.angular[places],
        },
    )


def _rows(traverses: Traversing) -> Ragged:
    """The observations of each traverse: those of its lengths, then those of its angles."""
    lengths = traverses.lines.lengths.rows.take(traverses.legs.line)
    angles = traverses.corners.rows
    owner = np.concatenate([traverses.legs.of.owner[lengths.owner], traverses.corners.of.owner[angles.owner]])
    values = np.concatenate([lengths.values, angles.values])
    grouped = Ragged.grouped(owner, len(traverses))
    return Ragged(values[grouped.values], grouped.starts)

"""Inner constraints: a free network rests on any minimal datum, then is turned to fit the given coordinates.

The S-transformation (Baarda 1973, S-transformations and criterion matrices, Netherlands Geodetic Commission 5(1), §2):
with G (unknowns, motions) spanning the motions that change no observation and Gₛ its rows at the marks that carry the
datum, x̄ = S x and C̄ = S C Sᵀ with S = I − G (GₛᵀG)⁻¹ Gₛᵀ satisfy Gₛᵀ x̄ = 0.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import csr_array

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.errors import NetworkError
from adjust.frames import EllipsoidFrame, Frame, Geometry
from adjust.frames.reference_ellipsoid import local_axes
from adjust.job import Job
from adjust.network import Part
from adjust.network.wording import listed
from adjust.unknowns import EAST, NORTH, UP, Unknowns

HELD = 1000.0
"""Weight of a datum row, 1/m: of the order of millimetre observations, so that the system stays well scaled."""


LEAST_HOLD = 1e-9
"""A motion that the carriers feel by less than this share of what the whole network does is not held: two marks a metre
apart in a hundred kilometres of network still feel its rotation a thousand times more."""


@dataclass(frozen=True)
class InnerDatum:
    """The inner constraints of one free network.

    `motions` (unknowns, k) is G, `carried` (unknowns, k) is Gₛ: G where the mark carries the datum, else 0.
    """

    motions: FloatArray
    carried: FloatArray

    @cached_property
    def inverse(self) -> FloatArray:
        """(GₛᵀG)⁻¹ (k, k)."""
        return np.asarray(np.linalg.inv(self.carried.T @ self.motions), dtype=np.float64)

    def correction(self, displacement: FloatArray) -> FloatArray:
        """What to add (unknowns,) so that `displacement` (unknowns,) from the given coordinates meets Gₛᵀx = 0."""
        return -self.motions @ (self.inverse @ (self.carried.T @ displacement))


def inner_datum(job: Job, part: Part, geometry: Geometry, unknowns: Unknowns) -> InnerDatum:
    """The inner constraints of a job's one part, carried by the coordinates that it gives.

    Raises NetworkError where the marks that carry the datum leave a motion open, as one mark does a rotation.
    """
    motions = motions_of(part, geometry, unknowns, range(len(job.setups)))
    carried = np.where(carriers(job, unknowns)[:, None], motions, 0.0)
    singular_values = np.linalg.svd(carried, compute_uv=False)
    if singular_values[-1] <= LEAST_HOLD * np.linalg.norm(motions, axis=0).max():
        raise _not_carried(job, part)
    return InnerDatum(motions, carried)


def _not_carried(job: Job, part: Part) -> NetworkError:
    missing = " and ".join(name for name, elements in _ELEMENTS.items() if elements & part.missing)
    given = ~np.isnan(job.marks.given).all(axis=1)
    names = [job.marks.names[mark] for mark in job.datum.marks or np.flatnonzero(given)]
    return NetworkError(
        f"the inner constraints have to hold {missing}, and the coordinates that marks.csv gives for "
        f"{listed(names)} cannot; give the coordinates of more marks, or none, and let [datum] marks name enough of "
        "those that have some",
        names,
    )


def carriers(job: Job, unknowns: Unknowns) -> BoolArray:
    """Which unknowns (unknowns,) carry the datum: coordinates given at the marks named.

    Where no plan is given at all, the plan of the start coordinates carries it, and likewise for heights.
    """
    marks = np.zeros(len(job.marks), dtype=bool)
    marks[list(job.datum.marks) or slice(None)] = True
    given = ~np.isnan(job.marks.given) & unknowns.sought
    for coordinates in (slice(EAST, UP), slice(UP, None)):
        given[:, coordinates] |= not given[:, coordinates].any()
    result = np.zeros(unknowns.count, dtype=bool)
    result[: unknowns.coordinates] = (given & marks[:, None])[unknowns.sought]
    return result


def motions_of(part: Part, geometry: Geometry, unknowns: Unknowns, setups: Sequence[int]) -> FloatArray:
    """G (unknowns, k): one column for each missing datum element of a part, in the order of `_ORDER`.

    Metres at the marks; rotation and scale are scaled to one metre at the part's extent. `setups` are those of the
    part: a rotation turns their orientations.
    """
    marks = part.marks[unknowns.sought[part.marks].any(axis=1)]
    fields = _plane_fields if not isinstance(geometry.frame, EllipsoidFrame) else _ellipsoid_fields
    moved, extent = fields(part, geometry, marks)
    columns = []
    for name in _ORDER:
        if name not in part.missing:
            continue
        column = np.zeros(unknowns.count)
        numbered = unknowns.columns[marks]
        column[numbered[numbered >= 0]] = moved[name][numbered >= 0]
        if name == "rotation":
            column[unknowns.coordinates + np.asarray(setups, dtype=np.int64)] = 1.0 / extent
        columns.append(column)
    return np.column_stack(columns)


_ORDER = ("east", "north", "height", "rotation", "scale")

_ELEMENTS: dict[str, set[str]] = {
    "position": {"east", "north"},
    "height": {"height"},
    "rotation": {"rotation"},
    "scale": {"scale"},
}
"""Datum elements by the words for them."""

Fields = tuple[dict[str, FloatArray], float]


def _plane_fields(part: Part, geometry: Geometry, marks: IntArray) -> Fields:
    """Displacements (marks, 3) for each datum element of a plane network."""
    return _local_fields(geometry.coordinates[marks])


def _local_fields(position: FloatArray) -> Fields:
    """The similarity motions of points (marks, 3) about their centroid; unknown coordinates stay where they are."""
    known = ~np.isnan(position)
    position = np.where(known, position, 0.0)
    offset = np.where(known, position - position.sum(axis=0) / np.maximum(known.sum(axis=0), 1), 0.0)
    extent = max(float(np.abs(offset).max(initial=0.0)), 1.0)
    one, none = np.ones(len(offset)), np.zeros(len(offset))
    return {
        "east": np.column_stack([one, none, none]),
        "north": np.column_stack([none, one, none]),
        "height": np.column_stack([none, none, one]),
        "rotation": np.column_stack([offset[:, NORTH], -offset[:, EAST], none]) / extent,
        "scale": offset / extent,
    }, extent


def _ellipsoid_fields(part: Part, geometry: Geometry, marks: IntArray) -> Fields:
    """Displacements (marks, 3) along local axes.

    Where vectors fix rotation and scale, the free motions are geocentric shifts. Otherwise plumb lines count, and a
    shift follows the curved surface: a rotation about the Earth's centre, with heights unchanged.
    """
    frame = geometry.frame
    assert isinstance(frame, EllipsoidFrame)
    spatial = geometry.spatial[marks]
    if np.isnan(spatial[:, :2]).any():
        return _local_fields(np.column_stack([np.full((len(marks), 2), np.nan), spatial[:, 2]]))
    position, axes = frame.geocentric(spatial), local_axes(spatial[:, 0], spatial[:, 1])
    centre = position.mean(axis=0)
    middle = frame.from_geocentric(centre[None])
    at_centre = local_axes(middle[:, 0], middle[:, 1])[0]
    moved, extent = _local_fields((position - centre) @ at_centre.T)
    shifts = np.einsum("mij,kj->mki", axes, at_centre)
    if "rotation" not in part.missing:
        return moved | {"east": shifts[:, EAST], "north": shifts[:, NORTH], "height": shifts[:, UP]}, extent
    radius = float(np.linalg.norm(centre))
    turned = {
        "east": np.cross(at_centre[NORTH], position) / radius,
        "north": np.cross(-at_centre[EAST], position) / radius,
        "rotation": np.cross(-at_centre[UP], position) / extent,
        "scale": (position - centre) / extent,
    }
    return moved | {name: np.einsum("mij,mj->mi", axes, field) for name, field in turned.items()}, extent


def minimal_datum(part: Part, geometry: Geometry, unknowns: Unknowns) -> csr_array:
    """Rows (k, unknowns) that hold one mark, and of a far one what turns and scales the part about it.

    As many rows as the part has datum elements missing: the observations' residuals do not depend on the choice.
    """
    marks = part.marks[unknowns.sought[part.marks].any(axis=1)]
    names = [name for name in _ORDER if name in part.missing]
    first = int(marks[np.argmax(unknowns.sought[marks].sum(axis=1))])
    rows = np.zeros((len(names), 3))
    held = np.full(len(names), first)
    if {"rotation", "scale"} & part.missing:
        offset = geometry.frame.displacement(
            np.broadcast_to(geometry.coordinates[first], (len(marks), 3)), geometry.coordinates[marks]
        )[:, :2]
        farthest = int(np.nanargmax(np.hypot(*offset.T)))
        along = offset[farthest] / np.hypot(*offset[farthest])
        across = np.array([-along[1], along[0]])
    for row, name in enumerate(names):
        if name in ("rotation", "scale"):
            held[row] = marks[farthest]
            rows[row, :2] = along if name == "scale" else across
        else:
            rows[row, {"east": EAST, "north": NORTH, "height": UP}[name]] = 1.0
    return _sparse_rows(rows * HELD, unknowns.columns[held], unknowns.count)


def _sparse_rows(values: FloatArray, columns: IntArray, count: int) -> csr_array:
    kept = (columns >= 0) & (values != 0.0)
    row = np.nonzero(kept)[0]
    return csr_array((values[kept], (row, columns[kept])), shape=(len(values), count))


def displacement_of_unknowns(frame: Frame, start: FloatArray, end: FloatArray, unknowns: Unknowns) -> FloatArray:
    """From `start` to `end` coordinates (n, 3) as a vector of unknowns (unknowns,); orientations 0."""
    moved = frame.displacement(start, end)
    result = np.zeros(unknowns.count)
    result[: unknowns.coordinates] = moved[unknowns.sought]
    return result

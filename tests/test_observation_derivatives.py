"""Every kind's derivatives against numerical ones, in both frames, over short and long lines, marks in odd order.

Derivatives by metres are compared without a unit: those of lengths as they are (metres a metre), those of angles times
the length of the shorter sight (metres across the sight a metre).
"""

from __future__ import annotations

import numpy as np
import pytest

from adjust.arrays import FloatArray
from adjust.frames import EllipsoidFrame, Frame, Geometry, PlaneFrame
from adjust.observations import KINDS, ControlCoordinates, Observations, Vectors
from tests.sightings import kinds_of, observe, scattered_geometry

ROWS = 60
STEP = 1e-3  # of the shorter sight; with two step lengths the truncation is of the order STEP⁴
ROUNDING = 5e-9  # m: of a predicted length in geocentric coordinates
LENGTHS = [5.0, 200.0, 5_000.0, 60_000.0]

PLANE_ORIGIN = np.array([350_000.0, 5_600_000.0, 120.0])
PLACES = {
    "equator at Greenwich": (0.0, 0.0),
    "north, west of the antimeridian": (179.999, 52.0),
    "south, east of the antimeridian": (-179.9999, -40.0),
    "south polar": (10.0, -85.0),
    "arctic": (100.0, 78.0),
    "middle latitude": (9.3, 48.7),
}
FRAMES: dict[str, tuple[Frame, FloatArray]] = {
    "plane": (PlaneFrame(), PLANE_ORIGIN),
    "plane without curvature": (PlaneFrame(earth_curvature=False), PLANE_ORIGIN),
    **{name: (EllipsoidFrame("EPSG:4326"), np.array([*np.radians(p), 350.0])) for name, p in PLACES.items()},
}


def shorter_sight(geometry: Geometry, marks: FloatArray) -> FloatArray:
    """Length (rows,) of the shorter line from the first mark of each row, horizontally."""
    lines = [geometry.sight(marks[:, 0], marks[:, role]).enu for role in (1, 2)]
    return np.min([np.hypot(enu[:, 0], enu[:, 1]) for enu in lines], axis=0)


def numerical(rows: Observations, geometry: Geometry, steps: FloatArray) -> FloatArray:
    """Derivatives (rows, components, roles, 3) by central differences over two step lengths, extrapolated."""
    result = np.empty((*rows.observed.shape, rows.marks.shape[1], 3))
    for role in range(rows.marks.shape[1]):
        for axis in range(3):
            coarse, fine = (slope(rows, geometry, role, axis, steps * share) for share in (1.0, 0.5))
            result[:, :, role, axis] = (4.0 * fine - coarse) / 3.0
    return result


def slope(rows: Observations, geometry: Geometry, role: int, axis: int, steps: FloatArray) -> FloatArray:
    ends = []
    for sign in (1.0, -1.0):
        corrections = np.zeros_like(geometry.coordinates)
        corrections[rows.marks[:, role], axis] = sign * steps
        ends.append(rows.predict(geometry.moved(corrections)))
    difference = ends[0] - ends[1]
    if rows.full_circle:
        difference -= 2 * np.pi * np.round(difference / (2 * np.pi))
    return difference / (2.0 * steps[:, None])


@pytest.mark.parametrize("length", LENGTHS)
@pytest.mark.parametrize("place", FRAMES)
def test_derivatives_of_every_kind(place: str, length: float) -> None:
    frame, origin = FRAMES[place]
    generator = np.random.default_rng(20)
    orthometric = place == "middle latitude"
    geometry, marks = scattered_geometry(frame, origin, length, ROWS, generator, orthometric=orthometric)
    shortest = shorter_sight(geometry, marks)
    for kind in kinds_of(frame):
        rows = observe(kind, geometry, marks, generator)
        analytic, expected = rows.differentiate(geometry), numerical(rows, geometry, STEP * shortest)
        unit = shortest[:, None, None, None] if kind.unit == "rad" else 1.0
        # ROUNDING over the finer step, for rows of the registry that are exact; one part in 10⁹ of truncation
        tolerance = 4.0 * ROUNDING / (STEP * shortest.min()) + 1e-9
        if kind is ControlCoordinates:
            tolerance += 1e-6  # left out on purpose: 2 cm of displacement turn the axes, most near the pole
        np.testing.assert_allclose(analytic * unit, expected * unit, rtol=0, atol=tolerance, err_msg=kind.kind)


@pytest.mark.parametrize("place", ["plane", "middle latitude"])
def test_linearise_gives_prediction_and_derivatives_together(place: str) -> None:
    frame, origin = FRAMES[place]
    generator = np.random.default_rng(21)
    geometry, marks = scattered_geometry(frame, origin, 900.0, ROWS, generator)
    for kind in kinds_of(frame):
        rows = observe(kind, geometry, marks, generator)
        predicted, derivatives = rows.linearise(geometry)
        np.testing.assert_array_equal(predicted, rows.predict(geometry), err_msg=kind.kind)
        np.testing.assert_array_equal(derivatives, rows.differentiate(geometry), err_msg=kind.kind)
        assert derivatives.shape == (ROWS, len(kind.components), len(kind.roles), 3)


def test_few_rows_among_many_marks_give_what_many_rows_give() -> None:
    """The ellipsoid frame works out marks once each, or only those of the rows, whichever are fewer."""
    frame, origin = FRAMES["middle latitude"]
    generator = np.random.default_rng(22)
    geometry, marks = scattered_geometry(frame, origin, 900.0, ROWS, generator)
    for kind in kinds_of(frame):
        rows = observe(kind, geometry, np.tile(marks, (4, 1)), generator)
        few = rows.take(np.array([7, 3]))
        for whole, part in zip(rows.linearise(geometry), few.linearise(geometry), strict=True):
            np.testing.assert_array_equal(whole[[7, 3]], part, err_msg=kind.kind)


def test_the_registry_names_each_kind_once() -> None:
    assert [kind.kind for kind in KINDS] == [
        "direction",
        "angle",
        "azimuth",
        "slope_distance",
        "horizontal_distance",
        "zenith",
        "height_difference",
        "vector",
        "control",
    ]


def test_vectors_never_reach_a_plane_frame() -> None:
    generator = np.random.default_rng(23)
    ellipsoid, marks = scattered_geometry(*FRAMES["middle latitude"], 900.0, ROWS, generator)
    plane, _ = scattered_geometry(*FRAMES["plane"], 900.0, ROWS, generator)
    rows = observe(Vectors, ellipsoid, marks, generator)
    with pytest.raises(TypeError, match="ellipsoid frame"):
        rows.predict(plane)

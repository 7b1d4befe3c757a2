"""Invented networks of several shapes, as plans: true coordinates, control, and what is to be measured.

Every function draws its ground from the generator it is given, so that one seed makes one network. `observe` measures
the plan.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.builders import weighted_control
from adjust.frames import EllipsoidFrame, Frame, PlaneFrame
from adjust.job import Control, Job, Marks
from adjust.observations import KINDS, ControlCoordinates, Directions, Observations, Provenance
from adjust.simulate.equipment import Equipment
from adjust.simulate.layout import Layout, mark_names, tied_traverses, triangulated_grid
from adjust.units import ARCSEC

CRS = "EPSG:25833"
"""ETRS89 / UTM zone 33N: the invented networks on the ellipsoid lie in it, at no place in particular."""
ORIGIN = np.array([np.radians(16.3), np.radians(47.2), 400.0])
"""Longitude, latitude, height of their south-west corner, half a degree off the central meridian and more."""
PLANE_ORIGIN = np.array([5000.0, 2000.0, 100.0])
"""Easting, northing, height of the south-west corner in a plane frame."""
WEIGHTED_SD = np.array([0.003, 0.003, 0.005])
"""Metres, easting, northing, height of weighted control."""
LEVELLED_DETOUR = 1.3
"""A levelled line's length along the ground as a multiple of the straight one."""


def levelling_net(generator: np.random.Generator, rows: int = 4, columns: int = 4) -> Job:
    """Lines of levels along a grid and its diagonals, two benchmarks at opposite corners held; no plan coordinates."""
    layout = triangulated_grid(rows, columns, generator)
    last = len(layout) - 1
    coordinates = layout.coordinates(PlaneFrame(), PLANE_ORIGIN)
    marks = place_marks(coordinates * (np.nan, np.nan, 1.0), fixed_height=(0, last))
    return assemble("Levelling net", PlaneFrame(), marks, [_levels(layout)])


def traverse_net(generator: np.random.Generator, legs: int = 6) -> Job:
    """Two traverses tied across, both ends of both held in plan: rounds of directions and horizontal distances."""
    layout = tied_traverses(legs, generator)
    ends = (0, 1, len(layout) - 2, len(layout) - 1)
    marks = place_marks(layout.coordinates(PlaneFrame(), PLANE_ORIGIN) * (1.0, 1.0, np.nan), fixed_plan=ends)
    sights = layout.both_ways()
    equipment = Equipment()
    kinds = [equipment.directions(sights), equipment.horizontal_distances(layout.lines)]
    return assemble("Tied traverses", PlaneFrame(), marks, kinds)


def triangulation_grid(generator: np.random.Generator, rows: int = 4, columns: int = 5) -> Job:
    """A plan grid with rounds at every mark and a distance along every line, its four corners held.

    About nine observations for each mark, of which it has as many as the benchmarks like: 100 × 100 give 88 803.
    """
    layout = triangulated_grid(rows, columns, generator)
    corners = (0, columns - 1, len(layout) - columns, len(layout) - 1)
    marks = place_marks(layout.coordinates(PlaneFrame(), PLANE_ORIGIN) * (1.0, 1.0, np.nan), fixed_plan=corners)
    sights = layout.both_ways()
    equipment = Equipment()
    kinds = [equipment.directions(sights), equipment.horizontal_distances(layout.lines)]
    return assemble("Triangulation grid", PlaneFrame(), marks, kinds)


def total_station_net(
    generator: np.random.Generator, rows: int = 3, columns: int = 4, frame: Frame | None = None
) -> Job:
    """Rounds of directions, zenith angles and slope distances in three dimensions; two opposite corners held."""
    frame = PlaneFrame() if frame is None else frame
    layout = triangulated_grid(rows, columns, generator, spacing=300.0)
    marks = place_marks(_on_the_ground(layout, frame), fixed=(0, len(layout) - 1))
    return assemble("Total-station network", frame, marks, _rounds(layout, generator))


def total_station_net_on_ellipsoid(generator: np.random.Generator) -> Job:
    """The same on the ellipsoid, with deflections of the vertical; heights above the ellipsoid."""
    plan = total_station_net(generator, frame=EllipsoidFrame(CRS))
    return _with_gravity(plan, generator, orthometric=False)


def gnss_net(generator: np.random.Generator, rows: int = 3, columns: int = 3) -> Job:
    """GNSS vectors along every line, one corner held and one weighted."""
    frame = EllipsoidFrame(CRS)
    layout = triangulated_grid(rows, columns, generator, spacing=4000.0, relief=80.0)
    marks = place_marks(_on_the_ground(layout, frame), fixed=(0,), weighted=(len(layout) - 1,))
    return assemble("GNSS network", frame, marks, [_vectors(layout, frame, marks.given)])


def mixed_net(generator: np.random.Generator, rows: int = 3, columns: int = 4) -> Job:
    """Every kind of observation on the ellipsoid: orthometric heights, deflections, fixed and weighted control.

    Its last two marks are benchmarks of no known position, tied by levelling alone; the last one's height is held.
    """
    frame = EllipsoidFrame(CRS)
    layout = triangulated_grid(rows, columns, generator, spacing=400.0)
    corner = len(layout) - 1
    benchmarks = np.array([[np.nan, np.nan, 410.0], [np.nan, np.nan, 395.0]])
    coordinates = np.vstack([_on_the_ground(layout, frame), benchmarks])
    marks = place_marks(coordinates, fixed=(0,), weighted=(corner,), fixed_height=(corner + 2,))
    equipment = Equipment()
    sights = layout.both_ways()
    spurs = np.array([[1, corner + 1], [corner + 1, corner + 2], [corner - 1, corner + 2]])
    kinds = [
        *_rounds(layout, generator),
        equipment.angles(_angle_marks(sights)),
        equipment.azimuths(layout.lines[:2]),
        equipment.horizontal_distances(layout.lines[::3]),
        _levels(layout, spurs),
        _vectors(Layout(layout.local, layout.lines[::4]), frame, coordinates),
    ]
    return _with_gravity(assemble("Mixed network", frame, marks, kinds), generator, orthometric=True)


NETWORKS: dict[str, Callable[[np.random.Generator], Job]] = {
    "levelling": levelling_net,
    "traverses": traverse_net,
    "triangulation": triangulation_grid,
    "total station, plane": total_station_net,
    "total station, ellipsoid": total_station_net_on_ellipsoid,
    "GNSS": gnss_net,
    "mixed": mixed_net,
}
"""Every shape in its usual size, 9 to 20 marks."""


def place_marks(
    coordinates: FloatArray,
    *,
    fixed: Sequence[int] = (),
    fixed_plan: Sequence[int] = (),
    fixed_height: Sequence[int] = (),
    weighted: Sequence[int] = (),
) -> Marks:
    """Marks at true coordinates (n, 3) of the frame, held as the indices say; weighted ones with `WEIGHTED_SD`."""
    control = np.full((len(coordinates), 2), Control.FREE, dtype=np.int64)
    control[list(weighted)] = Control.WEIGHTED
    control[[*fixed, *fixed_plan], 0] = Control.FIXED
    control[[*fixed, *fixed_height], 1] = Control.FIXED
    count = len(coordinates)
    return Marks(
        names=mark_names(count),
        given=coordinates,
        control=control,
        sd=np.where(control[:, [0, 0, 1]] == Control.WEIGHTED, WEIGHTED_SD, np.nan),
        geoid=np.zeros(count),
        deflection=np.zeros((count, 2)),
        descriptions=("",) * count,
        provenance=Provenance(("marks.csv",), np.zeros(count, dtype=np.int64), np.arange(2, count + 2)),
    )


def assemble(title: str, frame: Frame, marks: Marks, kinds: Sequence[Observations]) -> Job:
    """The plan of a job: its kinds in the registry's order, weighted control among them.

    Each mark with directions is one setup, whatever number the rows give it; rows stand in the lines of the tables
    that `write_job` writes.
    """
    control = weighted_control(marks)
    every = [*kinds] if control is None else [*kinds, control]
    ordered = sorted((rows for rows in every if len(rows)), key=lambda rows: KINDS.index(type(rows)))
    stations = np.unique([rows.marks[:, 0] for rows in ordered if isinstance(rows, Directions)])
    numbered = tuple(
        replace(rows, setup_index=np.searchsorted(stations, rows.marks[:, 0])) if isinstance(rows, Directions) else rows
        for rows in _in_lines(ordered)
    )
    setups = tuple(f"at {marks.names[station]}" for station in stations.tolist())
    return Job(title=title, frame=frame, marks=marks, observations=numbered, setups=setups)


def _in_lines(kinds: Sequence[Observations]) -> Iterator[Observations]:
    """The kinds with their rows below each other in the tables they share, under one header row."""
    used: dict[str, int] = {}
    for rows in kinds:
        if isinstance(rows, ControlCoordinates):
            yield rows
            continue
        first = used.get(rows.table, 2)
        used[rows.table] = first + len(rows)
        lines = np.arange(first, used[rows.table])
        yield replace(rows, provenance=Provenance((f"{rows.table}.csv",), np.zeros_like(lines), lines))


def _on_the_ground(layout: Layout, frame: Frame) -> FloatArray:
    return layout.coordinates(frame, PLANE_ORIGIN if isinstance(frame, PlaneFrame) else ORIGIN)


def _levels(layout: Layout, spurs: IntArray | None = None) -> Observations:
    """Levels along every line of a layout, and along spurs of one kilometre."""
    lengths = LEVELLED_DETOUR * _lengths(layout)
    if spurs is None:
        return Equipment().height_differences(layout.lines, lengths)
    return Equipment().height_differences(
        np.vstack([layout.lines, spurs]), np.concatenate([lengths, np.full(len(spurs), 1000.0)])
    )


def _lengths(layout: Layout) -> FloatArray:
    difference = layout.local[layout.lines[:, 1], :2] - layout.local[layout.lines[:, 0], :2]
    return np.hypot(difference[:, 0], difference[:, 1])


def _rounds(layout: Layout, generator: np.random.Generator) -> list[Observations]:
    """A round of directions at every mark, a zenith angle with each, a slope distance along each line."""
    equipment = Equipment()
    sights = layout.both_ways()
    instrument = np.round(generator.uniform(1.5, 1.7, len(layout)), 3)
    target = np.round(generator.uniform(1.3, 1.8, len(layout)), 3)
    heights = np.column_stack([instrument[sights[:, 0]], target[sights[:, 1]]])
    outward = sights[:, 0] < sights[:, 1]
    return [
        equipment.directions(sights),
        equipment.zenith_angles(sights, heights),
        equipment.slope_distances(sights[outward], heights[outward]),
    ]


def _vectors(layout: Layout, frame: EllipsoidFrame, coordinates: FloatArray) -> Observations:
    axes = frame.axes(coordinates[layout.lines[:, 0]])
    return Equipment().vectors(layout.lines, _lengths(layout), axes)


def _angle_marks(sights: IntArray) -> IntArray:
    """At, from, to (rows, 3): the angle between the first two sights of every mark."""
    _, first = np.unique(sights[:, 0], return_index=True)
    return np.column_stack([sights[first], sights[first + 1, 1]])


def _with_gravity(plan: Job, generator: np.random.Generator, *, orthometric: bool) -> Job:
    """The plan above a geoid that undulates by a decimetre, with deflections of a few seconds."""
    count = len(plan.marks)
    geoid = np.round(45.0 + generator.normal(0.0, 0.1, count), 3)
    deflection = np.round(generator.normal(0.0, 4.0, (count, 2)), 1) * ARCSEC
    return replace(plan, marks=replace(plan.marks, geoid=geoid, deflection=deflection), orthometric=orthometric)

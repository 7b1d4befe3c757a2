"""The map of the page as SVG paths: lines by kind of observation, marks by status, ellipses and height bars."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from adjust.adjustment import Adjustment
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.quality import Ellipse
from adjust.reports.page.labels import Label, place_labels
from adjust.reports.page.places import WIDTH, Places, find_places

FEW = 1000
"""Marks of which all pairs are compared: 24 MB for a moment."""
LARGEST_ELLIPSE = 45.0
"""Units of the drawing that the largest semi-axis first has."""
OF_SPACING = 0.6
"""Share of the usual distance between marks that the median semi-axis first has at most: ellipses stay apart."""
PATCH = 60.0
"""Units of the drawing across a patch that is painted together."""
TOGETHER = 200
"""Marks or lines of one path at most."""
NICE = (1.0, 2.0, 5.0)

FAMILIES = {
    "vectors": ("GNSS vectors", ("vector",)),
    "distances": ("distances", ("slope_distance", "horizontal_distance")),
    "levels": ("levelled", ("height_difference",)),
    "zeniths": ("zenith angles", ("zenith",)),
    "angles": ("directions, angles, azimuths", ("direction", "angle", "azimuth")),
}
"""Kinds that are drawn alike, from the broadest line, which lies lowest, to the finest."""

STATUSES = {
    "fixed": "fixed",
    "weighted": "weighted control",
    "adjusted": "adjusted",
    "none": "not determined",
}


@dataclass(frozen=True)
class Outline:
    """A shape that belongs to one mark."""

    mark: int
    path: str


@dataclass(frozen=True)
class Layer:
    """Lines of one family or marks of one status: its name, its words for the legend, how many, and its paths."""

    name: str
    words: str
    count: int
    paths: tuple[str, ...]


@dataclass(frozen=True)
class Drawing:
    """Everything that the map shows. `exaggeration` is that of ellipses and bars, None in a schematic."""

    places: Places
    lines: tuple[Layer, ...]
    marks: tuple[Layer, ...]
    ellipses: tuple[Outline, ...]
    bars: tuple[Outline, ...]
    labels: tuple[Label, ...]
    exaggeration: float | None
    ellipse_factor: float
    bar_factor: float
    longest_bar: tuple[str, float] | None
    """Name of the mark with the largest 95 % height, and that height in metres."""
    missing: int
    """Marks without a place on the drawing."""

    @property
    def width(self) -> float:
        """Units across."""
        return WIDTH

    @property
    def metres_across(self) -> float | None:
        """Width of the drawing on the ground."""
        return None if self.places.metres is None else WIDTH * self.places.metres


def draw(adjustment: Adjustment) -> Drawing:
    """The map of an adjustment."""
    places = find_places(adjustment)
    statuses = mark_statuses(adjustment)
    factor = adjustment.ellipse_factor
    ellipses = adjustment.ellipses.scaled(factor)
    exaggeration = _exaggeration(places, ellipses.semi_major, adjustment.height_95)
    scale = exaggeration / (places.metres or 1.0)
    known = places.drawn
    return Drawing(
        places=places,
        lines=(*_suspect_layer(adjustment, places), *_line_layers(adjustment, places)),
        marks=tuple(_mark_layers(places, statuses)),
        ellipses=tuple(_ellipse_outlines(places, ellipses, known, scale)),
        bars=tuple(_bar_outlines(places, adjustment.height_95, known, scale)),
        labels=place_labels(places, adjustment.job.marks.names, _importance(adjustment, statuses)),
        exaggeration=None if places.metres is None else exaggeration,
        ellipse_factor=factor,
        bar_factor=_bar_factor(adjustment),
        longest_bar=_longest_bar(adjustment),
        missing=len(statuses) - len(known),
    )


def mark_statuses(adjustment: Adjustment) -> list[str]:
    """One status for each mark: that of its plan, or of its height where it has no plan."""
    return [plan if plan != "none" else height for plan, height in adjustment.statuses]


def _importance(adjustment: Adjustment, statuses: list[str]) -> FloatArray:
    """Which marks are named first where there is no room for all: control, then the least certain."""
    uncertainty = np.nan_to_num(np.fmax(adjustment.horizontal_95, adjustment.height_95))
    held = np.array([status in ("fixed", "weighted") for status in statuses], dtype=bool)
    importance: FloatArray = uncertainty + np.where(held, 1 + float(np.max(uncertainty, initial=0.0)), 0.0)
    return importance


def _bar_factor(adjustment: Adjustment) -> float:
    """95 % heights over their sds; 1 where there are none."""
    with np.errstate(invalid="ignore", divide="ignore"):
        ratios = adjustment.height_95 / adjustment.standard_deviations[:, 2]
    found = ratios[np.isfinite(ratios)]
    return float(found[0]) if len(found) else 1.0


def _exaggeration(places: Places, semi_major: FloatArray, heights: FloatArray) -> float:
    """A round number that makes the shapes visible without running into each other much."""
    shown = places.drawn
    sizes = semi_major[shown]
    sizes = sizes[np.isfinite(sizes) & (sizes > 0)]
    if len(sizes) == 0:
        sizes = heights[shown]
        sizes = sizes[np.isfinite(sizes) & (sizes > 0)]
    if len(sizes) == 0:
        return 1.0
    spacing = _spacing(places)
    metres = places.metres or 1.0
    wanted = min(LARGEST_ELLIPSE / float(sizes.max()), OF_SPACING * spacing / float(np.median(sizes))) * metres
    return float(nice_below(wanted))


def _spacing(places: Places) -> float:
    """The usual distance from a mark to its nearest neighbour, units."""
    points = np.unique(places.positions[places.drawn], axis=0)
    if len(points) < 2:
        return WIDTH
    return float(np.median(_nearest(points)))


def _nearest(points: FloatArray) -> FloatArray:
    """Distance (n,) from each point to the nearest other one. Among few all are compared, sooner than a library for
    many is loaded."""
    if len(points) <= FEW:
        distances = np.hypot(*(points[:, None] - points).transpose(2, 0, 1))
        np.fill_diagonal(distances, np.inf)
        nearest: FloatArray = distances.min(axis=1)
        return nearest
    from scipy.spatial import cKDTree

    nearest = cKDTree(points).query(points, k=2)[0][:, 1]
    return nearest


def nice_below(value: float) -> float:
    """The largest of 1, 2 and 5 times a power of ten that is not above `value`."""
    power = 10.0 ** np.floor(np.log10(value))
    return float(max(step * power for step in NICE if step * power <= value * (1 + 1e-9)))


def _number(value: float) -> str:
    """Two decimals at most within the drawing, no zeros at the end."""
    return f"{round(value, 2) + 0.0:g}"


def _patches(pieces: list[str], places: FloatArray) -> tuple[str, ...]:
    """Pieces of a path that lie at `places` (n, 2), put together patch by patch.

    A browser paints the parts of the screen that changed, and of a path all of it: small ones are painted sooner.
    """
    row, column = (places[:, ::-1] // PATCH).astype(np.int64).T
    order = np.lexsort((column, row)).tolist()
    return tuple(
        "".join(pieces[place] for place in order[first : first + TOGETHER]) for first in range(0, len(order), TOGETHER)
    )


def _longest_bar(adjustment: Adjustment) -> tuple[str, float] | None:
    heights = adjustment.height_95
    if not np.any(heights > 0):
        return None
    mark = int(np.nanargmax(heights))
    return adjustment.job.marks.names[mark], float(heights[mark])


def _line_layers(adjustment: Adjustment, places: Places) -> Iterator[Layer]:
    for name, (words, kinds) in FAMILIES.items():
        yield from _line_layer(name, words, adjustment.lines[lines_of(adjustment, kinds)], places)


def _suspect_layer(adjustment: Adjustment, places: Places) -> Iterator[Layer]:
    """Lines of suspect observations, drawn broad below the others."""
    pairs = [
        np.sort(table.observations.marks[rows][:, [0, role]], axis=1)
        for table in adjustment.residuals
        for rows in (np.flatnonzero(table.suspect.any(axis=1)),)
        for role in range(1, table.observations.marks.shape[1])
    ]
    lines = np.unique(np.concatenate([np.zeros((0, 2), dtype=np.int64), *pairs]), axis=0)
    yield from _line_layer("suspects", "suspect", lines, places)


def _line_layer(name: str, words: str, lines: IntArray, places: Places) -> Iterator[Layer]:
    """One path for all lines whose both ends are on the drawing."""
    shown = np.zeros(len(places.positions), dtype=bool)
    shown[places.drawn] = True
    lines = lines[np.all(shown[lines], axis=1)]
    if len(lines):
        ends = np.round(places.positions[lines], 2) + 0.0
        pieces = ["M{:g} {:g}L{:g} {:g}".format(*each) for each in ends.reshape(-1, 4).tolist()]
        yield Layer(name, words, len(lines), _patches(pieces, ends.mean(axis=1)))


def lines_of(adjustment: Adjustment, kinds: tuple[str, ...]) -> BoolArray:
    """Which of `adjustment.lines` some observation of these kinds joins (lines,)."""
    from adjust.covariance import observed_lines

    count = len(adjustment.job.marks)
    weights = np.array([count, 1])
    found = observed_lines([rows for rows in adjustment.job.observations if rows.kind in kinds], count) @ weights
    member: BoolArray = np.isin(adjustment.lines @ weights, found)
    return member


def _mark_layers(places: Places, statuses: list[str]) -> Iterator[Layer]:
    """Marks as strokes of next to no length, which the style sheet gives a width and square or round ends."""
    status = np.array(statuses, dtype=str)[places.drawn]
    for name, words in STATUSES.items():
        points = np.round(places.positions[places.drawn[status == name]], 2) + 0.0
        if len(points):
            pieces = [f"M{x:g} {y:g}h.01" for x, y in points.tolist()]
            yield Layer(name, words, len(points), _patches(pieces, points))


def _ellipse_outlines(places: Places, ellipses: Ellipse, marks: IntArray, scale: float) -> Iterator[Outline]:
    for mark in marks.tolist():
        major, minor = float(ellipses.semi_major[mark]) * scale, float(ellipses.semi_minor[mark]) * scale
        if major > 0:
            yield Outline(mark, ellipse_path(places.positions[mark], major, minor, float(ellipses.azimuth[mark])))


def ellipse_path(centre: FloatArray, major: float, minor: float, azimuth: float) -> str:
    """Two half turns between the ends of the major axis, whose azimuth is clockwise from up."""
    x, y = float(centre[0]), float(centre[1])
    east, north = major * np.sin(azimuth), major * np.cos(azimuth)
    turn = np.degrees(azimuth) - 90
    axes = f"{_number(major)} {_number(max(minor, 0.01))} {turn:.0f}"
    return (
        f"M{_number(x - east)} {_number(y + north)}a{axes} 1 1 {_number(2 * east)} {_number(-2 * north)}"
        f"a{axes} 1 1 {_number(-2 * east)} {_number(2 * north)}z"
    )


def _bar_outlines(places: Places, heights: FloatArray, marks: IntArray, scale: float) -> Iterator[Outline]:
    """Upright bars with a foot and a cap, of the 95 % height up and down."""
    for mark in marks.tolist():
        half = float(heights[mark]) * scale
        if half > 0:
            x, y = places.positions[mark].tolist()
            full = _number(2 * half)
            yield Outline(mark, f"M{_number(x - 3)} {_number(y - half)}h6m-3 0v{full}m-3 0h6")

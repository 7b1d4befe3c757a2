"""Two pictures of how the observations fit: normalised residuals beside the normal curve, and redundancy by kind."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr

from adjust.adjustment import Adjustment
from adjust.arrays import FloatArray
from adjust.observations import KIND_NAMES

WIDTH, HEIGHT = 420.0, 190.0
"""Units of a chart."""
BASE = 160.0
"""Units from the top down to the axis."""
SPAN = 5.0
"""Normalised residuals are drawn from −5 to 5; what lies beyond is counted in the outermost bars."""
BINS = 40
CELLS = 20
"""Steps of redundancy from 0 to 1."""


@dataclass(frozen=True)
class Bar:
    """One bar of the histogram, in units of the chart, with the number it stands for."""

    x: float
    y: float
    width: float
    height: float
    words: str


@dataclass(frozen=True)
class Histogram:
    """Normalised residuals w against the standard normal curve; `within` counts those up to the critical value."""

    bars: tuple[Bar, ...]
    curve: str
    ticks: tuple[tuple[float, str], ...]
    count: int
    words: str


def histogram(adjustment: Adjustment) -> Histogram | None:
    """The histogram of w; None where nothing is checked."""
    w = np.concatenate([np.empty(0), *(table.w.ravel() for table in adjustment.residuals)])
    w = w[np.isfinite(w)]
    if len(w) == 0:
        return None
    bins = int(np.clip(2 * np.ceil(len(w) ** 0.5 / 2), 10, BINS))
    edges = np.linspace(-SPAN, SPAN, bins + 1)
    counts = np.histogram(np.clip(w, -SPAN, SPAN), edges)[0]
    expected = len(w) * np.diff(ndtr(edges))
    top = float(max(counts.max(), expected.max()))
    scale, across = (BASE - 12) / top, WIDTH / (2 * SPAN)
    width = 2 * SPAN / bins * across
    bars = tuple(
        Bar(
            round(float(left + SPAN) * across + 0.5, 2),
            round(BASE - count * scale, 2),
            round(width - 1, 2),
            round(count * scale, 2),
            f"{count} with w from {left:.2f} to {right:.2f}, {wanted:.1f} expected",
        )
        for left, right, count, wanted in zip(
            edges[:-1].tolist(), edges[1:].tolist(), counts.tolist(), expected.tolist(), strict=True
        )
        if count
    )
    ticks = tuple(((tick + SPAN) * across, f"{tick:g}") for tick in (-4.0, -2.0, 0.0, 2.0, 4.0))
    return Histogram(bars, _curve(len(w) * 2 * SPAN / bins * scale, across), ticks, len(w), _histogram_words(w))


def _curve(area: float, across: float) -> str:
    """The normal density as a path; `area` is the height of a density of 1."""
    at = np.linspace(-SPAN, SPAN, 81)
    density = np.exp(-(at**2) / 2) / np.sqrt(2 * np.pi)
    points = zip(((at + SPAN) * across).tolist(), (BASE - density * area).tolist(), strict=True)
    return "M" + "L".join(f"{x:.1f} {y:.1f}" for x, y in points)


def _histogram_words(w: FloatArray) -> str:
    inside = int(np.count_nonzero(np.abs(w) <= 2))
    return (
        f"{inside} of {len(w)} normalised residuals lie between −2 and 2, {len(w) * (2 * ndtr(2.0) - 1):.0f} expected"
    )


@dataclass(frozen=True)
class Strip:
    """Redundancy of one kind: shares of its rows in equal steps from 0 to 1, as heights of 0 to 1, and in words."""

    name: str
    heights: tuple[float, ...]
    mean: float
    count: int
    words: str


def strips(adjustment: Adjustment) -> tuple[Strip, ...]:
    """One strip for each kind."""
    return tuple(
        _strip(KIND_NAMES[table.observations.kind][1], table.redundancy.ravel())
        for table in adjustment.residuals
        if table.redundancy.size
    )


def _strip(name: str, redundancy: FloatArray) -> Strip:
    counts = np.histogram(np.clip(redundancy, 0, 1), np.linspace(0, 1, CELLS + 1))[0]
    heights = tuple(round(float(count) / float(counts.max()), 3) for count in counts)
    low, mean, high = (float(figure(redundancy)) for figure in (np.min, np.mean, np.max))
    words = f"{name}: redundancy from {low:.2f} to {high:.2f}, mean {mean:.2f}"
    return Strip(name, heights, mean, redundancy.size, words)

"""docs/from-book-to-coordinates.md prints what the program computes."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from adjust import Adjustment, adjust, read_job
from adjust.arrays import FloatArray
from adjust.reductions.grid_sheet import LineFactors, line_factors
from adjust.reports.reduction import setup_records
from adjust.residuals import Residuals
from adjust.units import ARCSEC, format_dms, parse_dms

ROOT = Path(__file__).parent.parent
PAGE = re.sub(r"\s+", " ", (ROOT / "docs" / "from-book-to-coordinates.md").read_text(encoding="utf-8"))
TARGETS = ("Q2", "Q4")


@pytest.fixture(scope="module")
def result() -> Adjustment:
    return adjust(read_job(ROOT / "field_data" / "quarry_raw"))


@pytest.fixture(scope="module")
def directions(result: Adjustment) -> Residuals:
    return next(rows for rows in result.residuals if rows.observations.kind == "direction")


def book() -> dict[tuple[str, str, str], list[tuple[int, str]]]:
    """Lines and circle readings of setup S1 by round, target and face, as they stand in the file."""
    found: dict[tuple[str, str, str], list[tuple[int, str]]] = {}
    lines = (ROOT / "field_data" / "quarry_raw" / "pointings.csv").read_text("utf-8").splitlines()
    for number, line in enumerate(lines, 1):
        if line.startswith("S1,"):
            _, _, to, turn, face, circle, *_ = line.split(",")
            found.setdefault((turn, to, face), []).append((number, circle))
    return found


def pair(turn: str, to: str) -> tuple[float, float]:
    """Mean of the faces and half their difference, radians, by plain arithmetic."""
    left, right = (
        np.mean([np.radians(parse_dms(circle)) for _, circle in book()[turn, to, face]]) for face in ("L", "R")
    )
    right = right + np.pi if right < left else right - np.pi
    return float((left + right) / 2), float((left - right) / 2)


def printed(text: str) -> None:
    assert text in PAGE, text


@pytest.mark.parametrize("turn", ["1", "2", "3"])
@pytest.mark.parametrize("to", TARGETS)
def test_readings_and_faces(turn: str, to: str) -> None:
    sides = [book()[turn, to, face] for face in ("L", "R")]
    lines = "; ".join(", ".join(str(number) for number, _ in side) for side in sides)
    circles = " | ".join(", ".join(circle for _, circle in side) for side in sides)
    printed(f"| {turn} | {to} | {lines} | {circles} |")
    mean, half = pair(turn, to)
    printed(f"| {turn} | {to} | {format_dms(mean, 1)} | +{half / ARCSEC:.1f}″ |")


def test_angles_of_the_rounds() -> None:
    angles = [(pair(turn, "Q4")[0] - pair(turn, "Q2")[0]) % (2 * np.pi) for turn in "123"]
    printed(f"gives the angle: {', '.join(format_dms(angle, 1) for angle in angles)}.")


def test_setup_of_the_reduction(result: Adjustment) -> None:
    pointings = result.job.reduction.pointings
    assert pointings is not None
    setup = next(setup_records(pointings, 0.95))
    printed(f"shows a collimation error of +{setup['collimation_arcsec']:.1f}″")
    assert setup["collimation_pairs"] == 12
    printed(f"by {setup['directions']['factor']:.2f} of what `direction_arcsec` promises, over five degrees")
    assert (setup["directions"]["redundancy"], setup["directions"]["passed"]) == (5, True)
    printed(f"the first half-round closed to +{pointings.horizons.misclosure[0] / ARCSEC:.0f}″")
    two_on_a_face = pointings.directions.scatter.sd[0] / ARCSEC
    printed(f"with two readings on one of the faces it has {two_on_a_face:.2f}″")


def test_directions_and_residuals(result: Adjustment, directions: Residuals) -> None:
    rows = directions.observations
    rounds = {to: [turn for turn in "123" if (turn, to, "L") in book()] for to in ("Q2", "Q3", "Q4", "Q5", "Q6")}
    for row, to in enumerate(rounds):
        observed, sd = format_dms(rows.observed[row, 0], 2), rows.precision.constant[row] / ARCSEC  # type: ignore[attr-defined]
        printed(f"| {to} | {observed} | {', '.join(rounds[to])} | {sd:.2f}″ |")
        if to in TARGETS:
            residual = f"{directions.residual[row, 0] / ARCSEC:+.2f}".replace("-", "−")
            adjusted = format_dms(directions.adjusted[row, 0] % (2 * np.pi), 2)
            w = f"{directions.w[row, 0]:.2f}".replace("-", "−")
            printed(f"| {to} | {observed} | {residual}″ | {adjusted} | {directions.redundancy[row, 0]:.2f} | {w} |")
    printed(rows.provenance.label(2))


def lines_of(result: Adjustment) -> LineFactors:
    index = result.job.marks.index
    marks = np.array([[index["Q1"], index[to]] for to in TARGETS])
    return line_factors(result.job.frame, result.geometry.spatial, marks)  # type: ignore[arg-type]


def angle(values: FloatArray) -> str:
    return format_dms((values[1] - values[0]) % (2 * np.pi), 2)


def test_the_angle(result: Adjustment, directions: Residuals) -> None:
    adjusted, lines = directions.adjusted[[0, 2], 0], lines_of(result)
    more = (adjusted[1] - adjusted[0] - directions.observations.observed[2, 0]) % (2 * np.pi) / ARCSEC
    printed(f"from Q2 to Q4 is {angle(adjusted)}, {more:.2f}″ more than what the rounds gave")
    printed(f"geodesics | {angle(lines.azimuth)} | −0.04″ |")
    printed(f"straight lines | {angle(lines.plane_bearing)} | −0.09″ |")
    printed(f"an angle of {angle(lines.plane_bearing)}.")
    first, second = lines.arc_to_chord / ARCSEC
    printed(f"{first:+.2f}″ and {second:+.2f}″".replace("-", "−"))
    steps = [
        (values[1] - values[0]) % (2 * np.pi) / ARCSEC for values in (adjusted, lines.azimuth, lines.plane_bearing)
    ]
    assert steps[1] - steps[0] == pytest.approx(-0.04, rel=0, abs=0.005)
    assert steps[2] - steps[1] == pytest.approx(-0.09, rel=0, abs=0.005)
    for name in ("Q1", *TARGETS):
        easting, northing = result.job.frame.grid_coordinates(result.coordinates)[result.job.marks.index[name]]
        printed(f"| {name} | {easting:.4f} | {northing:.4f} |")


def test_target_heights_explain_the_step_to_the_ellipsoid(result: Adjustment) -> None:
    """Azimuth to a target h above the ellipsoid: h e² cos²φ sin 2α / 2ρ (Torge & Müller 2012, from memory)."""
    lines, spatial, ellipsoid = lines_of(result), result.geometry.spatial, result.job.frame.ellipsoid  # type: ignore[attr-defined]
    latitude, height = spatial[lines.marks[:, 1], 1], spatial[lines.marks[:, 1], 2]
    turn = height * ellipsoid.eccentricity_squared * np.cos(latitude) ** 2 * np.sin(2 * lines.azimuth)
    turn = turn / (2 * ellipsoid.meridian_radius(latitude)) / ARCSEC
    assert turn[1] - turn[0] == pytest.approx(-0.04, rel=0, abs=0.005)

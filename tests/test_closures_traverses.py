"""Traverses: published compass-rule examples to their printed digits, and a published link traverse's misclosures."""

from __future__ import annotations

import re
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from adjust.job import Job
from adjust.network.closures import Check, check_job
from adjust.network.closures.compass_rule import BalancedTraverse, compass_rule, legs
from adjust.network.closures.traverse import Traverse
from adjust.units import ARCSEC, INTERNATIONAL_FOOT, parse_dms
from tests.building import build_job
from tests.published import published

EXAMPLES = published("traverses.json")
PRINTED = 0.00051
"""Feet: the last digit of sources that print three decimals."""
ROUNDED_THROUGH = 0.011
"""Feet: the first example carries 0.01 ft through every step."""


def azimuth_of(text: str) -> float:
    """Radians of a bearing such as S75-25E, or of an azimuth."""
    found = re.fullmatch(r"([NS])([\d-]+)([EW])", text)
    degrees = [float(part) for part in (found[2] if found else text).split("-")]
    angle = sum(part / 60**place for place, part in enumerate(degrees))
    if found:
        angle = {"NE": angle, "SE": 180 - angle, "SW": 180 + angle, "NW": 360 - angle}[found[1] + found[3]]
    return float(np.radians(angle))


def courses(name: str) -> tuple[np.ndarray, np.ndarray]:
    """Azimuths and lengths in feet."""
    rows = EXAMPLES[name]["inputs"]["courses"]
    return np.array([azimuth_of(row[1]) for row in rows]), np.array([float(row[2]) for row in rows])


def balanced(name: str, arrival: tuple[float, float] = (0.0, 0.0)) -> BalancedTraverse:
    azimuth, length = courses(name)
    return compass_rule(legs(azimuth, length), length, np.array(arrival))


def columns(steps: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Latitudes and departures."""
    return steps[:, 1], steps[:, 0]


def test_closed_loop_of_five_courses() -> None:
    """Purdue University, ASM 215, traverse calculations."""
    expected = EXAMPLES["T01-PURDUE"]["published_outputs"]
    result = balanced("T01-PURDUE")
    for figures, printed in (
        (columns(result.steps - result.corrections), ("lat", "dep")),
        (columns(result.corrections), ("corr_lat", "corr_dep")),
        (columns(result.steps), ("balanced_lat", "balanced_dep")),
    ):
        for values, key in zip(figures, printed, strict=True):
            assert_allclose(values, expected[key], rtol=0, atol=ROUNDED_THROUGH)  # ft
    assert_allclose(result.misclosure, [0.53, -0.71], rtol=0, atol=ROUNDED_THROUGH)  # ft
    assert result.length == pytest.approx(expected["perimeter"], abs=1e-9)  # ft: a plain sum
    assert result.linear == pytest.approx(expected["linear"], abs=ROUNDED_THROUGH)  # ft
    # the printed 1/2771 is the perimeter over the printed 0.89; unrounded the misclosure is 0.883 and the ratio 1/2792
    assert round(expected["perimeter"] / 0.89) == 2771
    assert result.precision == pytest.approx(EXAMPLES["T01-PURDUE"]["recomputed_outputs"]["ratio"], abs=0.06)


def test_link_between_two_points() -> None:
    """Mahun, Traverse Computations, chapters H and I. One page prints the latitude misclosure as 0.555: 2713.835 −
    2713.780 = 0.055 is right."""
    example = EXAMPLES["T03-MAHUN-LINK"]
    fixed, expected = example["inputs"]["fixed"], example["published_outputs"]
    arrival = (fixed["T"]["E"] - fixed["Q"]["E"], fixed["T"]["N"] - fixed["Q"]["N"])
    result = balanced("T03-MAHUN-LINK", arrival)
    assert_allclose(result.misclosure, [-0.070, 0.055], rtol=0, atol=0.0011)  # ft: a difference of two rounded figures
    assert result.length == pytest.approx(expected["perimeter"], abs=1e-9)  # ft: a plain sum
    latitudes, departures = columns(result.steps)
    # hand rounding carries one unit of the last digit into the balanced figures
    assert_allclose(latitudes, expected["adj_lat"], rtol=0, atol=2 * PRINTED)  # ft
    assert_allclose(departures, expected["adj_dep"], rtol=0, atol=2 * PRINTED)  # ft


def test_closed_loop_to_every_printed_digit() -> None:
    """Mahun, self study problem 2: components, lengths and azimuths after balancing."""
    expected = EXAMPLES["T05-MAHUN-SS2"]["published_outputs"]
    result = balanced("T05-MAHUN-SS2")
    for values, key in zip(columns(result.steps - result.corrections), ("lat", "dep"), strict=True):
        assert_allclose(values, expected[key], rtol=0, atol=PRINTED)  # ft
    for values, key in zip(columns(result.steps), ("adj_lat", "adj_dep"), strict=True):
        assert_allclose(values, expected[key], rtol=0, atol=PRINTED)  # ft
    assert_allclose(np.hypot(*result.steps.T), expected["adj_len"], rtol=0, atol=PRINTED)  # ft
    azimuths = np.degrees(np.arctan2(*result.steps.T)) % 360
    printed = [parse_dms(text) for text in expected["adj_azimuth"]]
    assert_allclose(azimuths, printed, rtol=0, atol=0.06 / 3600)  # degrees: printed to 0.1″
    # 0.157 and 1/15200 come from misclosures rounded to 0.001 ft; unrounded 0.1577 and 1/15146
    assert np.hypot(-0.115, 0.107) == pytest.approx(expected["linear"], abs=PRINTED)  # ft
    assert result.precision == pytest.approx(15146.2, abs=0.06)


def job_of(name: str, marks: dict[str, tuple[float, float] | None], order: str, fixed: str) -> Job:
    """The traverse as observed azimuths and distances, metres."""
    azimuth, length = courses(name)
    sides = list(pairwise(order))
    return build_job(
        marks,
        fixed_plan=fixed,
        azimuths=[(*side, angle) for side, angle in zip(sides, azimuth.tolist(), strict=True)],
        horizontals=[(*side, feet * INTERNATIONAL_FOOT) for side, feet in zip(sides, length.tolist(), strict=True)],
    )


def only_traverse(check: Check) -> Traverse:
    (traverse,) = check.traverses
    return traverse


def test_a_loop_is_found_in_a_job() -> None:
    start = tuple(EXAMPLES["T01-PURDUE"]["inputs"]["start"]["A"][key] * INTERNATIONAL_FOOT for key in "EN")
    job = job_of("T01-PURDUE", {"A": start, **dict.fromkeys("BCDE")}, "ABCDEA", "A")
    traverse = only_traverse(check_job(job))
    printed = EXAMPLES["T01-PURDUE"]["published_outputs"]["coords_NE"]
    assert traverse.positions is not None
    found = {
        job.marks.names[mark]: position for mark, position in zip(traverse.marks[1:-1], traverse.positions, strict=True)
    }
    assert sorted(found) == list("BCDE")
    for name, position in found.items():
        north, east = (position[1] / INTERNATIONAL_FOOT, position[0] / INTERNATIONAL_FOOT)
        assert_allclose([north, east], printed[name], rtol=0, atol=ROUNDED_THROUGH)  # ft


def test_a_link_is_found_in_a_job() -> None:
    example = EXAMPLES["T03-MAHUN-LINK"]
    ends = {
        name: (at["E"] * INTERNATIONAL_FOOT, at["N"] * INTERNATIONAL_FOOT)
        for name, at in example["inputs"]["fixed"].items()
    }
    job = job_of("T03-MAHUN-LINK", {"Q": ends["Q"], "R": None, "S": None, "T": ends["T"]}, "QRST", "QT")
    traverse = only_traverse(check_job(job))
    assert_allclose(traverse.misclosure / INTERNATIONAL_FOOT, [-0.070, 0.055], rtol=0, atol=0.0011)  # ft
    assert traverse.positions is not None
    feet = traverse.positions[:, [1, 0]] / INTERNATIONAL_FOOT
    # starting point plus the printed balanced components
    printed = np.array([[2600.48, 1391.67]]) + np.cumsum(
        np.column_stack([example["published_outputs"]["adj_lat"], example["published_outputs"]["adj_dep"]]), axis=0
    )
    assert_allclose(feet, printed[:2], rtol=0, atol=3 * PRINTED)  # ft: sums of rounded figures


def link_traverse() -> tuple[Job, dict[str, Any]]:
    """Wuhan University exercise 5.5.54 as five angles and four distances between two oriented control points."""
    example = EXAMPLES["P01-W554"]
    network = example["inputs"]["equivalent_coordinate_network"]
    control = {name: (east, north) for name, (north, east) in network["fixed"].items()}
    job = build_job(
        {**control, "T2": None, "T3": None, "T4": None},
        fixed_plan=list(control),
        angles=[
            (row["at"], row["from"], row["to"], np.radians(parse_dms(row["value"]))) for row in network["angles_dms"]
        ],
        horizontals=[(row["from"], row["to"], row["value"]) for row in network["distances_m"]],
    )
    return job, example


def test_angular_misclosure_of_a_link() -> None:
    job, example = link_traverse()
    (link,) = [judged.closures for judged in check_job(job).closures if judged.closures.check == "azimuth_link"]
    # conditions A v + w = 0: w is observed minus due; printed to 0.1″
    assert_allclose(link.misclosure / ARCSEC, [[example["inputs"]["published"]["w"][0]]], rtol=0, atol=0.051)
    assert link.angles.tolist() == [5]
    assert [job.marks.names[mark] for mark in link.marks[0]] in (
        ["A", "B", "T2", "T3", "T4", "C", "D"],
        ["D", "C", "T4", "T3", "T2", "B", "A"],
    )


def test_linear_misclosure_of_a_link() -> None:
    """The published conditions are those of the angles as observed, before any is balanced."""
    job, example = link_traverse()
    traverse = only_traverse(check_job(job))
    closing = traverse.unbalanced.sum(axis=0) - traverse.arrival
    _, north, east = example["inputs"]["published"]["w"]
    walked_on = 1.0 if job.marks.names[traverse.marks[0]] == "B" else -1.0
    # mm: the network was rebuilt from coefficients printed with four digits
    assert_allclose(walked_on * 1000 * closing, [east, north], rtol=0, atol=0.02)


def test_balancing_shares_the_angular_misclosure_equally() -> None:
    job, example = link_traverse()
    traverse = only_traverse(check_job(job))
    angular = -example["inputs"]["published"]["w"][0] * ARCSEC
    turned = np.arctan2(*traverse.steps.T) - np.arctan2(*traverse.unbalanced.T)
    # rad: each leg has taken one more fifth than the one before it
    assert_allclose(np.abs(turned), angular / 5 * np.arange(1, 5), rtol=0, atol=0.02 * ARCSEC)

"""Weight functions against statsmodels and their published efficiency; a start that gross errors do not spoil."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from scipy.special import ndtri
from statsmodels.robust.norms import HuberT, TukeyBiweight

from adjust import Job, adjust, read_job
from adjust.network import Start, find_start
from adjust.network.assembly import Assembly
from adjust.robust import BIWEIGHT, HUBER, MEDIAN_TO_SD, biweight, huber, robust_start
from adjust.simulate import NETWORKS, Blunder, Truth, observe
from adjust.unknowns import find_unknowns

ENTRIES = {e["id"]: e for e in json.loads((Path(__file__).parent / "data" / "statistics.json").read_text("utf-8"))}
R = np.concatenate([np.linspace(0.0, 12.0, 241), [100.0, 1e6, 1e12]])


def test_huber_weights_are_those_of_statsmodels() -> None:
    np.testing.assert_allclose(huber(R), HuberT(HUBER).weights(R), rtol=1e-14)


def test_biweight_weights_are_those_of_statsmodels() -> None:
    np.testing.assert_allclose(biweight(R), TukeyBiweight(BIWEIGHT).weights(R), rtol=0, atol=1e-14)


def efficiency(weight: object) -> float:
    """(E ψ')² / E ψ² on standard normal errors, ψ(r) = r · weight(r) (Huber 1981, from memory)."""
    step = 1e-4
    r = np.arange(step / 2, 10.0, step)
    density = np.exp(-(r**2) / 2) / np.sqrt(2 * np.pi)
    psi = r * weight(r)  # type: ignore[operator]
    slope = np.sum(r * psi * density) * 2 * step  # E ψ' = E rψ, by parts
    return float(slope**2 / (np.sum(psi**2 * density) * 2 * step))


def test_constants_have_the_published_efficiency() -> None:
    check = ENTRIES["F04"]["check"]
    assert check["inputs"]["c"] == HUBER
    assert efficiency(huber) == pytest.approx(float(check["output"]["efficiency"]), rel=0, abs=5e-5)
    # Beaton & Tukey's 4.685 is printed beside 95 % (Holland & Welsch 1977, table 1; from memory).
    assert efficiency(biweight) == pytest.approx(0.95, rel=0, abs=5e-5)


@pytest.mark.parametrize(("constant", "printed"), [(1.5, 0.9642), (2.0, 0.9897)])
def test_other_constants_of_hubers(constant: float, printed: float) -> None:
    """Entry F04, `recomputed`: what tells the formula for the efficiency from the constant."""
    ours = efficiency(lambda r: np.minimum(1.0, constant / r))
    assert ours == pytest.approx(printed, rel=0, abs=5e-5)


def test_median_to_sd_is_that_of_the_normal_distribution() -> None:
    assert pytest.approx(1 / ndtri(0.75), rel=0, abs=5e-5) == MEDIAN_TO_SD


def spoilt(shape: str, share: float, seed: int = 11) -> tuple[Job, Truth]:
    """A job in which a share of the observations is off by up to the whole reading."""
    plan = NETWORKS[shape](np.random.default_rng(seed))
    clean, _ = observe(plan, np.random.default_rng([seed, 1]))
    generator = np.random.default_rng([seed, 2])
    rows = [(kind, row) for kind in clean.observations if kind.kind != "control" for row in range(len(kind))]
    chosen = generator.choice(len(rows), max(1, round(share * len(rows))), replace=False)
    blunders = [
        Blunder(kind.provenance.label(row), float(generator.uniform(-1, 1) * kind.observed[row, 0]))
        for kind, row in (rows[place] for place in chosen)
    ]
    return observe(plan, np.random.default_rng([seed, 1]), blunders)


def begun(job: Job) -> Start:
    unknowns = find_unknowns(job)
    return robust_start(job, unknowns, find_start(job, unknowns))


def off(job: Job, start: Start, truth: Truth) -> float:
    """The longest way, metres, along one axis from the truth."""
    return float(np.nanmax(np.abs(job.frame.displacement(truth.coordinates, start.geometry.coordinates))))


@pytest.mark.parametrize("shape", ["levelling", "triangulation", "total station, plane", "GNSS"])
def test_gross_errors_do_not_spoil_the_start(shape: str) -> None:
    job, truth = spoilt(shape, 0.05)
    assert off(job, begun(job), truth) < 0.05


@pytest.mark.parametrize("shape", ["levelling", "traverses", "GNSS", "mixed"])
def test_without_gross_errors_it_is_near_the_adjustment(shape: str) -> None:
    """95 % efficient: within a fraction of the sds of coordinates of some millimetres."""
    plan = NETWORKS[shape](np.random.default_rng(3))
    job, truth = observe(plan, np.random.default_rng(4))
    result, start = adjust(job), begun(job)
    away = np.abs(job.frame.displacement(result.coordinates, start.geometry.coordinates))
    assert np.nanmax(away) < 0.3 * np.nanmax(np.abs(result.standard_deviations)) + 1e-3  # it stands still at 1 mm
    assert off(job, start, truth) < 0.1


def test_a_start_is_the_same_every_time() -> None:
    job, _ = spoilt("total station, plane", 0.1)
    one, other = begun(job), begun(job)
    np.testing.assert_array_equal(one.geometry.coordinates, other.geometry.coordinates)
    np.testing.assert_array_equal(one.orientations, other.orientations)


def test_the_adjustment_settles_with_gross_errors_in_it() -> None:
    shapes = ("levelling", "triangulation", "total station, plane", "GNSS")
    jobs = [spoilt(shape, 0.05, seed)[0] for shape in shapes for seed in (21, 22)]
    assert all(adjust(job).solution.converged for job in jobs)


def test_other_starts_search_for_no_marks(monkeypatch: pytest.MonkeyPatch) -> None:
    """Control with its axes exchanged: searching for marks in every trial would take minutes."""
    job = read_job(Path(__file__).parents[1] / "field_data" / "town_traverse")
    given = job.marks.given.copy()
    first = job.marks.names.index("K101")
    given[first, :2] = given[first, 1::-1]
    job = replace(job, marks=replace(job.marks, given=given))
    unknowns = find_unknowns(job)
    start = find_start(job, unknowns)
    monkeypatch.setattr(Assembly, "_search", lambda self: pytest.fail("searches"))
    robust_start(job, unknowns, start)

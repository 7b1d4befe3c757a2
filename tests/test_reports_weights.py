"""What the reports say of the sds: variance components in the listing, in results.json and on the page."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from adjust import Adjustment, adjust
from adjust.blunders import find_blunders
from adjust.reports import write_reports
from adjust.reports.listing import listing
from adjust.reports.results import write_results
from adjust.reports.weights import component_section, component_sentences, components_of
from adjust.simulate import levelling_net, observe, triangulation_grid
from adjust.variance_components import VarianceComponent, variance_components
from tests.planted_variances import claimed, struck


@pytest.fixture(scope="module")
def adjustment() -> Adjustment:
    """Directions twice as bad as stated."""
    generator = np.random.default_rng(3)
    job, _ = observe(triangulation_grid(generator), generator)
    return adjust(claimed(job, {"direction": 2.0}))


@pytest.fixture(scope="module")
def components(adjustment: Adjustment) -> tuple[VarianceComponent, ...]:
    return variance_components(adjustment)


def test_the_listing_has_every_group_and_what_is_remarkable(
    adjustment: Adjustment, components: tuple[VarianceComponent, ...]
) -> None:
    lines = listing(adjustment, components=components)
    start = lines.index("Weights")
    section = lines[start : lines.index("", start)]
    for component in components:
        row = next(line for line in section if line.startswith(component.name))
        assert f"{component.factor:.2f}" in row.split()
    text = " ".join(section)
    assert "The directions behave as" in text
    assert "× worse than stated" in text
    assert "None of it has been applied" in text


def test_nothing_is_listed_where_nobody_asked(adjustment: Adjustment) -> None:
    assert "Weights" not in listing(adjustment)
    assert component_section(()) == []
    assert component_sentences(()) == []


def test_a_job_that_agrees_is_told_so() -> None:
    generator = np.random.default_rng(1)
    job, _ = observe(levelling_net(generator), generator)
    assert component_sentences(variance_components(adjust(job)))[0] == (
        "No group differs significantly from what was stated."
    )


def test_results_say_whether_anybody_asked(
    adjustment: Adjustment, components: tuple[VarianceComponent, ...], tmp_path: Path
) -> None:
    write_results(adjustment, (), tmp_path / "without.json")
    assert json.loads((tmp_path / "without.json").read_text("utf-8"))["variance_components"] is None
    write_results(adjustment, (), tmp_path / "with.json", components=components)
    records = json.loads((tmp_path / "with.json").read_text("utf-8"))["variance_components"]
    assert [record["name"] for record in records] == ["directions", "horizontal distances"]
    for record, component in zip(records, components, strict=True):
        for key in ("factor", "sd", "lower", "upper", "redundancy", "observations", "differs", "sentence"):
            assert record[key] == getattr(component, key), key


def test_reports_leave_out_the_blunders_that_were_found(tmp_path: Path) -> None:
    """An error of six sds: near enough to take part by itself, but the search has named it."""
    generator = np.random.default_rng(4)
    plan = levelling_net(generator)
    job, _ = observe(plan, generator)
    spoilt = adjust(struck(job, plan, "height_difference", {7: 6.0}))
    findings = find_blunders(spoilt)
    assert [blunder.sources for blunder in findings.blunders] == [("levels.csv:9",)]
    found = components_of(spoilt, findings)
    assert found is not None
    assert found[0].left_out == ("levels.csv:9",)
    write_reports(spoilt, tmp_path, findings=findings)
    listed = " ".join((tmp_path / "listing.txt").read_text("utf-8").split())
    assert "Without 1 height difference too far off: levels.csv:9." in listed
    assert "How well the sds were stated, by groups" in (tmp_path / "report.html").read_text("utf-8")

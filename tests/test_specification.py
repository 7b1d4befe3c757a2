"""[specification]: the published figures, reading them from a job, and holding marks and pairs against them."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from adjust import adjust
from adjust.quality import ellipse_factor
from adjust.reports.specification import specification_record, specified, year_of
from adjust.standards import ACCURACY_STANDARDS, Measure, Requirement, Specification
from adjust.tolerances import Rule
from tests.adjusted_networks import adjusted
from tests.job_folders import PLANE, job_of, mistakes_of

FOOT = 0.3048


def published():
    return {
        entry["id"]: entry
        for entry in json.loads((Path(__file__).parent / "data/accuracy_standards.json").read_text("utf-8"))
    }


def rules(name, measure):
    return [each.rule for each in ACCURACY_STANDARDS[name].requirements if each.measure is measure]


@pytest.mark.parametrize("year", [2021, 2026])
def test_relative_positional_precision_as_printed(year):
    """ALTA/NSPS section 3.E.v; the examples are of public commentaries and ACSM Bulletin 225."""
    check = published()["D07"]["check"]
    distances = np.array([float(text) for text in check["inputs"]["d_ft"].split(",")]) * FOOT
    printed = np.array([float(text) for text in check["output"]["allowed_ft"].split(",")])
    (rule,) = rules(f"ALTA/NSPS {year}", Measure.PAIR_PLAN)
    # ft: the standard prints 2 cm as 0.07 ft, which is 0.0656 ft, and so do the examples
    allowed = rule.allowed(distances) / FOOT - 0.02 / FOOT + 0.07
    np.testing.assert_allclose(allowed, printed, rtol=0, atol=5e-5)


def test_classes_tiers_and_orders_are_those_recorded():
    entries = published()
    classes = [name.removeprefix("FGDC 1998 ") for name in ACCURACY_STANDARDS if name.startswith("FGDC")]
    assert classes == [
        f"{n} {unit}" for unit, steps in (("mm", "125"), ("cm", "125"), ("dm", "125")) for n in steps
    ] + ["1 m", "2 m", "5 m", "10 m"]
    assert entries["D08"]["constants"]["classes"] == "1, 2, 5 mm; 1, 2, 5 cm; 1, 2, 5 dm; 1, 2, 5, 10 m"
    words = entries["D11"]["constants"]["tiers m"].split()
    for letter, metres in zip(words[::2], words[1::2], strict=True):
        assert [rule.constant for rule in rules(f"LINZ 2009 tier {letter}", Measure.MARK_PLAN)] == [float(metres)]
    for text in entries["D11"]["constants"]["orders (tier H/V; c H/V m; p H/V)"].split("; "):
        order, *figures = text.replace(":", "").split()
        plan, height = zip(*([*part.split("/"), None][:2] for part in figures), strict=True)
        _compare(f"LINZ 2009 order {order}", plan, Measure.MARK_PLAN, Measure.PAIR_PLAN)
        if height[0] is not None:
            _compare(f"LINZ 2009 order {order}", height, Measure.MARK_HEIGHT, Measure.PAIR_HEIGHT)
    for text in entries["D11"]["constants"]["height orders (tier; c; p)"].split("; "):
        order, *figures = text.replace(":", "").split()
        _compare(f"LINZ 2009 order {order}", figures, Measure.MARK_HEIGHT, Measure.PAIR_HEIGHT)


def _compare(name, figures, of_mark, of_pair):
    (tier,), (pair,) = rules(name, of_mark), rules(name, of_pair)
    constant, proportional = float(figures[1]), float(figures[2])
    assert tier.constant == float(figures[0])
    at = np.array([0.0, 1234.5])
    np.testing.assert_allclose(pair.allowed(at), np.sqrt(constant**2 + (proportional * at) ** 2), rtol=1e-14)


def test_canadian_orders_grow_from_a_fifth_of_a_kilometre():
    """r = C (d + 0.2), r in cm, d in km (formula read from print, C recalled)."""
    orders = published()["D12"]["constants"]["C (1st 2nd 3rd 4th)"].split()[:4]
    for name, factor in zip(("first", "second", "third", "fourth"), orders, strict=True):
        (rule,) = rules(f"Canada 1978 {name} order", Measure.PAIR_PLAN)
        np.testing.assert_allclose(rule.allowed(np.array([0.0, 800.0])), [0.002 * float(factor), 0.01 * float(factor)])
        assert rule.recalled


def test_every_standard_states_its_edition_or_that_it_does_not():
    for name, standard in ACCURACY_STANDARDS.items():
        year = year_of(name)
        assert year is not None or "not recorded" in standard.source
        assert name == standard.name
        assert all(requirement.rule.source == name for requirement in standard.requirements)
    assert (year_of("ALTA/NSPS 2026"), year_of("FGDC 1998 1 cm"), year_of("LINZ 2009 tier A")) == (2026, 1998, 2009)


def with_section(text):
    return PLANE | {"job.toml": f"{PLANE['job.toml']}\n[specification]\n{text}\n"}


OWN = """\
standard = "ALTA/NSPS 2026"
relative_mm = 5.0
relative_ppm = 20.0
height_mm = 3.0
marks = ["A", "B"]
pairs = "all"
"""


def test_job_file_s_figures(tmp_path):
    job = job_of(tmp_path, with_section(OWN))
    specification = job.specification
    assert specification.standards == ("ALTA/NSPS 2026",)
    assert (specification.pairs, specification.marks) == ("all", (2, 3))
    assert {
        each.measure: (each.rule.constant, each.rule.proportional, each.rule.printed) for each in specification.own
    } == {
        Measure.MARK_HEIGHT: (0.003, 0.0, "3 mm"),
        Measure.PAIR_PLAN: (0.005, pytest.approx(20e-6), "5 mm + 20 ppm of D"),
    }


@pytest.mark.parametrize(
    ("text", "column", "words"),
    [
        ('standard = "ALTA/NSPS 2025"', "specification.standard", "did you mean 'ALTA/NSPS 2021'"),
        ('standard = "my own"', "specification.standard", "docs/specifications.md lists all"),
        ('marks = ["A", "b"]', "specification.marks", "not a mark of marks.csv; did you mean 'B'?"),
        ('pairs = "some"', "specification.pairs", "expected 'observed' or 'all'"),
        ("horizontal_mm = 0.0", "specification.horizontal_mm", "expected a number of"),
        ("horisontal_mm = 1.0", "specification.horisontal_mm", "did you mean 'horizontal_mm'?"),
    ],
)
def test_mistakes_name_the_key_and_its_line(tmp_path, text, column, words):
    (mistake,) = mistakes_of(tmp_path, with_section(text))
    assert mistake.column == column
    assert mistake.line == PLANE["job.toml"].count("\n") + 3
    assert words in mistake.message


def held_against(adjustment, **changes):
    return specified(replace(adjustment, job=replace(adjustment.job, specification=Specification(**changes))))


PAIR = Requirement(Measure.PAIR_PLAN, Rule("1 mm", constant=0.001))


@pytest.mark.parametrize("name", ["total station", "free", "posterior", "gnss"])
def test_all_pairs_have_the_relative_ellipses_of_the_adjustment(name):
    adjustment = adjusted(name)
    held = held_against(adjustment, own=(PAIR,), pairs="all")
    names = adjustment.job.marks.names
    assert len(held.pairs.marks) == len(names) * (len(names) - 1) // 2
    factor = ellipse_factor(0.95, adjustment.degrees_of_freedom_used)
    for pair in range(0, len(held.pairs.marks), 7):
        first, second = held.pairs.marks[pair]
        semi_major = float(adjustment.relative_ellipse(names[first], names[second]).semi_major) * factor
        assert held.pairs.plan[pair] == pytest.approx(semi_major, rel=1e-6, abs=1e-9)  # m


def test_observed_pairs_agree_with_all_pairs():
    adjustment = adjusted("mixed")
    observed, every = (held_against(adjustment, own=(PAIR,), pairs=pairs).pairs for pairs in ("observed", "all"))
    place = {tuple(marks): row for row, marks in enumerate(every.marks.tolist())}
    rows = [place[tuple(marks)] for marks in observed.marks.tolist()]
    np.testing.assert_allclose(every.plan[rows], observed.plan, rtol=0, atol=1e-8)  # m: roots of small differences
    np.testing.assert_allclose(every.height[rows], observed.height, rtol=0, atol=1e-8)  # m


def test_what_fails_is_listed_worst_first_and_what_is_held_is_left_alone():
    adjustment = adjusted("total station")
    radii = adjustment.horizontal_95
    limit = float(np.median(radii[radii > 0]))
    held = held_against(adjustment, own=(Requirement(Measure.MARK_PLAN, Rule("a limit", constant=limit)),))
    record = specification_record(held)
    (check,) = record["checks"]
    assert check["assessed"] == np.count_nonzero(radii > 0) < len(radii)
    assert check["failing"] == np.count_nonzero(radii > limit) > 0
    assert record["passed"] is check["passed"] is False
    shares = [item["share"] for item in check["worst"]]
    assert shares == sorted(shares, reverse=True)
    assert sum(not item["passed"] for item in check["worst"]) == check["failing"]
    assert check["worst"][0]["marks"] == [adjustment.job.marks.names[int(np.argmax(radii))]]


def test_marks_that_are_named_limit_marks_and_pairs():
    adjustment = adjusted("total station")
    held = held_against(
        adjustment, own=(PAIR, Requirement(Measure.MARK_PLAN, Rule("1 m", constant=1.0))), marks=(3, 4), pairs="all"
    )
    pairs, marks = held.assessments
    assert pairs.items.size <= 1
    assert set(marks.items.tolist()) <= {3, 4}


def test_levels_have_no_plan_to_assess():
    held = held_against(adjusted("levelling"), standards=("ALTA/NSPS 2026", "FGDC 1998 5 cm"))
    by_measure = {each.requirement.measure: each.passed for each in held.assessments}
    assert by_measure == {Measure.PAIR_PLAN: None, Measure.MARK_PLAN: None, Measure.MARK_HEIGHT: True}
    assert held.passed is True


def test_no_specification_is_no_verdict():
    assert specification_record(specified(adjusted("levelling")))["passed"] is None


def test_too_many_marks_for_all_pairs_is_said(monkeypatch):
    monkeypatch.setattr("adjust.reports.specification.MOST_FOR_ALL_PAIRS", 3)
    adjustment = adjusted("total station")
    held = held_against(adjustment, own=(PAIR,), pairs="all")
    assert len(held.pairs.marks) == len(adjustment.lines)
    assert "only the observed pairs were assessed" in held.note


def test_documented_standards_are_those_known():
    page = (Path(__file__).parents[1] / "docs/specifications.md").read_text("utf-8")
    for name, standard in ACCURACY_STANDARDS.items():
        (line,) = [line for line in page.splitlines() if line.startswith(f"| `{name}` |")]
        assert all(requirement.rule.printed in line for requirement in standard.requirements)
        assert ("(recalled)" in line) == standard.recalled
        assert standard.source in page


def test_weakest_job_is_adjusted_all_the_same(tmp_path):
    assert adjust(job_of(tmp_path, with_section("horizontal_mm = 0.001"))).solution.converged

"""report.html: valid, self-contained, escaped, and every figure on it one of results.json."""

import base64
import hashlib
import json
import re
from dataclasses import replace
from pathlib import Path

import pytest

from adjust import adjust, read_job
from adjust.blunders import find_blunders
from adjust.job import Decision
from adjust.network.closures import check_job
from adjust.reports import write_reports
from adjust.reports.blunder_words import MOST_ALTERNATIVES, UNSETTLED
from adjust.reports.page import render_page
from adjust.reports.wording import ARCSECONDS, MILLIMETRES
from tests.adjusted_networks import JOBS, adjusted
from tests.job_folders import PLANE, job_of
from tests.page_parts import XHTML, at, figures_of, parsed, same, table_columns, text_of

TOWN = Path(__file__).parents[1] / "field_data/town_traverse"
HOSTILE = '<script>alert("x")</script>'
SPECIFIED = PLANE | {
    "job.toml": PLANE["job.toml"]
    + '\n[specification]\nstandard = ["ALTA/NSPS 2026", "LINZ 2009 order 3", "FGDC 1998 1 cm"]\nhorizontal_mm = 0.5\n'
}


HOSTILE_NAMES = {"001": HOSTILE, "B": "B;|~^&amp;'"}


def hostile_job(folder):
    """The plane job with names and a title that try to be something else than text."""

    def renamed(line):
        cells = [HOSTILE_NAMES.get(cell, cell) for cell in line.split(",")]
        return ",".join(
            '"' + cell.replace('"', '""') + '"' if cell in HOSTILE_NAMES.values() else cell for cell in cells
        )

    tables = {
        name: text if name == "job.toml" else "\n".join(map(renamed, text.split("\n"))) for name, text in PLANE.items()
    }
    tables["job.toml"] = PLANE["job.toml"].replace("Plane test job", HOSTILE_TITLE)
    return job_of(folder, tables)


HOSTILE_TITLE = "</title></style></script><img src=x onerror=1> \\\\ “job”"


@pytest.fixture(scope="module", params=[*JOBS, "specified"])
def written(request, tmp_path_factory):
    """The page's text and tree, and results.json, written in one run."""
    folder = tmp_path_factory.mktemp("page")
    if request.param == "specified":
        job = job_of(folder / "job", SPECIFIED)
        adjustment, check = adjust(job), check_job(job)
    else:
        adjustment, check = adjusted(request.param), check_job(adjusted(request.param).job)
    write_reports(adjustment, folder, check=check, findings=find_blunders(adjustment))
    page = (folder / "report.html").read_text("utf-8")
    return page, parsed(page), json.loads((folder / "results.json").read_text("utf-8"))


def test_page_is_valid_html(written):
    assert written[0].startswith("<!doctype html>")
    ids = [node.get("id") for node in written[1].iter() if node.get("id")]
    assert len(ids) == len(set(ids))


def test_page_loads_and_sends_nothing(written):
    page, tree, _ = written
    loading = {"src", "srcset", "action", "formaction", "poster", "background", "data", "style"}
    for node in tree.iter():
        attributes = {str(name).rpartition("}")[2] for name in node.attrib}
        assert not attributes & loading
        assert not any(name.startswith("on") for name in attributes)
        assert node.get("href") is None or node.get("href").startswith("#")
    assert not {"link", "iframe", "object", "embed", "img", "form"} & {
        str(node.tag).removeprefix(XHTML) for node in tree.iter()
    }
    assert "url(" not in page
    assert "@import" not in page


def test_policy_allows_only_the_page_s_own_style_and_script(written):
    tree = written[1]
    (policy,) = [node.get("content") for node in tree.iter(f"{XHTML}meta") if node.get("http-equiv")]
    scripts = [node for node in tree.iter(f"{XHTML}script") if node.get("type") != "application/json"]
    assert len(scripts) == len(list(tree.iter(f"{XHTML}style"))) == 1
    for name, node in (("script-src", scripts[0]), ("style-src", next(tree.iter(f"{XHTML}style")))):
        digest = base64.b64encode(hashlib.sha256(text_of(node).encode()).digest()).decode()
        assert f"{name} 'sha256-{digest}'" in policy
    assert "default-src 'none'" in policy


def test_marks_on_the_page_are_those_of_the_results(written):
    _, tree, results = written
    columns, marks = table_columns(figures_of(tree), "marks")
    records = {record["mark"]: record for record in results["marks"]}
    assert sorted(name for (name,) in marks) == sorted(records)
    compared = 0
    for key, cells in columns.items():
        for (name,), cell in zip(marks, cells, strict=True):
            value = at(records[name], key)
            assert cell == value if isinstance(value, str) else same(cell, value), (name, key, cell, value)
            compared += 1
    assert compared >= 5 * len(records)


def test_observations_on_the_page_are_those_of_the_results(written):
    _, tree, results = written
    columns, marks = table_columns(figures_of(tree), "observations")
    listed = sorted(zip(columns["source"], columns["kind"], range(len(marks)), strict=True))
    records = sorted(results["observations"], key=lambda record: (record["source"], _word(record)))
    nothing = [""] * len(records)  # a column that is empty in every row is not on the page
    assert len(listed) == len(records)
    for (source, word, row), record in zip(listed, records, strict=True):
        assert (source, word) == (record["source"], _word(record))
        assert marks[row] == tuple(record[role] for role in ("at", "from", "to") if record[role] is not None)
        scale = MILLIMETRES if record["unit"] == "m" else ARCSECONDS
        for key in ("residual", "sd", "minimal_detectable_bias"):
            value = record[key]
            assert same(columns.get(key, nothing)[row], None if value is None else value * scale), (source, key)
        for key in ("observed", "adjusted", "redundancy", "tau" if "tau" in columns else "w"):
            assert same(columns.get(key, nothing)[row], record[key]), (source, key, record[key])


def _word(record):
    from adjust.observations import KIND_NAMES
    from adjust.reports.wording import what

    return what(record) if record["component"] else KIND_NAMES[record["kind"]][0]


def test_lines_on_the_page_are_those_of_the_results(written):
    _, tree, results = written
    columns, marks = table_columns(figures_of(tree), "relative")
    records = {(record["from"], record["to"]): record for record in results["relative"]}
    assert sorted(marks) == sorted(records)
    for key, cells in columns.items():
        for pair, cell in zip(marks, cells, strict=True):
            record = records[pair]
            if key == "ppm":
                major, distance = record["ellipse"]["semi_major_mm"], record["distance_m"]
                value = 1000 * major / distance if distance and major is not None else None
            else:
                value = at(record, key)
            assert same(cell, value), (pair, key, cell, value)


def test_every_other_figure_is_one_of_the_results(written):
    _, tree, results = written
    keyed = [node for node in tree.iter(f"{XHTML}data") if node.get("data-key") not in ("w", "tau")]
    assert {"solution.degrees_of_freedom", "len(suspects)"} <= {node.get("data-key") for node in keyed}
    for node in keyed:
        key, value = node.get("data-key"), float(node.get("value"))
        scale = _scale(results, key)
        assert value == pytest.approx(at(results, key) * scale, rel=1e-12), key
        assert same(text_of(node).split()[0], value), key


def _scale(results, key):
    blunder = re.fullmatch(r"blunders\[(\d+)\]\.(estimated_error|sd)(\.\w+)?", key)
    if blunder:
        return {"m": MILLIMETRES, "deg": ARCSECONDS, "1": 1e6}[results["blunders"][int(blunder[1])]["unit"]]
    weight = re.fullmatch(r"weights\[(\d+)\]\.sd_(smallest|median|largest)", key)
    if not weight:
        return 1
    return MILLIMETRES if results["weights"][int(weight[1])]["unit"] == "m" else ARCSECONDS


def test_every_blunder_of_the_results_is_on_the_page(written):
    _, tree, results = written
    keys = {node.get("data-key") for node in tree.iter(f"{XHTML}data")}
    section = next(node for node in tree.iter(f"{XHTML}section") if node.get("id") == "suspects")
    words = " ".join(text_of(section).split())
    for place, blunder in enumerate(results["blunders"]):
        several = blunder["estimated_error"] if isinstance(blunder["estimated_error"], dict) else {"": None}
        for name in several:
            part = f".{name}" if name else ""
            assert {f"blunders[{place}].estimated_error{part}", f"blunders[{place}].sd{part}"} <= keys
        assert {f"blunders[{place}].test", f"blunders[{place}].critical"} <= keys
        said = [blunder["source"] or blunder["group"], blunder["advice"], *blunder["alternatives"][:MOST_ALTERNATIVES]]
        said += [cell[key] for cell in blunder["written"] for key in ("text", "expected") if cell[key]]
        said += [explanation["mistake"][1:] for explanation in blunder["explanations"]]
        assert all(text in words for text in said), (said, words)


def test_rows_in_the_page_are_the_first_of_its_data(written):
    _, tree, _ = written
    figures = figures_of(tree)
    for table in tree.iter(f"{XHTML}table"):
        if table.get("data-table"):
            columns, marks = table_columns(figures, table.get("data-table"))
            rows = list(next(table.iter(f"{XHTML}tbody")).iter(f"{XHTML}tr"))
            assert len(rows) == min(len(marks), 200) if len(marks) <= 200 else 100
            for number, row in enumerate(rows):
                assert [text_of(cell) for cell in row][1:] == [cells[number] for cells in columns.values()]


def test_order_of_the_sections(written):
    titles = [text_of(node) for node in written[1].iter(f"{XHTML}h2")]
    wanted = [
        *(
            "Suspects",
            "Coordinates",
            "Observations",
            "Relative accuracy and specification",
            "Closures before the adjustment",
        ),
        *("Weights", "Numerical health", "Cautions", "Certification"),
    ]
    assert titles[0] in ("Map", "Schematic")
    assert [title for title in titles if title in wanted] == wanted


def test_hostile_names_stay_text(tmp_path):
    adjustment = adjust(hostile_job(tmp_path))
    page = render_page(adjustment)
    tree = parsed(page)
    assert HOSTILE not in page
    assert HOSTILE in figures_of(tree)["names"]
    assert any(text_of(node) == HOSTILE for node in tree.iter(f"{XHTML}th"))
    assert set(HOSTILE_NAMES.values()) <= set(figures_of(tree)["names"])
    assert len(list(tree.iter(f"{XHTML}script"))) == 2
    assert text_of(next(tree.iter(f"{XHTML}h1"))) == adjustment.job.title
    assert not list(tree.iter(f"{XHTML}img"))


@pytest.fixture(scope="module")
def searched():
    """The street traverse, which holds two blunders, and what the search for them finds."""
    adjustment = adjust(read_job(TOWN))
    findings = find_blunders(adjustment, TOWN)
    assert findings.blunders
    return adjustment, findings


def test_blunders_are_shown_with_their_explanations(searched):
    adjustment, findings = searched
    tree = parsed(render_page(adjustment, findings=findings))
    section = next(node for node in tree.iter(f"{XHTML}section") if node.get("id") == "suspects")
    words = " ".join(text_of(section).split())
    for blunder in findings.blunders:
        assert blunder.name in words
        assert f"test {blunder.test:.2f}, critical {blunder.critical:.2f}" in words
        for explanation in blunder.explanations:
            assert explanation.mistake[1:] in words
        for alternative in blunder.alternatives[:MOST_ALTERNATIVES]:
            assert alternative.name in words
    shown = len([node for node in section.iter(f"{XHTML}li") if node.get("data-source")])
    assert shown == sum(int(table.suspect.sum()) for table in adjustment.residuals)


def test_a_search_that_finds_nothing_says_so():
    adjustment = adjusted("levelling")
    assert "The search for blunders found none." in render_page(adjustment, findings=find_blunders(adjustment))
    assert "The search for blunders" not in render_page(adjustment)


def test_a_search_that_did_not_come_to_rest_says_so(searched):
    adjustment, findings = searched
    assert UNSETTLED not in render_page(adjustment, findings=findings)
    assert UNSETTLED in render_page(adjustment, findings=replace(findings, settled=False))


def test_decisions_are_on_the_page(searched):
    adjustment, _ = searched
    decision = Decision("distances.csv:13", "correct", "horizontal_m", "168.561", "168.651", HOSTILE)
    decided = replace(adjustment, job=replace(adjustment.job, decisions=(decision,)))
    page = render_page(decided)
    tree = parsed(page)
    assert HOSTILE not in page
    said = [text_of(node) for node in tree.iter(f"{XHTML}li")]
    assert f"distances.csv:13: horizontal_m 168.561 corrected to 168.651. Reason: {HOSTILE}." in said
    assert "Decisions on the field book" not in render_page(adjustment)


def test_same_job_gives_the_same_bytes(tmp_path):
    pages = [render_page(adjust(job_of(tmp_path / str(run), SPECIFIED))) for run in range(2)]
    assert pages[0] == pages[1]


def test_long_tables_say_what_is_not_in_the_page(monkeypatch):
    monkeypatch.setattr("adjust.reports.page.observations.MOST_ROWS", 10)
    adjustment = adjusted("mixed")
    page = re.sub(r"\s+", " ", render_page(adjustment))
    left = adjustment.solution.observations - 10
    assert f"{left:,} more rows are not in this page; residuals.csv has them all." in page


def test_unmet_specification_is_said_first(tmp_path):
    job = job_of(tmp_path, SPECIFIED)
    opening = text_of(
        next(node for node in parsed(render_page(adjust(job))).iter() if "verdict" in (node.get("class") or ""))
    )
    assert "The network does not meet" in opening
    assert "the job's own figures" in opening
    sound = replace(job, specification=replace(job.specification, standards=("FGDC 1998 10 m",), own=()))
    assert "The network meets FGDC 1998 10 m." in render_page(adjust(sound))

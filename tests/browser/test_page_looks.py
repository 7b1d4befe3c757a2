"""Dark and light, narrow and wide, printed; and what axe-core says of accessibility."""

from pathlib import Path

import pytest
from pypdf import PdfReader

AXE = Path(__file__).parents[1] / "data/axe/axe.min.js"
"""axe-core 4.14.1 (Deque Systems, Mozilla Public License 2.0), as the npm package carries it; used in tests only."""
JOBS = ["town_traverse", "dam_control", "fen_levels", "specified"]


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("name", JOBS)
def test_axe_finds_no_violation(chromium, page_file, name, scheme):
    # The page's policy forbids scripts of others, which axe is.
    context = chromium.new_context(color_scheme=scheme, bypass_csp=True)
    page = context.new_page()
    page.goto(page_file(name).as_uri())
    page.locator('table[data-table="marks"] button.pick').first.click()
    page.evaluate(AXE.read_text("utf-8"))
    found = page.evaluate("axe.run()")
    context.close()
    assert [(each["id"], [node["html"] for node in each["nodes"]]) for each in found["violations"]] == []
    assert len(found["passes"]) > 30


def ground(found):
    return [
        int(part) for part in found.page.evaluate("getComputedStyle(document.body).backgroundColor")[4:-1].split(",")
    ]


def test_dark_and_light(opened):
    assert min(ground(opened("town_traverse", color_scheme="light"))) > 230
    assert max(ground(opened("town_traverse", color_scheme="dark"))) < 50


@pytest.mark.parametrize("width", [320, 768, 1440, 3840])
def test_page_fits_every_width(opened, width):
    found = opened("specified", viewport={"width": width, "height": 900})
    assert found.page.evaluate("document.documentElement.scrollWidth") <= width
    box = found.page.locator("#map").bounding_box()
    assert box["x"] >= 0
    assert box["x"] + box["width"] <= width
    size = found.page.locator("[data-labels] text").first.evaluate("each => each.getBoundingClientRect().height")
    assert size >= 11  # px: a label stays readable


def test_targets_are_large_enough_to_touch(opened):
    """24 by 24 px: WCAG 2.2, success criterion 2.5.8; names in rows of tables are exempt as text in a line."""
    found = opened("specified", viewport={"width": 320, "height": 900})
    for box in found.page.locator(".map-tools button, .table-tools button, .table-tools select").all():
        size = box.bounding_box()
        assert size["height"] >= 24
        assert size["width"] >= 24


@pytest.mark.parametrize("name", ["dam_control", "specified"])
def test_every_printed_sheet_has_its_head(opened, tmp_path, name):
    found = opened(name)
    title, rows = found.text("h1"), found.page.locator("table[data-table] tbody tr").count()
    path = tmp_path / "report.pdf"
    found.page.pdf(path=str(path), prefer_css_page_size=True, print_background=True)
    sheets = [" ".join(sheet.extract_text().split()) for sheet in PdfReader(path).pages]
    assert len(sheets) >= 2
    for number, sheet in enumerate(sheets, 1):
        assert title in sheet
        assert f"sheet {number} of {len(sheets)}" in sheet
        assert "not certified unless signed and sealed" in sheet
    together = " ".join(sheets)
    assert "Signature and seal" in together
    assert "Worst first" not in together
    assert rows > 0
    for mark in found.page.locator('table[data-table="marks"] tbody th').all_inner_texts():
        assert mark in together


def test_table_heads_are_repeated_on_every_sheet(opened, tmp_path):
    found = opened("dam_control")
    path = tmp_path / "report.pdf"
    found.page.pdf(path=str(path), prefer_css_page_size=True)
    texts = [sheet.extract_text() for sheet in PdfReader(path).pages]
    with_sources = [text for text in texts if "directions.csv:" in text]
    assert len(with_sources) >= 2
    assert all("least bias" in text for text in with_sources)


def test_a_printed_job_title_cannot_leave_its_string(opened, tmp_path):
    from adjust import adjust
    from adjust.reports.page import write_page
    from tests.test_page import HOSTILE_TITLE, hostile_job

    path = tmp_path / "report.html"
    write_page(adjust(hostile_job(tmp_path / "job")), path)
    found = opened("hostile", file=path)
    found.page.pdf(path=str(tmp_path / "report.pdf"), prefer_css_page_size=True)
    head = " ".join(PdfReader(tmp_path / "report.pdf").pages[0].extract_text().split())
    assert "<img src=x onerror=1>" in head
    assert found.page.locator("img").count() == 0
    assert HOSTILE_TITLE.startswith("</title>")

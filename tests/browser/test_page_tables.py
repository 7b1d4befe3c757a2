"""Tables: sorting, filter, search, leaves, worst first, copying; hostile text stays text."""

import numpy as np
import pytest

from adjust import adjust
from adjust.reports.page import write_page
from adjust.simulate import observe, triangulation_grid
from tests.test_page import HOSTILE, hostile_job


def column(found, table, place):
    return found.page.locator(f'table[data-table="{table}"] tbody tr > :nth-child({place})').all_inner_texts()


def head(found, table, words):
    return found.page.locator(f'table[data-table="{table}"] thead button', has_text=words).first


def test_sorting_up_and_down_and_worst_first(opened):
    found = opened("town_traverse")
    before = column(found, "observations", 1)
    head(found, "observations", "residual").click()
    cells = [float(cell) for cell in column(found, "observations", 4)]
    assert cells == sorted(cells)
    sorted_head = found.page.locator('table[data-table="observations"] thead th[aria-sort]')
    assert sorted_head.get_attribute("aria-sort") == "ascending"
    head(found, "observations", "residual").click()
    cells = [float(cell) for cell in column(found, "observations", 4)]
    assert cells == sorted(cells, reverse=True)
    assert sorted_head.get_attribute("aria-sort") == "descending"
    found.page.locator('[data-tools="observations"] [data-worst]').click()
    assert column(found, "observations", 1) == before
    assert sorted_head.count() == 0


def test_sorting_knows_sources_angles_and_names(opened):
    found = opened("town_traverse")
    head(found, "observations", "source").click()
    lines = [(cell.split(":")[0], int(cell.split(":")[1])) for cell in column(found, "observations", 11)]
    assert [line for file, line in lines if file == lines[0][0]] == sorted(
        line for file, line in lines if file == lines[0][0]
    )
    head(found, "marks", "mark").click()
    names = [name.split()[0] for name in column(found, "marks", 1)]
    assert names == sorted(names)


def test_search_filter_and_suspects_only(opened):
    found = opened("town_traverse")
    tools = found.page.locator('[data-tools="observations"]')
    tools.locator("[data-search]").fill("k117")
    assert all("K117" in row for row in column(found, "observations", 1))
    assert "of 51 rows" in found.text('[data-leaves="observations"]')
    tools.locator("[data-search]").fill("")
    tools.locator("select").select_option(label="direction")
    assert set(column(found, "observations", 2)) == {"direction"}
    tools.locator("[data-flagged]").check()
    assert found.page.locator('table[data-table="observations"] tbody tr:not(.flagged)').count() == 0
    assert len(column(found, "observations", 1)) > 0
    tools.locator("[data-search]").fill("no such thing")
    assert column(found, "observations", 1) == []


def test_copy_as_tsv_is_what_the_table_shows(opened):
    found = opened("town_traverse")
    found.page.context.grant_permissions(["clipboard-read", "clipboard-write"])
    found.page.locator('[data-tools="marks"] [data-search]').fill("K1")
    found.page.locator('[data-tools="marks"] [data-copy]').click()
    found.page.get_by_role("button", name="Copied").wait_for()
    lines = found.page.evaluate("navigator.clipboard.readText()").splitlines()
    assert lines[0].split("\t")[:4] == ["mark", "plan", "height is", "easting [m]"]
    rows = found.page.locator('table[data-table="marks"] tbody tr')
    assert len(lines) - 1 == rows.count() == 4
    for place, line in enumerate(lines[1:]):
        assert line.split("\t")[1:] == rows.nth(place).locator("td").all_inner_texts()


def test_headers_say_their_formula(opened):
    found = opened("town_traverse")
    heads = found.page.locator("table[data-table] thead button").evaluate_all("all => all.map(each => each.title)")
    assert heads
    assert all(heads)


@pytest.fixture(scope="module")
def long_page(tmp_path_factory):
    """A grid whose observations are more than a page shows at once."""
    path = tmp_path_factory.mktemp("long") / "report.html"
    job, _ = observe(triangulation_grid(np.random.default_rng(2), 8, 8), np.random.default_rng(3))
    adjustment = adjust(job)
    assert adjustment.solution.observations > 400
    write_page(adjustment, path)
    return path, adjustment


def test_long_tables_turn_their_leaves_and_keep_every_row(opened, long_page):
    path, adjustment = long_page
    found = opened("long", file=path)
    leaves = found.page.locator('[data-leaves="observations"]')
    total = adjustment.solution.observations
    assert leaves.inner_text().startswith(f"Rows 1 to 100 of {total} rows.")
    seen = column(found, "observations", 11)
    while leaves.get_by_role("button", name="Next").is_enabled():
        leaves.get_by_role("button", name="Next").click()
        seen += column(found, "observations", 11)
    assert len(seen) == len(set(seen)) == total
    found.page.locator('[data-tools="observations"] [data-search]').fill(seen[-1])
    assert column(found, "observations", 11) == [seen[-1]]


def test_choosing_on_the_map_brings_rows_of_other_leaves_forward(opened, long_page):
    found = opened("long", file=long_page[0])
    name = column(found, "marks", 1)[-1]
    found.page.fill("#find-mark", name)
    found.page.keyboard.press("Enter")
    found.page.get_by_role("button", name="Only its rows").click()
    rows = column(found, "observations", 1)
    assert rows
    assert all(name in row.replace("▲", "").split() for row in rows)


def test_hostile_text_stays_text(opened, tmp_path):
    path = tmp_path / "report.html"
    write_page(adjust(hostile_job(tmp_path / "job")), path)
    found = opened("hostile", file=path)
    assert HOSTILE in column(found, "marks", 1)
    found.page.focus("#map")
    for _ in range(4):
        found.page.keyboard.press("n")
        found.settle()
    assert found.page.locator("#map script, img").count() == 0
    head(found, "marks", "mark").click()
    assert HOSTILE in column(found, "marks", 1)
    labels = found.page.locator("[data-labels] text").evaluate_all("texts => texts.map(text => text.textContent)")
    assert f"{HOSTILE[:17]}…" in labels


def test_page_reads_without_scripts(chromium, page_file):
    context = chromium.new_context(java_script_enabled=False)
    page = context.new_page()
    page.goto(page_file("town_traverse").as_uri())
    assert page.locator('table[data-table="observations"] tbody tr').count() == 51
    assert page.locator("#map .labels text").count() == 14
    assert not page.locator(".table-tools, .map-tools").first.is_visible()
    context.close()

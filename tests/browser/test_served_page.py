"""An open page while its job is watched, in a real browser: it refreshes itself and keeps its reader's place."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from adjust import adjust, read_job
from adjust.reports import write_reports
from adjust.reports.served import PageServer
from tests.exported import FIELD_DATA, adjustment_of


@pytest.fixture
def server(tmp_path: Path) -> Iterator[PageServer]:
    write_reports(adjustment_of("town_traverse"), tmp_path / "out")
    with PageServer(tmp_path / "out") as pages:
        yield pages


@pytest.fixture
def page(chromium: Any, server: PageServer) -> Iterator[Any]:
    opened = chromium.new_page(viewport={"width": 1000, "height": 800})
    opened.problems = []
    opened.on("console", lambda message: opened.problems.append(message.text) if message.type == "error" else None)
    opened.on("pageerror", lambda error: opened.problems.append(str(error)))
    opened.goto(server.url)
    yield opened
    opened.close()


def adjust_without_the_blunder(folder: Path) -> None:
    """The town traverse again, its misbooked distance taken out."""
    job = shutil.copytree(FIELD_DATA / "town_traverse", folder / "job")
    lines = (job / "distances.csv").read_text("utf-8").splitlines()
    del lines[12]
    (job / "distances.csv").write_text("\n".join(lines) + "\n", "utf-8")
    write_reports(adjust(read_job(job)), folder / "out")


def state_of(page: Any) -> dict[str, Any]:
    """What a reader sees of where they are."""
    state: dict[str, Any] = page.evaluate(
        """() => {
            const table = document.querySelector('table[data-table="observations"]');
            const tools = document.querySelector('[data-tools="observations"]');
            const sorted = table.querySelector("th[aria-sort]");
            return {
                search: tools.querySelector("[data-search]").value,
                choices: [...tools.querySelectorAll("select")].map((each) => each.selectedOptions[0].textContent),
                sorted: sorted && [sorted.dataset.key, sorted.getAttribute("aria-sort")],
                view: document.getElementById("map").getAttribute("viewBox").split(" ").map(Number),
                exaggeration: document.getElementById("exaggeration").value,
                chosen: document.querySelector(".chip strong")?.textContent,
            };
        }"""
    )
    return state


def top_of_observations(page: Any) -> float:
    """Where the section is in the window, pixels."""
    top: float = page.evaluate("document.getElementById('observations').getBoundingClientRect().top")
    return top


def test_the_reader_stays_where_they_were(page: Any, server: PageServer, tmp_path: Path) -> None:
    tools = page.locator('[data-tools="observations"]')
    tools.locator("select").first.select_option(label="direction")
    tools.locator("[data-search]").fill("30")
    page.locator('table[data-table="observations"] thead th button').nth(3).click()
    page.locator('table[data-table="observations"] thead th button').nth(3).click()
    page.locator('[data-zoom="in"]').click()
    page.locator("#exaggeration").fill("8")
    page.locator('table[data-table="marks"] tbody button').nth(1).click()
    page.evaluate("document.getElementById('observations').scrollIntoView({ behavior: 'instant' })")
    page.evaluate("scrollBy({ top: 150, behavior: 'instant' })")
    before, top = state_of(page), top_of_observations(page)
    assert before["sorted"][1] == "descending"
    assert before["chosen"]
    adjust_without_the_blunder(tmp_path)
    with page.expect_navigation():
        server.announce(("3 marks moved, farthest first:", "  302: +1.00"))
    page.wait_for_selector("#news:not([hidden])")
    after = state_of(page)
    assert after["view"] == pytest.approx(before["view"], rel=1e-6)
    assert {**after, "view": None} == {**before, "view": None}
    kinds = page.locator('table[data-table="observations"] tbody tr').all_inner_texts()
    assert kinds
    assert all("direction" in row and "30" in row for row in kinds)
    assert "3 marks moved" in page.locator("#news").inner_text()
    assert top_of_observations(page) == pytest.approx(top, abs=1)  # px: though 20 suspects above it are gone
    assert page.problems == []


def test_a_mistake_is_told_without_losing_the_page(page: Any, server: PageServer) -> None:
    page.evaluate("window.untouched = true")
    server.announce(trouble="marks.csv:3: <b>easting_m</b> is no number")
    page.wait_for_selector("#news:not([hidden])")
    assert "marks.csv:3: <b>easting_m</b> is no number" in page.locator("#news").inner_text()
    server.announce()
    page.wait_for_selector("#news", state="hidden")
    assert page.evaluate("window.untouched") is True
    assert page.problems == []


def test_the_file_itself_asks_nobody(page: Any, server: PageServer) -> None:
    asked: list[str] = []
    page.on("request", lambda request: asked.append(request.url))
    page.goto((server.folder / "report.html").as_uri())
    page.wait_for_load_state("load")
    assert asked == [(server.folder / "report.html").as_uri()]
    assert page.problems == []

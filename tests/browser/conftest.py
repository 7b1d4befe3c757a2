"""Chromium, and pages of invented jobs opened in it from disk; without a Chromium these tests skip and say so."""

from __future__ import annotations

import os
from dataclasses import dataclass, field
from pathlib import Path

import pytest

from adjust import adjust, read_job
from adjust.network.closures import check_job
from adjust.reports import write_reports
from tests.adjusted_networks import adjusted
from tests.job_folders import PLANE, job_of

CHROMIUM = Path("/usr/bin/chromium")
ARGUMENTS = [
    *("--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking"),
    *("--disable-component-update", "--disable-sync"),
]
FIELD_DATA = Path(__file__).parents[2] / "field_data"
SPECIFICATION = '\n[specification]\nstandard = ["ALTA/NSPS 2026", "LINZ 2009 order 5"]\nhorizontal_mm = 4.0\n'


@pytest.fixture(scope="session")
def chromium():
    """The browser, one a worker."""
    if not CHROMIUM.exists():
        pytest.skip(f"no browser at {CHROMIUM}: `apt-get install chromium` puts one there")
    api = pytest.importorskip("playwright.sync_api", reason="Playwright leads the browser: pip install playwright")
    with api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=str(CHROMIUM), args=ARGUMENTS)
        yield browser
        browser.close()


@pytest.fixture(scope="session")
def page_file(tmp_path_factory):
    """Path of the report of a job by its name, written once a worker."""
    written = {}

    def path_of(name):
        if name not in written:
            folder = tmp_path_factory.mktemp("pages")
            write_reports(*_adjusted(name, folder))
            written[name] = folder / "report.html"
        return written[name]

    return path_of


def _adjusted(name, folder):
    if (FIELD_DATA / name).is_dir():
        job = read_job(FIELD_DATA / name)
    elif name == "specified":
        job = job_of(folder / "job", PLANE | {"job.toml": PLANE["job.toml"] + SPECIFICATION})
    else:
        return adjusted(name), folder
    adjustment = adjust(job)
    return adjustment, folder, "worst", check_job(job)


@dataclass
class Opened:
    """A page in the browser, with what it complained of and what it asked the world for."""

    page: object
    complaints: list[str] = field(default_factory=list)
    requests: list[str] = field(default_factory=list)

    def text(self, selector):
        return self.page.locator(selector).first.inner_text()

    def settle(self):
        """Wait for two frames: the map draws in the next one."""
        self.page.evaluate("new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")


@pytest.fixture
def opened(chromium, page_file):
    """Open the report of a job; every test ends with no complaint of the browser and no request leaving the page."""
    contexts, pages = [], []

    def open_page(name, *, file=None, **options):
        context = chromium.new_context(**{"viewport": {"width": 1280, "height": 900}} | options)
        contexts.append(context)
        found = Opened(context.new_page())
        pages.append(found)
        found.page.on("console", lambda message: found.complaints.append(message.text))
        found.page.on("pageerror", lambda error: found.complaints.append(str(error)))
        found.page.on("request", lambda request: found.requests.append(request.url))
        found.page.goto((file or page_file(name)).as_uri())
        found.settle()
        return found

    yield open_page
    for found in pages:
        assert found.complaints == []
        assert len(found.requests) == 1
    for context in contexts:
        context.close()


if "PLAYWRIGHT_BROWSERS_PATH" not in os.environ:
    os.environ["PLAYWRIGHT_SKIP_BROWSER_DOWNLOAD"] = "1"

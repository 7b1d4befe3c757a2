"""How quick the page of a large network is: its size, its first paint, and a filter, in headless Chromium.

`python -m tests.benchmarks.page PAGE.html …` prints one line for each page. The first paint is what the browser itself
reports; the filter is timed from the key to the next frame that shows its rows.
"""

from __future__ import annotations

import sys
from pathlib import Path

from playwright.sync_api import sync_playwright

from tests.browser.conftest import ARGUMENTS, CHROMIUM

PAINT = "performance.getEntriesByName('first-contentful-paint')[0]?.startTime"
READY = "performance.getEntriesByType('navigation')[0].loadEventEnd"
FILTER = """words => new Promise(done => {
    const search = document.querySelector('[data-tools="observations"] [data-search]');
    const start = performance.now();
    search.value = words;
    search.dispatchEvent(new Event('input'));
    requestAnimationFrame(() => setTimeout(() => done(performance.now() - start)));
})"""
ZOOM = """() => new Promise(done => {
    const start = performance.now();
    document.querySelector('[data-zoom="in"]').click();
    requestAnimationFrame(() => requestAnimationFrame(() => done(performance.now() - start)));
})"""


def measure(path: Path) -> None:
    """Print size, first paint, load, filters and a step of the zoom of one page."""
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=str(CHROMIUM), args=ARGUMENTS)
        page = browser.new_page(viewport={"width": 1280, "height": 900})
        page.goto(path.resolve().as_uri())
        page.wait_for_timeout(2000)
        paint, ready = page.evaluate(PAINT), page.evaluate(READY)
        filters = [page.evaluate(FILTER, words) for words in ("h0617", "h06173", "", "direction", "h099")]
        zoom = [page.evaluate(ZOOM) for _ in range(3)]
        browser.close()
    times = ", ".join(f"{each:.0f}" for each in filters)
    zooms = ", ".join(f"{each:.0f}" for each in zoom)
    size = path.stat().st_size / 1e6
    print(f"{path.name}: {size:.1f} MB; first paint {paint:.0f} ms, loaded {ready:.0f} ms")
    print(f"  filters {times} ms; steps of the zoom {zooms} ms")


if __name__ == "__main__":
    for name in sys.argv[1:]:
        measure(Path(name))

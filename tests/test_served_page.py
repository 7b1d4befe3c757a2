"""The page while it is served: told of news over one connection, on this machine only, the file left as it is."""

from __future__ import annotations

import base64
import hashlib
import html
import http.client
import json
import re
from collections.abc import Iterator
from pathlib import Path

import pytest

from adjust.reports import write_reports
from adjust.reports.served import PageServer, live_page
from tests.exported import adjustment_of

PATIENCE = 20.0
"""Seconds that an answer may take before a test gives up on it."""


@pytest.fixture
def server(tmp_path: Path) -> Iterator[PageServer]:
    write_reports(adjustment_of("fen_levels"), tmp_path / "out")
    (tmp_path / "secret.txt").write_text("not for browsers", "utf-8")
    (tmp_path / "out" / "job.key").write_text("not a report", "utf-8")
    with PageServer(tmp_path / "out") as pages:
        yield pages


def ask(server: PageServer, path: str, host: str | None = None) -> http.client.HTTPResponse:
    connection = http.client.HTTPConnection("127.0.0.1", server.port, timeout=PATIENCE)
    connection.request("GET", path, headers={} if host is None else {"Host": host})
    return connection.getresponse()


def next_news(response: http.client.HTTPResponse) -> dict[str, object]:
    """The next message of the lasting answer."""
    for line in iter(response.readline, b""):
        if line.startswith(b"data: "):
            told: dict[str, object] = json.loads(line.removeprefix(b"data: "))
            return told
    raise AssertionError("the server hung up")


def policy_of(page: str) -> dict[str, str]:
    found = re.search(r'http-equiv="Content-Security-Policy" content="([^"]*)"', page)
    assert found
    return dict(entry.strip().split(" ", 1) for entry in html.unescape(found[1]).split(";"))


def test_reports_are_served_and_nothing_else(server: PageServer) -> None:
    for name in ("results.json", "listing.txt", "coordinates.csv"):
        assert ask(server, f"/{name}").read() == (server.folder / name).read_bytes()
    for path in ("/job.key", "/../secret.txt", "/%2e%2e/secret.txt", "//etc/passwd", "/out", "/.", "/nothing.html"):
        assert ask(server, path).status == 404


def test_only_this_machine_is_answered(server: PageServer) -> None:
    """A request that came by another name, as a site would make through a reader's browser, is refused."""
    assert server.url.startswith("http://127.0.0.1:")
    assert ask(server, "/", host=f"localhost:{server.port}").status == 200
    assert ask(server, "/", host="survey.example").status == 403
    assert ask(server, "/news", host=f"survey.example:{server.port}").status == 403


def test_the_served_page_is_the_file_with_one_more_script_part(server: PageServer) -> None:
    file = (server.folder / "report.html").read_text("utf-8")
    served = ask(server, "/").read().decode("utf-8")
    assert "EventSource" in served
    assert "EventSource" not in file
    script = re.search(r'<script>("use strict";.*?)</script>', served, re.DOTALL)
    assert script
    digest = base64.b64encode(hashlib.sha256(script[1].encode("utf-8")).digest()).decode("ascii")
    policy = policy_of(served)
    assert policy["script-src"] == f"'sha256-{digest}'"
    assert policy["connect-src"] == "'self'"
    own = policy_of(file)
    assert own["default-src"] == policy["default-src"] == "'none'"
    assert "connect-src" not in own
    assert {key: value for key, value in policy.items() if key not in ("script-src", "connect-src")} == {
        key: value for key, value in own.items() if key != "script-src"
    }


def test_a_page_of_another_make_is_served_as_it_is() -> None:
    for page in ("", "<p>hello", '<script>"use strict";\n(() => {})();\n</script>'):
        assert live_page(page, "1") == page


def test_news_come_as_they_happen(server: PageServer) -> None:
    news = ask(server, "/news")
    assert news.headers["Content-Type"].startswith("text/event-stream")
    assert next_news(news) == {"version": server.version(), "change": [], "trouble": ""}
    server.announce(trouble="marks.csv:3: easting_m: 'x' is no number\nsecond line")
    assert next_news(news)["trouble"] == "marks.csv:3: easting_m: 'x' is no number\nsecond line"
    page = server.folder / "report.html"
    page.write_text(page.read_text("utf-8") + "\n", "utf-8")
    server.announce(("No mark moved.",))
    told = next_news(news)
    assert told == {
        "version": hashlib.sha256(page.read_bytes()).hexdigest(),
        "change": ["No mark moved."],
        "trouble": "",
    }


def test_leaving_ends_waiting_pages(tmp_path: Path) -> None:
    with PageServer(tmp_path / "not there yet") as pages:
        assert ask(pages, "/").status == 404
        news = ask(pages, "/news")
        assert next_news(news)["version"] == ""
    assert news.read().strip() == b""

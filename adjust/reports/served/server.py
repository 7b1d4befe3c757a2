"""A small server of one folder of reports, for browsers on this machine."""

from __future__ import annotations

import hashlib
import threading
from dataclasses import replace
from http import HTTPStatus
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from adjust.reports.served.live import Live, live_page

ADDRESS = "127.0.0.1"
PAGE = "report.html"
HEARTBEAT = 15.0
"""Seconds between signs of life to a waiting page; without one, a page that was closed would hold its thread."""

TYPES = {
    ".html": "text/html; charset=utf-8",
    ".json": "application/json; charset=utf-8",
    ".csv": "text/csv; charset=utf-8",
    ".txt": "text/plain; charset=utf-8",
}


class PageServer:
    """Serves the reports in `folder` on 127.0.0.1 from its own threads until it is left.

    An open page hears of new results over one lasting request, `/news`. Requests that name another host are refused, so
    that no site on the network can read the reports through a reader's browser.
    """

    def __init__(self, folder: Path, port: int = 0) -> None:
        """`port` 0: any that is free. Raises OSError where the port is taken."""
        self.folder = folder
        self.live = Live(self.version())
        self.told = threading.Condition()
        self.closing = False
        self._server = ThreadingHTTPServer((ADDRESS, port), _handler(self))
        self._server.daemon_threads = True
        self._thread = threading.Thread(target=self._server.serve_forever, args=(0.05,), daemon=True)

    @property
    def port(self) -> int:
        """The port in use."""
        return int(self._server.server_address[1])

    @property
    def url(self) -> str:
        """Where the page is."""
        return f"http://{ADDRESS}:{self.port}/{PAGE}"

    def version(self) -> str:
        """A digest of the page on disk; "" where there is none."""
        page = self.folder / PAGE
        return hashlib.sha256(page.read_bytes()).hexdigest() if page.is_file() else ""

    def announce(self, change: tuple[str, ...] = (), trouble: str = "") -> None:
        """Tell open pages what changed with the page now on disk, or what is wrong with the tables."""
        with self.told:
            self.live = replace(self.live, version=self.version(), change=change, trouble=trouble)
            self.told.notify_all()

    def __enter__(self) -> Self:
        self._thread.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, traceback: TracebackType | None
    ) -> None:
        with self.told:
            self.closing = True
            self.told.notify_all()
        self._server.shutdown()
        self._server.server_close()
        self._thread.join()


def _handler(page_server: PageServer) -> type[BaseHTTPRequestHandler]:
    class Handler(_Handler):
        pages = page_server

    return Handler


class _Handler(BaseHTTPRequestHandler):
    """One request. The address is looked up among the reports that exist, never made into a path."""

    pages: PageServer

    def do_GET(self) -> None:
        if self.headers.get("Host") not in {f"{ADDRESS}:{self.pages.port}", f"localhost:{self.pages.port}"}:
            self.send_error(HTTPStatus.FORBIDDEN)
        elif self.path == "/news":
            self._tell_news()
        else:
            self._send_file(PAGE if self.path == "/" else self.path.removeprefix("/"))

    def _send_file(self, name: str) -> None:
        found = {path.name: path for path in self.pages.folder.glob("*") if path.suffix in TYPES and path.is_file()}
        if name not in found:
            self.send_error(HTTPStatus.NOT_FOUND)
            return
        content = found[name].read_bytes()
        if name == PAGE:
            version = hashlib.sha256(content).hexdigest()
            content = live_page(content.decode("utf-8"), version).encode("utf-8")
        self._send_head(TYPES[found[name].suffix], len(content))
        self.wfile.write(content)

    def _send_head(self, kind: str, length: int | None = None) -> None:
        self.send_response(HTTPStatus.OK)
        self.send_header("Content-Type", kind)
        self.send_header("Cache-Control", "no-store")
        self.send_header("X-Content-Type-Options", "nosniff")
        if length is not None:
            self.send_header("Content-Length", str(length))
        self.end_headers()

    def _tell_news(self) -> None:
        """What is known now, then every change, until the page or the server is closed."""
        self._send_head("text/event-stream; charset=utf-8")
        last = None
        try:
            while not self.pages.closing:
                live = self.pages.live
                news = f"data: {live.as_json()}\n\n" if live is not last else ": still here\n\n"
                self.wfile.write(news.encode("utf-8"))
                self.wfile.flush()
                last = live
                with self.pages.told:
                    if self.pages.live is last and not self.pages.closing:
                        self.pages.told.wait(HEARTBEAT)
        except OSError:
            return  # the page was closed

    def log_message(self, *arguments: Any) -> None:
        """Requests are not worth a line on the screen."""

"""A progress line for people who wait: on a terminal, and only when it takes more than a moment."""

from __future__ import annotations

import threading
import time
from types import TracebackType
from typing import Self, TextIO

PATIENCE = 1.0
"""Seconds before anything shows."""

CELLS = 24
"""Width of the bar."""


class ProgressLine:
    """One line on `stream` that is redrawn in place and wiped at the end; silent when nobody watches."""

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._stage, self._done, self._drawn = "", 0.0, 0
        self._lock = threading.Lock()
        self._patience = threading.Timer(PATIENCE, self._draw)
        self._patience.daemon = True

    def __enter__(self) -> Self:
        self._due = time.monotonic() + PATIENCE if self._stream.isatty() else float("inf")
        if self._stream.isatty():
            self._patience.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, traceback: TracebackType | None
    ) -> None:
        self._patience.cancel()
        with self._lock:
            self._due = float("inf")
            if self._drawn:
                self._stream.write("\r" + " " * self._drawn + "\r")
                self._stream.flush()

    def __call__(self, stage: str, done: float) -> None:
        """Show that `stage` is at work and that `done`, 0 … 1, of the whole lies behind."""
        self._stage, self._done = stage, done
        if time.monotonic() >= self._due:
            self._draw()

    def _draw(self) -> None:
        filled = round(CELLS * self._done)
        line = f"{'▪' * filled}{'·' * (CELLS - filled)} {100 * self._done:3.0f} %  {self._stage}"
        with self._lock:
            if self._due < float("inf"):
                self._stream.write("\r" + line.ljust(self._drawn))
                self._stream.flush()
                self._drawn = max(self._drawn, len(line))

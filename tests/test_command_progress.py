"""The progress line: only for people, only when it takes long, and gone afterwards."""

import io
import time

import pytest

import cli.progress
from cli.progress import ProgressLine


class Terminal(io.StringIO):
    """A stream that someone watches."""

    def isatty(self):
        return True

    def shown(self):
        """What stands on the line in the end."""
        line = ""
        for part in self.getvalue().split("\r"):
            line = part + line[len(part) :]
        return line.rstrip()


def test_nothing_is_written_when_nobody_watches(monkeypatch):
    monkeypatch.setattr(cli.progress, "PATIENCE", 0.0)
    stream = io.StringIO()
    with ProgressLine(stream) as progress:
        progress("adjusting", 0.5)
        time.sleep(0.05)
    assert stream.getvalue() == ""


def test_a_quick_run_shows_nothing():
    terminal = Terminal()
    with ProgressLine(terminal) as progress:
        progress("adjusting", 0.5)
    assert terminal.getvalue() == ""


@pytest.fixture
def watched(monkeypatch):
    monkeypatch.setattr(cli.progress, "PATIENCE", 0.02)
    return Terminal()


def test_a_slow_stage_shows_by_itself_once_patience_is_over(watched):
    """No further report comes while one stage is at work."""
    with ProgressLine(watched) as progress:
        progress("finding the covariance", 0.5)
        deadline = time.monotonic() + 5
        while not watched.getvalue() and time.monotonic() < deadline:
            time.sleep(0.01)
        assert watched.shown() == "▪" * 12 + "·" * 12 + "  50 %  finding the covariance"
    assert watched.shown() == ""


def test_a_shorter_stage_overwrites_a_longer_one_and_the_line_is_wiped(watched):
    with ProgressLine(watched) as progress:
        time.sleep(0.05)
        progress("finding start coordinates", 0.25)
        progress("done", 1.0)
        assert watched.shown() == "▪" * 24 + " 100 %  done"
    assert watched.shown() == ""


def test_the_line_is_wiped_when_the_run_fails(watched):
    def interrupted_run():
        with ProgressLine(watched) as progress:
            time.sleep(0.05)
            progress("adjusting", 0.5)
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        interrupted_run()
    assert "adjusting" in watched.getvalue()
    assert watched.shown() == ""

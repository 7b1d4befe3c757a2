"""`hubtack adjust --watch`: runs again at every save, says what changed, and goes on after a mistake."""

from __future__ import annotations

import shutil
import sys
import threading
from collections.abc import Iterator
from pathlib import Path

import pytest

from cli.main import run
from cli.watch import saves, signature, watch_job
from tests.exported import FIELD_DATA

PATIENCE = 20.0
"""Seconds after which a test gives up on the system's word of a change; it comes within a fraction of one."""


@pytest.fixture
def town(tmp_path: Path) -> Path:
    return shutil.copytree(FIELD_DATA / "town_traverse", tmp_path / "town")


def edit(path: Path, old: str, new: str) -> None:
    text = path.read_text("utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), "utf-8")


def row(path: Path, number: int) -> str:
    return path.read_text("utf-8").splitlines()[number - 1]


def said_between(capsys: pytest.CaptureFixture[str]) -> tuple[str, str]:
    said = capsys.readouterr()
    return said.out, said.err


def test_each_save_is_adjusted_and_what_changed_is_said(town: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """First the blunder is there, then a letter stands in a number, then its row is mended by taking it out."""
    table = town / "distances.csv"
    worst = row(table, 13)
    said: list[tuple[str, str]] = []

    def again() -> Iterator[None]:
        yield
        said.append(said_between(capsys))
        edit(table, worst, worst.replace(".", "x", 1))
        yield
        said.append(said_between(capsys))
        edit(table, worst.replace(".", "x", 1) + "\n", "")
        yield
        said.append(said_between(capsys))

    assert watch_job(town, town / "out", "worst", again=again()) == 0
    first, mistaken, mended = said
    assert "20 observations are suspect" in first[0]
    assert "http://127.0.0.1:" in first[0]
    assert "distances.csv:13" in mistaken[1]
    assert "Mend it and save" in mistaken[1]
    assert mistaken[0] == ""
    assert "marks moved, farthest first" in mended[0]
    assert "No longer suspect: horizontal 302 → 303 (distances.csv:13)" in mended[0]
    assert "No observation is suspect." in mended[0]


def test_the_pages_hear_the_same(town: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from adjust.reports.served import PageServer

    told: list[tuple[tuple[str, ...], str, bool]] = []
    announce = PageServer.announce

    def noted(server: PageServer, change: tuple[str, ...] = (), trouble: str = "") -> None:
        before = server.live.version
        announce(server, change, trouble)
        told.append((change, trouble, server.live.version != before))

    monkeypatch.setattr(PageServer, "announce", noted)
    table = town / "distances.csv"
    worst = row(table, 13)

    def again() -> Iterator[None]:
        yield
        edit(table, worst, "nonsense")
        yield
        edit(table, "nonsense", worst)
        yield
        edit(table, worst + "\n", "")
        yield

    watch_job(town, town / "out", "worst", again=again())
    first, mistaken, undone, mended = told
    assert (first[0], first[1], first[2]) == ((), "", True)
    assert mistaken[0] == ()
    assert "distances.csv:13" in mistaken[1]
    assert not mistaken[2]  # the page on disk is still that of the first run
    assert undone == ((), "", False)
    assert any(line.startswith("No longer suspect") for line in mended[0])
    assert mended[1:] == ("", True)


def test_a_job_that_cannot_be_read_at_first_is_watched_until_it_can(
    town: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    job = (town / "job.toml").read_text("utf-8")
    (town / "job.toml").write_text("title = ", "utf-8")

    def again() -> Iterator[None]:
        yield
        assert not (town / "out").exists()
        (town / "job.toml").write_text(job, "utf-8")
        yield

    assert watch_job(town / "job.toml", town / "out", "book", again=again()) == 1
    said = capsys.readouterr()
    assert "job.toml" in said.err
    assert "20 observations are suspect" in said.out


def test_a_folder_that_is_not_there_is_not_watched(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["adjust", str(tmp_path / "nowhere" / "job"), "--watch"]) == 2
    assert "nowhere" in capsys.readouterr().err


def test_without_watchfiles_the_cure_is_named(
    town: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setitem(sys.modules, "watchfiles", None)
    assert run(["adjust", str(town), "--watch"]) == 2
    assert "pip install 'hubtack[watch]'" in capsys.readouterr().err


def test_a_real_save_is_noticed(town: Path) -> None:
    """Through the system's own notices; what is written into the results folder is no save of the job."""
    (town / "out").mkdir()
    stop, noticed = threading.Event(), threading.Semaphore(0)

    def watching() -> None:
        for _ in saves(town, town / "out", stop):
            noticed.release()

    thread = threading.Thread(target=watching, daemon=True)
    thread.start()
    assert noticed.acquire(timeout=PATIENCE)  # the run at the start
    before = signature(town, town / "out")
    (town / "out" / "results.json").write_text("{}", "utf-8")
    (town / ".distances.csv.swp").write_text("", "utf-8")
    assert signature(town, town / "out") == before
    edit(town / "distances.csv", "\n", "\n# looked through\n")
    assert noticed.acquire(timeout=PATIENCE)
    stop.set()
    thread.join(PATIENCE)
    assert not thread.is_alive()
    assert not noticed.acquire(blocking=False)

"""`hubtack adjust --watch`: adjust again whenever a file of the job is saved, and say what changed."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import click

if TYPE_CHECKING:
    from adjust import Adjustment
    from adjust.blunders import Findings
    from adjust.reports.served import PageServer

PORT = 8473
"""Where the page is served if nobody else is there, so that a page left open finds the next watch by itself."""

LOOK_AGAIN = 1000
"""Milliseconds after which files are looked at even if the system reports no change, as over some networks."""

SETTLED = 100
"""Milliseconds in which changes count as one: some programs save a table in several steps."""

Signature = dict[str, tuple[int, int]]


def job_folder(job: Path) -> Path:
    """The folder of a job folder or of its job.toml."""
    return job if job.is_dir() else job.parent


def saves(job: Path, out: Path, stop: Any = None, decisions: Path | None = None) -> Iterator[None]:
    """Once at the start, then whenever a file of the job, or the table of `decisions`, differs from what it was.

    `out` is no part of the job. Ends with Ctrl-C, or when the event `stop` is set. Raises OutputError where watchfiles
    is not installed.
    """
    from adjust.reports.libraries import library

    watchfiles = library("watchfiles", "watch")
    folder = job_folder(job)
    places = {folder} if decisions is None or not decisions.parent.is_dir() else {folder, decisions.parent}
    seen = signature(folder, out, decisions)
    yield
    watched = watchfiles.watch(
        *sorted(places),
        step=SETTLED // 2,
        debounce=SETTLED,
        rust_timeout=LOOK_AGAIN,
        yield_on_timeout=True,
        raise_interrupt=False,
        stop_event=stop,
    )
    for _ in watched:
        now = signature(folder, out, decisions)
        if now != seen:
            seen = now
            yield


def signature(folder: Path, out: Path, decisions: Path | None = None) -> Signature:
    """When each file was written and how long it is, without results, hidden files and what editors leave aside."""
    found = {}
    for path in (*folder.rglob("*"), *([] if decisions is None else [decisions])):
        if path == decisions or not _aside(path, out):
            try:
                stat = path.stat()
            except OSError:
                continue  # gone between the two looks
            if path.is_file():
                found[str(path)] = (stat.st_mtime_ns, stat.st_size)
    return found


def _aside(path: Path, out: Path) -> bool:
    """Whether a file of the folder is no part of the job."""
    hidden = path.name.startswith((".", "~")) or path.name.endswith(("~", ".tmp"))
    return hidden or path.resolve().is_relative_to(out.resolve())


def page_server(folder: Path) -> PageServer:
    """At the usual port, or at any other where that is taken."""
    from adjust.reports.served import PageServer

    try:
        return PageServer(folder, PORT)
    except OSError:
        return PageServer(folder)


def watch_job(
    job: Path,
    out: Path,
    order: Literal["worst", "book"],
    decisions: Path | None = None,
    again: Iterable[None] | None = None,
) -> int:
    """Adjust whenever `again` yields, by default at the start and at every save; returns the status of the last run."""
    from adjust.errors import HubtackError

    with page_server(out) as pages:
        watch = Watch(job, out, order, decisions, pages)
        try:
            for _ in saves(job, out, decisions=decisions) if again is None else again:
                watch.run()
                if not job_folder(job).is_dir():
                    break
        except HubtackError as error:
            click.echo(str(error), err=True)
            return watch.status or 2
    return watch.status


class Watch:
    """The runs of one watch: the last that could be adjusted, and whether the last one could."""

    def __init__(
        self, job: Path, out: Path, order: Literal["worst", "book"], decisions: Path | None, pages: PageServer
    ) -> None:
        self.job, self.out, self.order, self.decisions, self.pages = job, out, order, decisions, pages
        self.last: Adjustment | None = None
        self.troubled = False
        self.runs = 0
        self.status = 0

    def run(self) -> None:
        """Adjust once and say how it went; what is wrong in a table is said, and the watch goes on."""
        from adjust.errors import HubtackError
        from cli.adjust import adjust_and_write, status_of

        self.runs += 1
        try:
            adjustment, findings = adjust_and_write(self.job, self.out, self.order, self.decisions)
        except HubtackError as error:
            self._failed(error)
            self.status = status_of(error)
        else:
            self._adjusted(adjustment, findings)
            self.status = status_of(adjustment)
        if self.runs == 1:
            click.echo(f"Watching {job_folder(self.job)}; open {self.pages.url}, it refreshes itself. Ctrl-C ends.")

    def _failed(self, error: Exception) -> None:
        self.troubled = True
        click.echo(
            f"{error}\nMend it and save; the results are those of the last run that could be adjusted.", err=True
        )
        self.pages.announce(self.pages.live.change, str(error))

    def _adjusted(self, adjustment: Adjustment, findings: Findings | None) -> None:
        from adjust.reports.change import change_between, change_lines
        from cli.adjust import summarise

        last, self.last = self.last, adjustment
        if last is not None and last.job.input_sha256 == adjustment.job.input_sha256:
            if self.troubled:
                click.echo("The tables are as they were in the last run.")
                self.pages.announce(self.pages.live.change)
        else:
            lines = [] if last is None else change_lines(change_between(last, adjustment))
            for line in lines:
                click.echo(line)
            summarise(adjustment, findings, self.out)
            self.pages.announce(tuple(lines))
        self.troubled = False

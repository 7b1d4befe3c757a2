"""The errors a surveyor can meet: one small tree, each message saying what, why and the remedy."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass


class HubtackError(Exception):
    """Base of every error that bad input can cause; anything else is a defect of the program."""


@dataclass(frozen=True)
class Mistake:
    """One thing wrong in a file: where it stands, what was read, and what would be right.

    `line` and `column` are None where the mistake is of the whole file. `column` is the name in the header row.
    """

    file: str
    line: int | None
    column: str | None
    message: str

    def __str__(self) -> str:
        place = self.file if self.line is None else f"{self.file}:{self.line}"
        return f"{place}: {self.message}" if self.column is None else f"{place}: {self.column}: {self.message}"


class FieldDataError(HubtackError):
    """The field data or the job file cannot be used as written (exit status 2)."""

    SHOWN = 20
    """Mistakes printed at once: enough to mend a table in one go, few enough to read."""

    def __init__(self, mistakes: Sequence[Mistake]) -> None:
        self.mistakes = tuple(mistakes)
        super().__init__(self._text())

    def _text(self) -> str:
        lines = [str(mistake) for mistake in self.mistakes[: self.SHOWN]]
        hidden = len(self.mistakes) - len(lines)
        if hidden > 0:
            lines.append(f"… and at least {hidden} more; mend these first")
        return "\n".join(lines)


class NetworkError(HubtackError):
    """The network cannot be solved as given (exit status 3): which marks, and what is missing."""

    def __init__(self, message: str, marks: Sequence[str] = ()) -> None:
        self.marks = tuple(marks)
        super().__init__(message)


class ConvergenceError(NetworkError):
    """The iteration did not settle (exit status 3); the message names the worst observations."""


class OutputError(HubtackError):
    """The results cannot be written where they were asked for (exit status 2); what was there before is untouched."""

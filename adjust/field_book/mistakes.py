"""Collecting mistakes, so that a surveyor mends a job in one go and not one mistake a run."""

from __future__ import annotations

import difflib
from collections import Counter
from collections.abc import Iterable

from adjust.errors import FieldDataError, Mistake

ENOUGH = FieldDataError.SHOWN
"""Mistakes after which a file is not read further: no more are shown."""

_MOST_COMPARED = 5_000
"""Names compared for similarity at most; comparing costs about 10 µs a name, and 20 suggestions must not take long."""

_LONGEST_COMPARED = 100
"""Characters of a misspelt name that are compared."""

_IGNORED = str.maketrans("", "", " -_./")


class Mistakes:
    """The mistakes found so far, over all files of a job."""

    def __init__(self) -> None:
        self._found: list[Mistake] = []
        self._count: Counter[str] = Counter()

    def add(self, file: str, line: int | None, column: str | None, message: str) -> None:
        """Note one mistake; see `Mistake`."""
        self._found.append(Mistake(file, line, column, message))
        self._count[file] += 1

    def enough(self, file: str) -> bool:
        """Whether this file has so many mistakes already that reading on is of no use."""
        return self._count[file] >= ENOUGH

    def any_in(self, *files: str) -> bool:
        """Whether one of these files has a mistake."""
        return any(self._count[file] for file in files)

    def __bool__(self) -> bool:
        return bool(self._found)

    def raise_if_any(self) -> None:
        """Raise FieldDataError with all mistakes: files in the order they were met, lines in order within each."""
        if not self._found:
            return
        order = {file: place for place, file in enumerate(self._count)}
        raise FieldDataError(sorted(self._found, key=lambda mistake: (order[mistake.file], mistake.line or 0)))


class Likeness:
    """Finds which of the known names a misspelt one stands for.

    Case, spaces, hyphens and leading zeros are what most often differs; after that, likeness of spelling decides.
    """

    def __init__(self, known: Iterable[str]) -> None:
        self._names = list(known)
        self._plain = {_plain(name): name for name in reversed(self._names)}

    def nearest(self, name: str) -> str | None:
        """The known name most like `name`, or None where none is like it."""
        plain = _plain(name[:_LONGEST_COMPARED])
        if plain and plain in self._plain:
            return self._plain[plain]
        if len(self._names) > _MOST_COMPARED:
            return None
        close = difflib.get_close_matches(name[:_LONGEST_COMPARED], self._names, n=1, cutoff=0.5)
        return close[0] if close else None

    def suggestion(self, name: str) -> str:
        """`; did you mean 'heights'?`, or nothing where no known name is like it."""
        guess = self.nearest(name)
        return "" if guess is None else f"; did you mean {guess!r}?"


def _plain(name: str) -> str:
    return name.casefold().translate(_IGNORED).lstrip("0")


def listed(names: Iterable[str], most: int = 8) -> str:
    """Names in a row for a message: `A, B, C and 12 more`."""
    every = list(names)
    text = ", ".join(every[:most])
    return text if len(every) <= most else f"{text} and {len(every) - most} more"

"""Collecting mistakes, so that a surveyor mends a job in one go and not one mistake a run."""

from __future__ import annotations

import difflib
from collections import Counter
from collections.abc import Callable, Iterable, Iterator
from functools import cached_property

from adjust.errors import FieldDataError, Mistake

ENOUGH = FieldDataError.SHOWN + 1
"""Mistakes after which a file is not read further: one more than are shown, so that the message tells of more."""

_MOST_COMPARED = 2_000
"""Names compared for likeness at most; that costs some 10 µs a name, and 20 suggestions must not take long."""

_LONGEST_COMPARED = 100
"""Characters of a misspelt name that are compared."""

_IGNORED = str.maketrans("", "", " -_./")


class Mistakes:
    """The mistakes found so far, over all files of a job."""

    def __init__(self) -> None:
        self._found: list[Mistake] = []
        self._count: Counter[str] = Counter()
        self.blame: Callable[[Mistake], Mistake] = lambda mistake: mistake
        """Puts a mistake where it can be mended, when that is another place than where it shows."""

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

    def __len__(self) -> int:
        """How many were noted."""
        return len(self._found)

    def __bool__(self) -> bool:
        return bool(self._found)

    def raise_if_any(self) -> None:
        """Raise FieldDataError with all mistakes: files in the order they were met, lines in order within each."""
        if not self._found:
            return
        found = list(map(self.blame, self._found))
        order = {file: place for place, file in enumerate(dict.fromkeys((*self._count, *(m.file for m in found))))}
        raise FieldDataError(sorted(found, key=lambda mistake: (order[mistake.file], mistake.line or 0)))


class Likeness:
    """Finds which of the known names a misspelt one stands for.

    Case, spaces, hyphens and leading zeros are what most often differs, then a single slip of the pen; where there
    are few names, likeness of spelling decides at last.
    """

    def __init__(self, known: Iterable[str]) -> None:
        self._names = list(known)
        self._plain = {_plain(name): name for name in reversed(self._names)}

    def nearest(self, name: str) -> str | None:
        """The known name most like `name`, or None where none is like it."""
        plain = _plain(name[:_LONGEST_COMPARED])
        for written in (plain, *(self._slips(plain) if len(plain) > 1 else ())):
            if written and written in self._plain:
                return self._plain[written]
        if len(self._names) > _MOST_COMPARED:
            return None
        close = difflib.get_close_matches(name[:_LONGEST_COMPARED], self._names, n=1, cutoff=0.5)
        return close[0] if close else None

    def _slips(self, plain: str) -> Iterator[str]:
        """What `plain` may have been before two characters changed places, or one was dropped, added or changed."""
        cuts = [(plain[:place], plain[place:]) for place in range(len(plain) + 1)]
        yield from (head + tail[1] + tail[0] + tail[2:] for head, tail in cuts if len(tail) > 1)
        yield from (head + letter + tail for head, tail in cuts for letter in self._letters)
        yield from (head + tail[1:] for head, tail in cuts if tail)
        yield from (head + letter + tail[1:] for head, tail in cuts if tail for letter in self._letters)

    @cached_property
    def _letters(self) -> list[str]:
        return sorted(set().union(*self._plain))

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


def and_more(rows: int) -> str:
    """The tail of a message that holds for further rows; empty for none."""
    return f" (and {rows} more row{'' if rows == 1 else 's'} like it)" if rows else ""

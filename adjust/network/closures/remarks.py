"""What is odd about marks and rows without being a misclosure."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Remark:
    """One odd thing: which check found it, in words, with the marks and the observations (numbers in `Observed`).

    `exceeds` where it breaks a limit of the job; otherwise it only deserves a look.
    """

    check: str
    text: str
    marks: tuple[int, ...] = ()
    rows: tuple[int, ...] = ()
    exceeds: bool = False

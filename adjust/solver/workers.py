"""Independent blocks worked side by side, one thread each.

A BLAS that splits every small product over all processors spends its time waiting, the more so on a busy machine; so
while small blocks are worked, the OpenBLAS that NumPy and SciPy each bring along is held to one thread, and Python's
threads share out the blocks. Each block is computed the same way whoever computes it: results do not depend on the
threads.
"""

from __future__ import annotations

import ctypes
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Executor, ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

import numpy as np
import scipy

FEW_COLUMNS = 8_000  # a system this small is done before a second thread has paid for waking up: measured
MOST_WORKERS = 8  # beyond this Python's own share of the work (about a fifth) keeps more threads waiting
NAMES = ("scipy_openblas_{}_num_threads64_", "scipy_openblas_{}_num_threads", "openblas_{}_num_threads64_")

Item = TypeVar("Item")
Result = TypeVar("Result")
Threads = tuple[Callable[[], int], Callable[[int], None]]
"""Functions that read and set the number of threads of a BLAS."""


@cache
def blas_threads() -> tuple[Threads, ...]:
    """The threads of NumPy's and of SciPy's OpenBLAS, as far as they have brought one along."""
    found = []
    for package in (Path(np.__file__).parent, Path(scipy.__file__).parent):
        beside = package.parent / f"{package.name}.libs"
        for library in [*beside.glob("*openblas*"), *package.glob(".dylibs/*openblas*")]:
            try:
                loaded: Any = ctypes.CDLL(str(library))
            except OSError:
                continue
            name = next((name for name in NAMES if hasattr(loaded, name.format("set"))), None)
            if name:
                found.append((getattr(loaded, name.format("get")), getattr(loaded, name.format("set"))))
    return tuple(found)


@dataclass(frozen=True)
class Workers:
    """Up to `count` threads at work at once."""

    count: int
    pool: Executor | None

    def each(self, work: Callable[[Item], Result], items: Iterable[Item]) -> list[Result]:
        """Results of `work` in the order of the items."""
        waiting = list(items)
        if self.pool is None or len(waiting) < 2:
            return [work(item) for item in waiting]
        return list(self.pool.map(work, waiting))


@contextmanager
def one_blas_thread(columns: int | None = None) -> Iterator[Workers]:
    """Hold the BLAS to one thread, and have as many workers as it had, or one for a system of few `columns`."""
    threads = blas_threads()
    before = [read() for read, _ in threads]
    for _, write in threads:
        write(1)
    few = columns is not None and columns < FEW_COLUMNS
    count = 1 if few or not threads else max(1, min([MOST_WORKERS, *before]))
    try:
        if count == 1:
            yield Workers(1, None)
        else:
            with ThreadPoolExecutor(count) as pool:
                yield Workers(count, pool)
    finally:
        for (_, write), number in zip(threads, before, strict=True):
            write(number)

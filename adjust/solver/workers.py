"""Independent blocks worked side by side, one thread each.

A BLAS that splits every small product over all processors spends its time waiting, the more so on a busy machine; so
while small blocks are worked, OpenBLAS (where NumPy brings it along) is held to one thread and Python's threads share
out the blocks. Each block is computed the same way whoever computes it: results do not depend on the threads.
"""

from __future__ import annotations

import ctypes
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

import numpy as np

MOST_WORKERS = 8  # beyond this Python's own share of the work (about a fifth) keeps more threads waiting
NAMES = ("scipy_openblas_{}_num_threads64_", "scipy_openblas_{}_num_threads", "openblas_{}_num_threads64_")

Item = TypeVar("Item")
Result = TypeVar("Result")


@cache
def blas_threads() -> tuple[Callable[[], int], Callable[[int], None]] | None:
    """Functions that read and set the number of threads of NumPy's OpenBLAS, or None where it has another BLAS."""
    package = Path(np.__file__).parent
    for library in [*package.parent.glob("numpy.libs/*openblas*"), *package.glob(".dylibs/*openblas*")]:
        try:
            loaded: Any = ctypes.CDLL(str(library))
        except OSError:
            continue
        for name in NAMES:
            if hasattr(loaded, name.format("set")):
                return getattr(loaded, name.format("get")), getattr(loaded, name.format("set"))
    return None


@contextmanager
def one_blas_thread() -> Iterator[int]:
    """Hold OpenBLAS to one thread; yields how many Python threads may then work at once."""
    threads = blas_threads()
    if threads is None:
        yield 1
        return
    read, write = threads
    before = read()
    write(1)
    try:
        yield max(1, min(MOST_WORKERS, before))
    finally:
        write(before)


def side_by_side(work: Callable[[Item], Result], items: Iterable[Item], workers: int) -> list[Result]:
    """Results of `work` in the order of the items, by up to `workers` threads."""
    waiting = list(items)
    if workers < 2 or len(waiting) < 2:
        return [work(item) for item in waiting]
    with ThreadPoolExecutor(workers) as pool:
        return list(pool.map(work, waiting))

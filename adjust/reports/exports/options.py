"""What a reader may choose of an export, and the libraries that some of them need."""

from __future__ import annotations

from dataclasses import dataclass
from importlib import import_module
from typing import Any, Literal

from adjust.errors import OutputError

Table = Literal["marks", "lines", "observations"]


@dataclass(frozen=True)
class Options:
    """`exaggeration` of ellipses, None: what suits the format; `table` is that of a csv."""

    exaggeration: float | None = None
    table: Table = "marks"


def library(name: str, extra: str) -> Any:
    """A library that only an export needs. Raises OutputError, which says how to install it, where it is missing."""
    try:
        return import_module(name)
    except ImportError as error:
        raise OutputError(
            f"this format needs the library {name}, which is not installed; install it with: "
            f"python -m pip install 'hubtack[{extra}]'"
        ) from error

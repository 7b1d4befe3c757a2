"""Libraries that only one kind of output needs: extras, imported when that output is asked for."""

from __future__ import annotations

from importlib import import_module
from typing import Any

from adjust.errors import OutputError


def library(name: str, extra: str) -> Any:
    """The library `name` of the extra `extra`. Raises OutputError with the command that installs it, if missing."""
    try:
        return import_module(name)
    except ImportError as error:
        raise OutputError(
            f"this output needs the library {name}, which is not installed; install it with: "
            f"python -m pip install 'hubtack[{extra}]'"
        ) from error

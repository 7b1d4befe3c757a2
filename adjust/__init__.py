"""Hubtack: adjust geodetic control networks.

`read_job(path)` reads a job folder, `adjust(job)` adjusts it, and the `Adjustment` answers questions about it.
Angles are radians and lengths metres throughout; only files and reports know other units.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from adjust.adjusting import adjust
    from adjust.adjustment import Adjustment
    from adjust.errors import ConvergenceError, FieldDataError, HubtackError, NetworkError
    from adjust.field_book import read_job
    from adjust.job import Job

__all__ = [
    "Adjustment",
    "ConvergenceError",
    "FieldDataError",
    "HubtackError",
    "Job",
    "NetworkError",
    "adjust",
    "read_job",
]

_ROOMS = {
    "Adjustment": "adjust.adjustment",
    "ConvergenceError": "adjust.errors",
    "FieldDataError": "adjust.errors",
    "HubtackError": "adjust.errors",
    "Job": "adjust.job",
    "NetworkError": "adjust.errors",
    "adjust": "adjust.adjusting",
    "read_job": "adjust.field_book",
}


def __getattr__(name: str) -> Any:
    """Import a public name when it is first asked for, so that `import adjust` itself costs next to nothing."""
    if name not in _ROOMS:
        raise AttributeError(f"module 'adjust' has no attribute '{name}'")
    value = getattr(import_module(_ROOMS[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)

"""Templates compiled once and kept beside their sources, as Python keeps its modules: a page starts sooner for it."""

from __future__ import annotations

import sys
from contextlib import suppress
from pathlib import Path

from jinja2 import FileSystemBytecodeCache
from jinja2.bccache import Bucket


class CompiledTemplates(FileSystemBytecodeCache):
    """In the folder `__pycache__` of the templates, where that can be written to; what changed is compiled anew."""

    def __init__(self, templates: Path) -> None:
        self._place = templates / "__pycache__"
        super().__init__(str(self._place), "%s.jinja")

    def load_bytecode(self, bucket: Bucket) -> None:
        """Nothing where it cannot be read."""
        with suppress(OSError, ValueError, EOFError, TypeError):
            super().load_bytecode(bucket)

    def dump_bytecode(self, bucket: Bucket) -> None:
        """Nothing where it cannot be written, or Python was told to write none."""
        if sys.dont_write_bytecode:
            return
        with suppress(OSError):
            self._place.mkdir(exist_ok=True)
            super().dump_bytecode(bucket)

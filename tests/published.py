"""Published examples kept in `tests/data/`, and job folders made of them."""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

from adjust import Adjustment, adjust, read_job
from tests.job_folders import write_folder

DATA = Path(__file__).parent / "data"


def published(file: str) -> dict[str, dict[str, Any]]:
    """Entries of a file of examples by their names."""
    entries = json.loads((DATA / file).read_text(encoding="utf-8"))
    return {entry["id"]: entry for entry in entries}


def table(columns: str, rows: Iterable[Sequence[object]]) -> str:
    """A CSV table; numbers in full, None as a blank cell."""
    return "\n".join([columns, *(",".join("" if cell is None else str(cell) for cell in row) for row in rows)]) + "\n"


def adjusted(folder: Path, **files: str) -> Adjustment:
    """The adjustment of a job folder: `job` is job.toml, the others are tables."""
    tables = {f"{name}.csv": text for name, text in files.items() if name != "job"}
    return adjust(read_job(write_folder(folder, {"job.toml": files["job"], **tables})))

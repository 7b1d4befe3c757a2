"""All files of a run, or none: written aside, then moved into place, and moved back if anything fails."""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path

from adjust.errors import OutputError

Writer = Callable[[Path], None]


def publish(folder: Path, writers: Mapping[str, Writer]) -> None:
    """Write one file for each name into `folder`, which is made if need be.

    Every writer first writes into a temporary folder inside `folder`, hence on the same disk. Only when all have
    finished are the files moved into place one by one; if a move fails or the run is interrupted, those already moved
    are put back. A reader finds the old files or the new ones, each whole. Raises OutputError where the disk says no.
    """
    made: list[Path] = []
    try:
        made += _missing(folder)
        folder.mkdir(parents=True, exist_ok=True)
        _publish_into(folder, writers)
    except BaseException as error:
        _remove_empty(made)
        if isinstance(error, OSError):
            raise OutputError(_refusal(folder, error)) from error
        raise


def _refusal(folder: Path, error: OSError) -> str:
    return (
        f"{error.filename2 or folder}: cannot be written ({error.strerror}); earlier results are as they were. "
        "Make room for it or choose another folder with --out"
    )


def _publish_into(folder: Path, writers: Mapping[str, Writer]) -> None:
    aside = Path(tempfile.mkdtemp(prefix=".hubtack-", dir=folder))
    try:
        for name, write in writers.items():
            write(aside / name)
        _move_all(aside, folder, tuple(writers))
    finally:
        shutil.rmtree(aside, ignore_errors=True)


def _move_all(aside: Path, folder: Path, names: tuple[str, ...]) -> None:
    """Move the new files into place, keeping the old ones aside until all have arrived."""
    earlier = aside / "earlier"
    earlier.mkdir()
    reached: list[str] = []
    try:
        for name in names:
            reached.append(name)
            if (folder / name).is_file():
                os.replace(folder / name, earlier / name)
            os.replace(aside / name, folder / name)
    except BaseException:
        for name in reversed(reached):
            _put_back(aside, folder, name)
        raise


def _put_back(aside: Path, folder: Path, name: str) -> None:
    """Undo the move of one file, however far it came."""
    if not (aside / name).exists():
        os.replace(folder / name, aside / name)
    if (aside / "earlier" / name).exists():
        os.replace(aside / "earlier" / name, folder / name)


def _missing(folder: Path) -> list[Path]:
    """Folders that have to be made, innermost first."""
    return [path for path in (folder, *folder.parents) if not path.exists()]


def _remove_empty(folders: list[Path]) -> None:
    for folder in folders:
        if folder.is_dir() and not any(folder.iterdir()):
            folder.rmdir()

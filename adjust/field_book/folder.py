"""The files of a job folder: reading them, and the fingerprint of all that was read."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path

from adjust.field_book.mistakes import Mistakes

JOB_FILE = "job.toml"

_WRITTEN = {"coordinates.csv", "residuals.csv"}
_SMALLEST_JOB = 'the smallest one is the two lines `[frame]` and `kind = "plane"`'
_BINARY = "there are NUL bytes in it: it is no text file; export the table as CSV in UTF-8"

CONTROL_CHARACTER = re.compile(r"[\x01-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f]")
"""All but tabs and ends of lines: they show on no screen, make two names of one, and pages that no browser reads."""
NOT_PRINTABLE = "is the control character U+{:04X}, which is no text; take it out"


class Folder:
    """A job folder and what was read from it so far."""

    def __init__(self, path: Path, job_file: str, mistakes: Mistakes) -> None:
        self.path = path
        self.job_file = job_file
        self._mistakes = mistakes
        self._digests: dict[str, bytes] = {}

    def text(self, name: str) -> str | None:
        """The text of a file of the folder, or None after noting what is wrong with it."""
        content = self._content(name)
        return None if content is None else self._decoded(name, content)

    def _content(self, name: str) -> bytes | None:
        place = self.path / name
        try:
            if place.is_dir():
                self._mistakes.add(name, None, None, "is a folder, expected a file")
                return None
            if place.exists() and not place.is_file():
                self._mistakes.add(name, None, None, "is a device or a pipe, expected a plain file")
                return None
            content = place.read_bytes()
        except (OSError, ValueError) as error:
            reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
            self._mistakes.add(name, None, None, f"cannot be read ({reason}); check its name and permissions")
            return None
        self._digests[name] = hashlib.sha256(content).digest()
        return content

    def _decoded(self, name: str, content: bytes) -> str | None:
        if content.startswith((b"\xff\xfe", b"\xfe\xff")):
            self._mistakes.add(name, None, None, "is written in UTF-16, expected UTF-8; save it again as UTF-8")
            return None
        nul = content.find(b"\0")
        if nul >= 0:
            self._mistakes.add(name, _line_at(content, nul), None, _BINARY)
            return None
        try:
            text = content.decode("utf-8-sig")
        except UnicodeDecodeError as error:
            self._mistakes.add(
                name,
                _line_at(content, error.start),
                None,
                f"byte 0x{content[error.start]:02X} is not UTF-8 (perhaps Latin-1 or Windows-1252); "
                "save the file again as UTF-8",
            )
            return None
        return self._printable(name, text)

    def _printable(self, name: str, text: str) -> str | None:
        found = CONTROL_CHARACTER.search(text)
        if found is None:
            return text
        line = text.count("\n", 0, found.start()) + 1
        place = found.start() - text.rfind("\n", 0, found.start())
        self._mistakes.add(name, line, None, f"character {place} {NOT_PRINTABLE.format(ord(found[0]))}")
        return None

    def text_of_another(self, path: Path) -> str | None:
        """The text of a file that may lie anywhere, or None as above; the fingerprint covers it under its bare name."""
        other = Folder(Path(), self.job_file, self._mistakes)
        text = other.text(str(path))
        self._digests |= {f"/{path.name}": digest for digest in other._digests.values()}
        return text

    def has(self, name: str) -> bool:
        """Whether something of that name is in the folder."""
        try:
            return (self.path / name).exists()
        except (OSError, ValueError):
            return False

    def tables(self) -> list[str]:
        """Names of the CSV files that lie in the folder itself, but for those that an adjustment writes."""
        try:
            names = [place.name for place in self.path.iterdir() if place.suffix.lower() == ".csv"]
        except OSError:
            return []
        return sorted(set(names) - _WRITTEN)

    def fingerprint(self) -> str:
        """SHA-256 over the names and contents of all files read, in the order of their names."""
        whole = hashlib.sha256()
        for name in sorted(self._digests):
            whole.update(name.encode("utf-8", "surrogatepass") + b"\0" + self._digests[name])
        return whole.hexdigest()


def _line_at(content: bytes, position: int) -> int:
    return content.count(b"\n", 0, position) + 1


def open_folder(path: str | Path, mistakes: Mistakes) -> Folder:
    """The folder of a job, named by itself or by its job file. Raises FieldDataError when there is none."""
    given = Path(path)
    try:
        is_folder, is_file = given.is_dir(), given.is_file()
    except (OSError, ValueError):
        is_folder = is_file = False
    if is_file and given.suffix == ".toml":
        return Folder(given.parent, given.name, mistakes)
    if is_file:
        mistakes.add(str(path), None, None, "is no job file; name a job folder or its job.toml")
    elif not is_folder:
        mistakes.add(str(path), None, None, "there is no such job; name a job folder or its job.toml")
    elif not (given / JOB_FILE).exists():
        mistakes.add(str(path), None, None, f"there is no {JOB_FILE} in this folder; write one, {_SMALLEST_JOB}")
    mistakes.raise_if_any()
    return Folder(given, JOB_FILE, mistakes)

"""Writing TOML: the few shapes that a job file needs, which the standard library reads and does not write."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from datetime import date

Scalar = str | bool | int | float | date | list[str] | list[float]
Section = Mapping[str, "Scalar | Section"]


def toml_text(content: Section) -> str:
    """A document: keys with values first, then each nested table under its header."""
    return "\n".join(_section(content, ())).lstrip("\n") + "\n"


def _section(content: Section, path: tuple[str, ...]) -> list[str]:
    values = {key: value for key, value in content.items() if not isinstance(value, Mapping)}
    lines = [f"{_key(key)} = {_value(value)}" for key, value in values.items()]
    if path and (lines or not content):
        lines = ["", f"[{'.'.join(map(_key, path))}]", *lines]
    for key, value in content.items():
        if isinstance(value, Mapping):
            lines += _section(value, (*path, key))
    return lines


def _key(key: str) -> str:
    return key if re.fullmatch(r"[A-Za-z0-9_-]+", key) else _text(key)


def _value(value: Scalar) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, list):
        return f"[{', '.join(map(_value, value))}]"
    return value.isoformat() if isinstance(value, date) else repr(value)


def _text(text: str) -> str:
    """A basic string: JSON's escapes are TOML's, but for the delete character, which TOML wants escaped."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007F")


def plain(value: float) -> float:
    """A number in the unit of its key without the last digits that conversion leaves: 5.0 for 5.000000000000001."""
    return float(f"{value:.12g}")

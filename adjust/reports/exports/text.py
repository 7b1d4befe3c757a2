"""Text as other formats can hold it."""

from __future__ import annotations

import re

_ILLEGAL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff\ud800-\udfff]")
"""Characters that no XML document may hold. Source: W3C, Extensible Markup Language (XML) 1.0, production 2."""

REPLACEMENT = "\N{REPLACEMENT CHARACTER}"


def legal(text: str) -> str:
    """The text with a mark in place of every character that XML cannot hold."""
    return _ILLEGAL.sub(REPLACEMENT, text)


def one_line(text: str) -> str:
    """The text on one line, for a label."""
    return " ".join(legal(text).split())

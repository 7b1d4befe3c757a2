"""The page on disk, with the script that refreshes it; only what is served has it, the file stays as it was written."""

from __future__ import annotations

import base64
import hashlib
import html
import json
import re
from dataclasses import asdict, dataclass
from pathlib import Path

SCRIPT = Path(__file__).with_name("live.js")

_POLICY = re.compile(r'(<meta http-equiv="Content-Security-Policy" content=")([^"]*)(">)')
END = "})();\n"
_LAST_SCRIPT = re.compile(rf'(.*<script>)("use strict";.*)({re.escape(END)}</script>.*)', re.DOTALL)
"""The page's script is a function called at once; what refreshes it has to stand inside, beside what it keeps."""


@dataclass(frozen=True)
class Live:
    """What an open page is told: which version stands on disk, what changed with it, and what is wrong now."""

    version: str = ""
    change: tuple[str, ...] = ()
    trouble: str = ""

    def as_json(self) -> str:
        """For the page's script, on one line."""
        return json.dumps(asdict(self), ensure_ascii=False)


def live_page(page: str, version: str) -> str:
    """The page with the script `live.js`, which its policy allows to ask this server, and nobody else, for news.

    A page of another make is given back as it is: it has to be refreshed by hand.
    """
    parts = _LAST_SCRIPT.fullmatch(page)
    if parts is None or _POLICY.search(page) is None:
        return page
    before, script, after = parts.groups()
    script += SCRIPT.read_text(encoding="utf-8").replace("PAGE_VERSION", json.dumps(version))
    return _POLICY.sub(
        lambda found: found[1] + _allowing(script + END, found[2]) + found[3], before + script + after, 1
    )


def _allowing(script: str, policy: str) -> str:
    """The policy, with this script in place of the page's own, and its questions to the server, allowed."""
    digest = base64.b64encode(hashlib.sha256(script.encode("utf-8")).digest()).decode("ascii")
    directives = dict(entry.strip().split(" ", 1) for entry in html.unescape(policy).split(";") if entry.strip())
    directives |= {"script-src": f"'sha256-{digest}'", "connect-src": "'self'"}
    return html.escape("; ".join(f"{name} {value}" for name, value in directives.items()))

"""The catalogue, its priors and the page for surveyors say the same."""

from __future__ import annotations

import re
from pathlib import Path

from adjust.blunders.mistakes import MISTAKES, NO_COMMON_MISTAKE, PRIORS

PAGE = (Path(__file__).parent.parent / "docs" / "mistakes.md").read_text(encoding="utf-8")


def test_every_mistake_has_a_prior() -> None:
    names = [mistake.name for mistake in MISTAKES]
    assert sorted(names) == sorted(PRIORS)


def test_the_page_gives_the_priors() -> None:
    rows = re.findall(r"^\| ([a-z ]+) \| .* \| (\d+) \|$", PAGE, re.MULTILINE)
    assert {name: float(prior) for name, prior in rows} == PRIORS
    assert f"a prior of {NO_COMMON_MISTAKE:g}" in PAGE

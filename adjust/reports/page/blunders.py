"""What the search for blunders found, in the words of the page."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from adjust.adjustment import Adjustment
from adjust.job import Job
from adjust.reports.blunder_records import blunder_record
from adjust.reports.blunder_words import (
    LISTED,
    UNEXPLAINED,
    booked_words,
    explained,
    instead_words,
    marks_of,
    sources_of,
    what_of,
)
from adjust.reports.page.content import Figure
from adjust.reports.records import MILLIMETRES, Record
from adjust.reports.wording import ARCSECONDS, decimals

if TYPE_CHECKING:
    from adjust.blunders import Blunder, Findings

SMALL = {"m": (MILLIMETRES, "mm"), "deg": (ARCSECONDS, "″"), "1": (1e6, "ppm")}
"""By which figures of `results.json` are multiplied to be printed, by their unit."""


@dataclass(frozen=True)
class Error:
    """One component of an estimated error as printed."""

    component: str
    size: Figure
    sd: Figure
    unit: str


@dataclass(frozen=True)
class BlunderWords:
    """One blunder as printed; `marks` link it to the map, `""` stands for what cannot be said."""

    what: str
    name: str
    sources: str
    marks: tuple[int, ...]
    errors: tuple[Error, ...]
    booked: tuple[str, ...]
    test: Figure
    critical: Figure
    alternatives: tuple[str, ...]
    explanations: tuple[str, ...]
    advice: str


def blunder_words(adjustment: Adjustment, findings: Findings | None) -> list[BlunderWords]:
    """The blunders, the plainest first; none where nobody searched."""
    found = () if findings is None else findings.blunders[:LISTED]
    return [_words(adjustment.job, place, blunder) for place, blunder in enumerate(found)]


def _words(job: Job, place: int, blunder: Blunder) -> BlunderWords:
    what = what_of(job, blunder.hypothesis)
    record, key = blunder_record(job, blunder), f"blunders[{place}]"
    explanations = tuple(f"{_capital(explained(each))}." for each in blunder.explanations)
    return BlunderWords(
        what=what,
        name=blunder.name,
        sources="" if what else sources_of(blunder),
        marks=marks_of(job, blunder.hypothesis),
        errors=tuple(_errors(record, key)),
        booked=tuple(f"In the book {words}." for words in booked_words(blunder)),
        test=Figure(decimals(record["test"], 2), record["test"], f"{key}.test"),
        critical=Figure(decimals(record["critical"], 2), record["critical"], f"{key}.critical"),
        alternatives=tuple(instead_words(blunder)),
        explanations=explanations or (f"{_capital(UNEXPLAINED)}.",),
        advice=blunder.advice,
    )


def _errors(record: Record, key: str) -> Iterator[Error]:
    """The components of an error, each figure with its place in `results.json`."""
    scale, unit = SMALL[record["unit"]]
    errors, sds = record["estimated_error"], record["sd"]
    names = list(errors) if isinstance(errors, dict) else [""]
    for name in names:
        part = f".{name}" if name else ""
        error, sd = (figures[name] if name else figures for figures in (errors, sds))
        yield Error(
            name,
            Figure(decimals(error * scale, 2, signed=True), error * scale, f"{key}.estimated_error{part}"),
            Figure(decimals(sd * scale, 2), sd * scale, f"{key}.sd{part}"),
            unit,
        )


def _capital(sentence: str) -> str:
    return sentence[:1].upper() + sentence[1:]

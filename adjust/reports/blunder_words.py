"""Blunders in words: where, by how much, what the network expects, what somebody probably did, what to do next."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from adjust.job import Job
from adjust.observations import KIND_NAMES
from adjust.reports.check_words import by_file
from adjust.reports.layout import facts, paragraph, title
from adjust.reports.wording import between, counted, decimals
from adjust.units import (
    ANGLE_ENDINGS,
    ARCSEC,
    DEGREE,
    GON,
    INTERNATIONAL_FOOT,
    LENGTH_ENDINGS,
    US_SURVEY_FOOT,
    format_dms,
)

if TYPE_CHECKING:
    from adjust.blunders import Blunder, Explanation, Findings, Hypothesis

NAMED = 3
"""Blunders in the sentence of a verdict."""
LISTED = 100
"""Blunders told one by one; `results.json` and `blunders.json` have them all."""
MOST_BOOKED = 6
"""Cells of the book that are told of one blunder."""
MOST_ALTERNATIVES = 8
"""Alternatives that are named of one blunder."""
MOST_SOURCES = 8
"""Lines that are named of an error that many share."""
UNSETTLED = (
    "The search did not come to rest: so gross are the errors that what is named here may be wrong in part. Mend what "
    "is plain, look at the closures (hubtack check), and search again."
)
NONE_FOUND = "The search for blunders found none."
NONE_CHECKED = "No blunder can be found: nothing checks these observations."
UNEXPLAINED = "no common mistake explains it"
NARROW = 1.5
"""A test within so many times its critical value may be chance: one sound observation in a million passes 4.9."""
WORTH_SAYING = 0.5
"""Sound observations that would be named, below which chance is not worth a word."""
LONG, WIDE = 1.0, DEGREE
"""Metres and radians from which on an error is told in metres or in degrees, minutes and seconds."""

Small = tuple[float, str, int]
"""SI value of a unit, its sign, decimals."""
_MILLIMETRES: Small = (1e-3, "mm", 2)
_FEET: dict[str, Small] = {"ft": (INTERNATIONAL_FOOT, "ft", 4), "usft": (US_SURVEY_FOOT, "US ft", 4)}
_SECONDS: Small = (ARCSEC, '"', 2)
_MILLIGON: Small = (GON / 1000, "mgon", 2)
_SHARE: Small = (1e-6, "ppm", 2)


def none_found(job: Job, findings: Findings) -> str:
    """That nothing was found, or that nothing could be."""
    unchecked = len(findings.unchecked)
    return NONE_CHECKED if unchecked and unchecked == sum(map(len, job.observations)) else NONE_FOUND


def findings_verdict(job: Job, findings: Findings) -> str:
    """One sentence: what the search names, the plainest first."""
    found = findings.blunders
    if not found:
        return none_found(job, findings)
    names = "; ".join(map(_named, found[:NAMED]))
    more = f"; and {len(found) - NAMED} more" if len(found) > NAMED else ""
    doubt = "" if findings.settled else " It did not come to rest: what it names may be wrong in part."
    return f"The search for blunders names {_number(len(found))}: {names}{more}.{doubt}"


def _named(blunder: Blunder) -> str:
    """The name of an error and what explains it; that it may be another one, where the observations cannot tell."""
    instead = " (or another that cannot be told from it)" if blunder.alternatives else ""
    return f"{blunder.name}{instead}, {likeliest(blunder)}"


def _number(count: int) -> str:
    return "one error" if count == 1 else f"{count} errors"


def likeliest(blunder: Blunder) -> str:
    """The explanation that ranks first, or that there is none."""
    if not blunder.explanations:
        return UNEXPLAINED
    return f"probably {blunder.explanations[0].mistake}"


def blunder_section(job: Job, findings: Findings | None) -> list[str]:
    """The section of a listing; nothing where nobody searched."""
    if findings is None:
        return []
    if not findings.blunders:
        return [*title("Blunders"), *paragraph(none_found(job, findings))]
    return [*title("Blunders"), *blunder_lines(job, findings)]


def blunder_lines(job: Job, findings: Findings, most: int = LISTED) -> list[str]:
    """The blunders one after the other, the plainest first, `most` of them."""
    lines: list[str] = []
    for number, blunder in enumerate(findings.blunders[:most], 1):
        lines += ["", *paragraph(f"{number}. {headline(job, blunder)}"), *facts(list(_facts(blunder)))]
    more = f"Shown are the {most} plainest of {len(findings.blunders)}; the file for programs has them all."
    return [
        *([] if findings.settled else [*paragraph(UNSETTLED), ""]),
        *lines[1:],
        *(["", *paragraph(more)] if len(findings.blunders) > most else []),
        *(["", *paragraph(words)] if (words := by_chance(job, findings)) else []),
    ]


def by_chance(job: Job, findings: Findings) -> str:
    """How many sound observations would be named in a job of that size; "" where all that was found is far beyond."""
    narrow = sum(blunder.test < NARROW * blunder.critical for blunder in findings.blunders)
    observations = sum(rows.observed.size for rows in job.observations)
    expected = findings.significance * observations
    if not narrow or expected < WORTH_SAYING:
        return ""
    sound = f"about {max(expected, 1.0):.0f}"
    return (
        f"{counted(narrow, 'error passes its', 'errors pass their')} critical value narrowly. At a significance of "
        f"{findings.significance:g} {sound} of {observations} observations would do so although nothing is wrong with "
        "them: measure again before leaving one out."
    )


def headline(job: Job, blunder: Blunder) -> str:
    """`horizontal distance 302 → 303 (distances.csv:13)`, or the name of a group and where it enters."""
    what = what_of(job, blunder.hypothesis)
    if what:
        return f"{what} ({blunder.name})"
    return f"{blunder.name} ({sources_of(blunder)})"


def sources_of(blunder: Blunder) -> str:
    """The lines that an error enters, file by file, at most so many."""
    others = len(blunder.sources) - MOST_SOURCES
    return by_file(blunder.sources[:MOST_SOURCES]) + (f" and {others} more" if others > 0 else "")


def what_of(job: Job, hypothesis: Hypothesis) -> str:
    """The kind and the marks of a single row; "" of a group, whose name says it."""
    if not hypothesis.single:
        return ""
    observations = job.observations[hypothesis.rows[0][0]]
    names = [job.marks.names[mark] for mark in marks_of(job, hypothesis)]
    roles = dict.fromkeys(("at", "from", "to")) | dict(zip(observations.roles, names, strict=True))
    component = f" {hypothesis.components[0]}" if hypothesis.components[0] and len(hypothesis.components) == 1 else ""
    return f"{KIND_NAMES[observations.kind][0]}{component} {between(roles)}"


def marks_of(job: Job, hypothesis: Hypothesis) -> tuple[int, ...]:
    """The mark of a group, or the marks of a single row."""
    if hypothesis.mark is not None:
        return (hypothesis.mark,)
    kind, rows = hypothesis.rows[0]
    return tuple(job.observations[kind].marks[int(rows[0])].tolist()) if hypothesis.single else ()


def _facts(blunder: Blunder) -> Iterator[tuple[str, str]]:
    """Names and what they are, indented below the headline."""
    yield "   off by", f"{off_by(blunder)}; test {decimals(blunder.test, 2)}, critical {decimals(blunder.critical, 2)}"
    yield from (("   in the book", words) for words in booked_words(blunder))
    if blunder.alternatives:
        yield "   or instead", f"{'; or '.join(instead_words(blunder))}: the observations cannot tell"
    for explanation in blunder.explanations:
        yield "   explained by", explained(explanation)
    if not blunder.explanations:
        yield "   explained by", f"{UNEXPLAINED}"
    yield "   next", blunder.advice


def booked_words(blunder: Blunder) -> list[str]:
    """What stands in the book and what the network expects there; of many readings the first ones."""
    alone = " if it alone is wrong" if len({each.source for each in blunder.booked}) > 1 else ""
    lines = []
    for each in blunder.booked[:MOST_BOOKED]:
        where = each.title if each.source == blunder.name else f"{each.source}, {each.title}"
        expected = f", expected {each.expected}{alone}" if each.expected else ""
        lines.append(f"{each.text}{expected} ({where})")
    more = len(blunder.booked) - MOST_BOOKED
    return [*lines, f"and {more} more readings"] if more > 0 else lines


def instead_words(blunder: Blunder) -> list[str]:
    """The names of what could stand in its place, with the mistake that it would be; of many the first ones."""
    mistakes = dict(zip((each.name for each in blunder.alternatives), blunder.instead_explained, strict=False))
    shown = blunder.alternatives[:MOST_ALTERNATIVES]
    named = [_instead(each, mistakes.get(each.name)) for each in shown]
    more = len(blunder.alternatives) - MOST_ALTERNATIVES
    return [*named, f"one of {more} more"] if more > 0 else named


def _instead(hypothesis: Hypothesis, explanation: Explanation | None) -> str:
    """What could stand in the place of a blunder: its name, the component where it is a vector's, and the mistake."""
    component = hypothesis.components[0] if hypothesis.single and hypothesis.nature != "vector" else ""
    name = f"{'all of ' if hypothesis.nature == 'vector' else ''}{hypothesis.name} {component}".strip()
    return f"{name} ({explanation.mistake})" if explanation else name


def explained(explanation: Explanation) -> str:
    """The mistake, what it leaves once it is corrected, and how it stands against all others."""
    fit = f"corrected, it fits within {decimals(explanation.w_after, 1)} sd"
    return f"{explanation.mistake}; {fit}; odds {odds_words(explanation.odds)}"


def odds_words(odds: float) -> str:
    """`17 to 1`, `1 to 80`."""
    return f"{odds:.0f} to 1" if odds >= 1.0 else f"1 to {1.0 / max(odds, 1e-9):.0f}"


def off_by(blunder: Blunder) -> str:
    """The estimated error with its sd, component by component, in the units of the book."""
    unit = small_unit_of(blunder)
    return "; ".join(
        f"{name} {_sized(error, unit, blunder.hypothesis.unit)} ± {_sd(sd, unit)}".strip()
        for name, error, sd in zip(
            blunder.hypothesis.components, blunder.estimated_error.tolist(), blunder.sd.tolist(), strict=True
        )
    )


def _sd(sd: float, unit: Small) -> str:
    """An sd in a small unit; one that is none in metres."""
    if unit is _MILLIMETRES and sd >= LONG:
        return f"{decimals(sd, 4)} m"
    return f"{decimals(sd / unit[0], unit[2])}{'' if unit is _SECONDS else ' '}{unit[1]}"


def _sized(error: float, unit: Small, si: str) -> str:
    """An error in a small unit; one that is none in metres, or in degrees, minutes and seconds."""
    if si == "rad" and abs(error) >= WIDE and unit is _SECONDS:
        return f"{'+' if error > 0 else ''}{format_dms(error, 1)}"
    if si == "m" and abs(error) >= LONG and unit is _MILLIMETRES:
        return f"{decimals(error, 4, signed=True)} m"
    return decimals(error / unit[0], unit[2], signed=True)


def small_unit_of(blunder: Blunder) -> Small:
    """In which unit an error is told: that of small things in the unit of the book's column."""
    ending = blunder.booked[0].title.rpartition("_")[2] if blunder.booked else ""
    if blunder.hypothesis.unit == "1":
        return _SHARE
    if blunder.hypothesis.unit == "m":
        return _FEET.get(ending, _MILLIMETRES) if ending in LENGTH_ENDINGS else _MILLIMETRES
    return _MILLIGON if ending in ANGLE_ENDINGS and ending in ("gon", "mgon") else _SECONDS

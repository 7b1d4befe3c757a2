"""`[specification]` of the job file: the standards it names, and figures of its own as requirements."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from adjust.field_book.job_file import JobFileReader, SpecificationSection
from adjust.field_book.mistakes import Likeness
from adjust.field_book.toml_text import plain
from adjust.standards import ACCURACY_STANDARDS, Measure, Requirement, Specification
from adjust.tolerances import Rule

MILLIMETRE = 1e-3
PART_PER_MILLION = 1e-6

OWN_KEYS: Mapping[Measure, tuple[str, str | None]] = {
    Measure.MARK_PLAN: ("horizontal_mm", None),
    Measure.MARK_HEIGHT: ("height_mm", None),
    Measure.PAIR_PLAN: ("relative_mm", "relative_ppm"),
    Measure.PAIR_HEIGHT: ("height_difference_mm", "height_difference_ppm"),
}
"""The keys of the job's own figures: a constant part, and one for each metre of distance."""


def read_specification(section: SpecificationSection, marks: Mapping[str, int], reader: JobFileReader) -> Specification:
    """The specification of a job, after noting standards and marks that there are not."""
    return Specification(
        standards=_standards(section, reader),
        own=tuple(_own(section)),
        pairs=section.pairs,
        marks=_marks(section, marks, reader),
    )


def _standards(section: SpecificationSection, reader: JobFileReader) -> tuple[str, ...]:
    names = section.standard or ()
    for name in names:
        if name not in ACCURACY_STANDARDS:
            guess = Likeness(ACCURACY_STANDARDS).suggestion(name) or "; docs/specifications.md lists all"
            reader.complain(("specification", "standard"), f"read {name!r}, which is no standard known here{guess}")
    return tuple(name for name in dict.fromkeys(names) if name in ACCURACY_STANDARDS)


def _marks(section: SpecificationSection, marks: Mapping[str, int], reader: JobFileReader) -> tuple[int, ...]:
    names = section.marks or ()
    for name in names:
        if name not in marks:
            message = f"read {name!r}, which is not a mark of marks.csv{Likeness(marks).suggestion(name)}"
            reader.complain(("specification", "marks"), message)
    return tuple(marks[name] for name in dict.fromkeys(names) if name in marks)


def specification_keys(specification: Specification, names: Sequence[str]) -> dict[str, Any]:
    """`[specification]` as the job file has it, of a job whose marks have these names; empty where nothing is asked."""
    keys: dict[str, Any] = {"standard": list(specification.standards)}
    for requirement in specification.own:
        constant, proportional = OWN_KEYS[requirement.measure]
        keys[constant] = plain(requirement.rule.constant / MILLIMETRE)
        if proportional is not None:
            keys[proportional] = plain(requirement.rule.proportional / PART_PER_MILLION)
    keys["pairs"] = "" if specification.pairs == "observed" else specification.pairs
    keys["marks"] = [names[mark] for mark in specification.marks]
    return {key: value for key, value in keys.items() if value}


def _own(section: SpecificationSection) -> Iterator[Requirement]:
    """The job's own figures, as printed in its file."""
    for measure, (constant_key, proportional_key) in OWN_KEYS.items():
        constant = getattr(section, constant_key)
        proportional = None if proportional_key is None else getattr(section, proportional_key)
        if constant is not None or proportional is not None:
            millimetres, ppm = constant or 0.0, proportional or 0.0
            parts = [f"{millimetres:g} mm"] if constant is not None else []
            parts += [f"{ppm:g} ppm of D"] if proportional is not None else []
            printed = " + ".join(parts)
            rule = Rule(printed, constant=millimetres * MILLIMETRE, proportional=ppm * PART_PER_MILLION)
            yield Requirement(measure, rule)

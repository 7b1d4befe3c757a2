"""`[specification]` of the job file: the standards it names, and figures of its own as requirements."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from adjust.field_book.job_file import JobFileReader, SpecificationSection
from adjust.field_book.mistakes import Likeness
from adjust.standards import ACCURACY_STANDARDS, Measure, Requirement, Specification
from adjust.tolerances import Rule

MILLIMETRE = 1e-3
PART_PER_MILLION = 1e-6


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


def _own(section: SpecificationSection) -> Iterator[Requirement]:
    """The job's own figures, as printed in its file."""
    for measure, constant, proportional in (
        (Measure.MARK_PLAN, section.horizontal_mm, None),
        (Measure.MARK_HEIGHT, section.height_mm, None),
        (Measure.PAIR_PLAN, section.relative_mm, section.relative_ppm),
        (Measure.PAIR_HEIGHT, section.height_difference_mm, section.height_difference_ppm),
    ):
        if constant is not None or proportional is not None:
            millimetres, ppm = constant or 0.0, proportional or 0.0
            parts = [f"{millimetres:g} mm"] if constant is not None else []
            parts += [f"{ppm:g} ppm of D"] if proportional is not None else []
            printed = " + ".join(parts)
            rule = Rule(printed, constant=millimetres * MILLIMETRE, proportional=ppm * PART_PER_MILLION)
            yield Requirement(measure, rule)

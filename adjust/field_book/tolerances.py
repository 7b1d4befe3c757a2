"""`[tolerances]` of the job file: its figures as rules, its standards by their names."""

from __future__ import annotations

from collections.abc import Iterator
from types import MappingProxyType

from adjust.field_book.job_file import JobFileReader, TolerancesSection
from adjust.field_book.mistakes import Likeness, listed
from adjust.tolerances import STANDARDS, Quantity, Rule, Tolerances
from adjust.tolerances.rules import per_root_kilometre
from adjust.units import ARCSEC

MILLIMETRE = 1e-3
PART_PER_MILLION = 1e-6


def read_tolerances(section: TolerancesSection, reader: JobFileReader) -> Tolerances:
    """The tolerances of a job, after noting standards that there are not and ranges that are none."""
    own: dict[Quantity, tuple[Rule, ...]] = {}
    for quantity, rule in _rules(section):
        own[quantity] = (*own.get(quantity, ()), rule)
    usual = Tolerances()
    return Tolerances(
        standards=_standards(section, reader),
        own=MappingProxyType(own),
        sd_factor=section.sd_factor,
        confidence=usual.confidence if section.confidence is None else section.confidence,
        instrument_heights=_range(section, "instrument_height_m", usual.instrument_heights, reader),
        target_heights=_range(section, "target_height_m", usual.target_heights, reader),
        same_mark=usual.same_mark if section.same_mark_m is None else section.same_mark_m,
    )


def _standards(section: TolerancesSection, reader: JobFileReader) -> tuple[str, ...]:
    names = section.standard or ()
    for name in names:
        if name not in STANDARDS:
            guess = Likeness(STANDARDS).suggestion(name) or f"; known are {listed(STANDARDS, len(STANDARDS))}"
            reader.complain(("tolerances", "standard"), f"read {name!r}, which is no standard known here{guess}")
    return tuple(name for name in dict.fromkeys(names) if name in STANDARDS)


def _range(
    section: TolerancesSection, key: str, usual: tuple[float, float], reader: JobFileReader
) -> tuple[float, float]:
    given = getattr(section, key)
    if given is None:
        return usual
    if given[0] >= given[1]:
        reader.complain(("tolerances", key), f"read {given}, expected the lowest height before the highest")
    return given[0], given[1]


def _rules(section: TolerancesSection) -> Iterator[tuple[Quantity, Rule]]:
    """The job's own figures, as printed in its file."""
    for quantity, root_of_length in (
        (Quantity.LEVEL_RUNS, section.level_runs_mm_per_sqrt_km),
        (Quantity.LEVEL_LOOP, section.level_loops_mm_per_sqrt_km),
        (Quantity.POSITION, section.position_mm_per_sqrt_km),
    ):
        if root_of_length is not None:
            factor = per_root_kilometre(root_of_length * MILLIMETRE)
            yield quantity, Rule(f"{root_of_length:g} mm √K, K in km", per_root=factor)
    if section.position_ratio is not None:
        yield Quantity.POSITION, Rule(f"1:{section.position_ratio:g}", proportional=1.0 / section.position_ratio)
    if section.angles_arcsec_per_sqrt_n is not None:
        arcseconds = section.angles_arcsec_per_sqrt_n
        yield Quantity.ANGLES, Rule(f'{arcseconds:g}" √n', per_root=arcseconds * ARCSEC)
    for quantity, angle in (
        (Quantity.FACES, section.faces_arcsec),
        (Quantity.TRIANGLE, section.triangles_arcsec),
        (Quantity.STATION, section.station_arcsec),
    ):
        if angle is not None:
            yield quantity, Rule(f'{angle:g}"', constant=angle * ARCSEC)
    for quantity, constant, proportional in (
        (Quantity.DISTANCE, section.distances_mm, section.distances_ppm),
        (Quantity.VECTOR, section.vectors_mm, section.vectors_ppm),
    ):
        if constant is not None or proportional is not None:
            millimetres, ppm = constant or 0.0, proportional or 0.0
            printed = f"{millimetres:g} mm + {ppm:g} ppm"
            rule = Rule(printed, constant=millimetres * MILLIMETRE, proportional=ppm * PART_PER_MILLION)
            yield quantity, rule

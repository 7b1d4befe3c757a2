"""`[tolerances]` of the job file: its figures as rules, its standards by their names."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

from adjust.field_book.job_file import JobFileReader, TolerancesSection
from adjust.field_book.mistakes import Likeness, listed
from adjust.field_book.toml_text import plain
from adjust.tolerances import STANDARDS, Quantity, Rule, Tolerances
from adjust.tolerances.rules import per_root_kilometre
from adjust.units import ARCSEC

MILLIMETRE = 1e-3
PART_PER_MILLION = 1e-6
PARTS = ("constant", "per_root", "proportional")
"""Fields of a rule that make up the allowance, in their order."""
MM_PER_ROOT_KM = per_root_kilometre(MILLIMETRE)


@dataclass(frozen=True)
class OwnFigure:
    """A figure of the job's own: one key of `[tolerances]` for each of its `parts`, which are fields of the rule.

    `units` are those of the keys in metres and radians; a `ratio` is the N of 1 : N. `printed` takes the figures.
    """

    quantity: Quantity
    keys: tuple[str, ...]
    parts: tuple[str, ...]
    units: tuple[float, ...]
    printed: str
    ratio: bool = False

    def rule(self, *figures: float) -> Rule:
        """The rule of figures as the keys have them."""
        values = [figure * unit for figure, unit in zip(figures, self.units, strict=True)]
        parts = dict(zip(self.parts, [1.0 / value for value in values] if self.ratio else values, strict=True))
        constant, per_root, proportional = (parts.get(name, 0.0) for name in PARTS)
        return Rule(self.printed.format(*figures), constant, per_root, proportional)

    def keys_of(self, rule: Rule) -> dict[str, float]:
        """The keys of a rule that has no other parts than these; none of another."""
        if any(getattr(rule, part) for part in PARTS if part not in self.parts):
            return {}
        values = [getattr(rule, part) for part in self.parts]
        return {
            key: plain(1.0 / value if self.ratio else value / unit)
            for key, value, unit in zip(self.keys, values, self.units, strict=True)
        }


def _by_root_of_length(quantity: Quantity, key: str) -> OwnFigure:
    return OwnFigure(quantity, (key,), ("per_root",), (MM_PER_ROOT_KM,), "{:g} mm √K, K in km")


def _of_angle(quantity: Quantity, key: str) -> OwnFigure:
    return OwnFigure(quantity, (key,), ("constant",), (ARCSEC,), '{:g}"')


def _by_length(quantity: Quantity, name: str) -> OwnFigure:
    keys, units = (f"{name}_mm", f"{name}_ppm"), (MILLIMETRE, PART_PER_MILLION)
    return OwnFigure(quantity, keys, ("constant", "proportional"), units, "{:g} mm + {:g} ppm")


OWN_FIGURES = (
    _by_root_of_length(Quantity.LEVEL_RUNS, "level_runs_mm_per_sqrt_km"),
    _by_root_of_length(Quantity.LEVEL_LOOP, "level_loops_mm_per_sqrt_km"),
    _by_root_of_length(Quantity.POSITION, "position_mm_per_sqrt_km"),
    OwnFigure(Quantity.POSITION, ("position_ratio",), ("proportional",), (1.0,), "1:{:g}", ratio=True),
    OwnFigure(Quantity.ANGLES, ("angles_arcsec_per_sqrt_n",), ("per_root",), (ARCSEC,), '{:g}" √n'),
    _of_angle(Quantity.FACES, "faces_arcsec"),
    _of_angle(Quantity.TRIANGLE, "triangles_arcsec"),
    _of_angle(Quantity.STATION, "station_arcsec"),
    _by_length(Quantity.DISTANCE, "distances"),
    _by_length(Quantity.VECTOR, "vectors"),
)
RANGES_AND_OTHERS = {
    "sd_factor": "sd_factor",
    "confidence": "confidence",
    "instrument_height_m": "instrument_heights",
    "target_height_m": "target_heights",
    "same_mark_m": "same_mark",
}
"""Keys of the rest, and what `Tolerances` calls it."""


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
    for figure in OWN_FIGURES:
        read = [None if key is None else getattr(section, key) for key in figure.keys]
        if any(value is not None for value in read):
            yield figure.quantity, figure.rule(*(value or 0.0 for value in read))


def tolerance_keys(tolerances: Tolerances) -> dict[str, Any]:
    """`[tolerances]` as the job file has it; empty where everything is as usual."""
    usual = Tolerances()
    keys: dict[str, Any] = {"standard": list(tolerances.standards)} if tolerances.standards else {}
    for figure in OWN_FIGURES:
        for rule in tolerances.own.get(figure.quantity, ()):
            keys |= figure.keys_of(rule)
    for key, name in RANGES_AND_OTHERS.items():
        value = getattr(tolerances, name)
        if value != getattr(usual, name):
            keys[key] = list(value) if isinstance(value, tuple) else value
    return keys

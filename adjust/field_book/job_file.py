"""`job.toml`: its sections as pydantic models, and its mistakes with the key and the line they stand on."""

from __future__ import annotations

import datetime
import re
import tomllib
from collections.abc import Iterator, Sequence
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationError
from pydantic_core import ErrorDetails

from adjust.field_book.folder import CONTROL_CHARACTER, NOT_PRINTABLE
from adjust.field_book.mistakes import Likeness, Mistakes
from adjust.field_book.schema import TABLES
from adjust.units import shown


class Section(BaseModel):
    """A section of the job file: no unknown keys, no conversions, no NaN."""

    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, frozen=True)


def _as_list(value: object) -> object:
    return [value] if isinstance(value, str) else value


def _as_text(value: object) -> object:
    return value.isoformat() if isinstance(value, datetime.date) else value


SMALLEST = 1e-6
"""Least arc second, millimetre or ppm that an instrument may state; below it weights leave double precision."""

Positive = Annotated[float, Field(ge=SMALLEST, lt=1e9)]
NotNegative = Annotated[float, Field(ge=0, lt=1e9)]
Finite = Annotated[float, Field(gt=-1e5, lt=1e5)]
Ppm = Annotated[float, Field(gt=-1000, lt=1000)]
Probability = Annotated[float, Field(gt=0, lt=1)]
FileNames = Annotated[list[str], BeforeValidator(_as_list), Field(min_length=1)]


class FrameSection(Section):
    """`[frame]`."""

    kind: Literal["plane", "ellipsoid"] = "plane"
    crs: str | None = None
    heights: Literal["orthometric", "ellipsoidal"] | None = None
    geoid_grid: str | None = None
    refraction_coefficient: Annotated[float, Field(gt=-10, lt=10)] = 0.13
    earth_curvature: bool | None = None


class DatumSection(Section):
    """`[datum]`."""

    mode: Literal["control", "inner"] = "control"
    marks: Annotated[list[str], Field(min_length=1)] | None = None


class Instrument(Section):
    """`[instruments.NAME]`: standard deviations in the units of the keys; None where nothing is stated."""

    direction_arcsec: Positive | None = None
    angle_arcsec: Positive | None = None
    azimuth_arcsec: Positive | None = None
    zenith_arcsec: Positive | None = None
    distance_mm: NotNegative | None = None
    distance_ppm: NotNegative | None = None
    centring_mm: NotNegative = 0.0
    target_centring_mm: NotNegative = 0.0
    height_mm: NotNegative = 0.0
    level_mm_per_sqrt_km: Positive | None = None
    level_mm_per_setup: Positive | None = None
    edm_wavelength_nm: Annotated[float, Field(ge=300, le=1700)] | None = None
    edm_reference_index: Annotated[float, Field(ge=1.0, le=1.001)] | None = None
    edm_formula: Literal["closed", "rigorous"] = "closed"
    edm_ppm_c: Ppm | None = None
    edm_ppm_d: Ppm | None = None
    edm_scale_ppm: Ppm = 0.0
    collimation_arcsec: Finite | None = None
    index_arcsec: Finite | None = None
    level_collimation_arcsec: Finite | None = None


class Target(Section):
    """`[targets.NAME]`: what is added to a distance measured to it, and how well it is centred."""

    constant_mm: Annotated[float, Field(gt=-1e4, lt=1e4)] = 0.0
    centring_mm: NotNegative | None = None


class StatisticsSection(Section):
    """`[statistics]`; the defaults are those of `adjust.job.Statistics`."""

    confidence: Probability = 0.95
    significance: Probability = 0.001
    power: Probability = 0.80
    sd_basis: Literal["prior", "posterior"] = "prior"


Range = Annotated[list[float], Field(min_length=2, max_length=2)]


class TolerancesSection(Section):
    """`[tolerances]`; the defaults are those of `adjust.tolerances`."""

    standard: FileNames | None = None
    faces_arcsec: Positive | None = None
    level_runs_mm_per_sqrt_km: Positive | None = None
    level_loops_mm_per_sqrt_km: Positive | None = None
    angles_arcsec_per_sqrt_n: Positive | None = None
    triangles_arcsec: Positive | None = None
    station_arcsec: Positive | None = None
    position_ratio: Positive | None = None
    position_mm_per_sqrt_km: Positive | None = None
    distances_mm: NotNegative | None = None
    distances_ppm: NotNegative | None = None
    vectors_mm: NotNegative | None = None
    vectors_ppm: NotNegative | None = None
    sd_factor: Positive | None = None
    confidence: Probability | None = None
    instrument_height_m: Range | None = None
    target_height_m: Range | None = None
    same_mark_m: NotNegative | None = None


class SpecificationSection(Section):
    """`[specification]`; the defaults are those of `adjust.standards`."""

    standard: FileNames | None = None
    horizontal_mm: Positive | None = None
    height_mm: Positive | None = None
    relative_mm: Positive | None = None
    relative_ppm: Positive | None = None
    height_difference_mm: Positive | None = None
    height_difference_ppm: Positive | None = None
    pairs: Literal["observed", "all"] = "observed"
    marks: Annotated[list[str], Field(min_length=1)] | None = None


INSTRUMENT_KEYS = ("instrument", *(f"{name}_instrument" for name, table in TABLES.items() if table.has_instrument))
DEFAULT_KEYS = (*INSTRUMENT_KEYS, "target")
"""The keys that `[defaults]` may have; those of `[tables]` are the names of the tables."""


class JobFile(Section):
    """The whole of `job.toml`."""

    title: str | None = None
    date: Annotated[str | None, BeforeValidator(_as_text)] = None
    frame: FrameSection = FrameSection()
    datum: DatumSection = DatumSection()
    defaults: dict[str, str] = {}
    tables: dict[str, FileNames] = {}
    instruments: dict[str, Instrument] = {}
    targets: dict[str, Target] = {}
    statistics: StatisticsSection = StatisticsSection()
    tolerances: TolerancesSection = TolerancesSection()
    specification: SpecificationSection = SpecificationSection()

    def default_instrument(self, table: str) -> str | None:
        """The instrument of rows that name none: the table's own default before the general one.

        A level book has the level of the levels table where it has no own one.
        """
        usual = self.defaults.get("instrument")
        if table == "level_book":
            usual = self.defaults.get("levels_instrument", usual)
        return self.defaults.get(f"{table}_instrument", usual)


class JobFileReader:
    """Reads a job file, noting its mistakes."""

    def __init__(self, name: str, text: str, mistakes: Mistakes) -> None:
        self.name = name
        self.text = text
        self.mistakes = mistakes

    def complain(self, path: Sequence[str], message: str) -> None:
        """Note a mistake of one key, named with its sections: `("frame", "kind")`."""
        self.mistakes.add(self.name, line_of_key(self.text, list(path)), ".".join(path), message)

    def read(self) -> JobFile | None:
        """The job file without its mistaken keys, so that the tables can be read; None where it is no TOML."""
        try:
            content = tomllib.loads(self.text)
        except (ValueError, RecursionError) as error:
            self._not_toml(error)
            return None
        for path, code in _control_characters(content, ()):
            self.complain(path, f"there {NOT_PRINTABLE.format(code)}")
        return self._checked(content)

    def _not_toml(self, error: Exception) -> None:
        found = re.search(r" ?\(at line (\d+), column (\d+)\)| ?\(at end of document\)", str(error))
        line = int(found[1]) if found and found[1] else None
        what = str(error).replace(found[0], "") if found else "numbers too long or nested too deeply"
        where = f" at character {found[2]}" if found and line else " at its end"
        remedy = "; text needs quotation marks" if "Invalid value" in what else ""
        self.mistakes.add(self.name, line, None, f"is not valid TOML{where}: {what}{remedy}")

    def _checked(self, content: dict[str, Any]) -> JobFile | None:
        try:
            return JobFile.model_validate(content)
        except ValidationError as error:
            details = error.errors(include_url=False)
        for detail in details:
            path = [str(part) for part in detail["loc"]]
            if not self.mistakes.enough(self.name):
                self.complain(path, _explained(path, detail))
            _remove(content, detail["loc"])
        try:
            return JobFile.model_validate(content)
        except ValidationError:
            return None


def _control_characters(content: object, path: tuple[str, ...]) -> Iterator[tuple[tuple[str, ...], int]]:
    """Keys and values with a control character, which TOML lets an escape smuggle in: where, and its code."""
    if isinstance(content, dict):
        for key, value in content.items():
            yield from _control_characters(key, path)
            yield from _control_characters(value, (*path, key))
    elif isinstance(content, list):
        for entry in content:
            yield from _control_characters(entry, path)
    elif isinstance(content, str) and (found := CONTROL_CHARACTER.search(content)):
        yield path, ord(found[0])


def _remove(content: dict[str, Any], path: tuple[int | str, ...]) -> None:
    """Take the key at `path` out of nested tables; where the path leads on into a list, take out the whole list."""
    *sections, last = path
    for part in sections:
        inner = content.get(str(part))
        if not isinstance(inner, dict):
            last = part
            break
        content = inner
    content.pop(str(last), None)


def _explained(path: list[str], detail: ErrorDetails) -> str:
    """A mistake in words: what was read, what was expected."""
    kind, limits = detail["type"], detail.get("ctx", {})
    if kind == "extra_forbidden":
        return f"unknown key{Likeness(_known_keys(path)).suggestion(path[-1])}"
    read = f"read {shown(_written(detail['input']))}"
    if path == ["date"]:
        return f"{read}, expected a date such as 2026-04-18, or text in quotation marks"
    if kind == "literal_error":
        likely = Likeness(re.findall(r"'(\w+)'", limits["expected"])).suggestion(str(detail["input"]))
        return f"{read}, expected {limits['expected']}{likely}"
    expected = {
        "string_type": "text in quotation marks",
        "float_type": "a number",
        "bool_type": "true or false",
        "list_type": "a list in square brackets, of texts in quotation marks",
        "dict_type": "a section of keys",
        "model_type": "a section of keys",
        "finite_number": "a finite number",
        "greater_than": f"a number above {limits.get('gt')}",
        "greater_than_equal": f"a number of {limits.get('ge')} or more",
        "less_than": f"a number below {limits.get('lt')}",
        "less_than_equal": f"a number of {limits.get('le')} or less",
        "too_short": "at least one entry",
    }.get(kind)
    return f"{read}, expected {expected}" if expected else f"{read}: {detail['msg']}"


def _written(value: object) -> str:
    """A value about as the job file writes it."""
    if isinstance(value, bool):
        return str(value).lower()
    try:
        return str(value)
    except ValueError:
        return "an endless number"


_SECTIONS: dict[str, type[Section]] = {
    "frame": FrameSection,
    "datum": DatumSection,
    "instruments": Instrument,
    "targets": Target,
    "statistics": StatisticsSection,
    "tolerances": TolerancesSection,
    "specification": SpecificationSection,
}


def _known_keys(path: list[str]) -> list[str]:
    """The keys that may stand where the last of `path` does."""
    section = JobFile if len(path) == 1 else _SECTIONS[path[0]]
    return list(section.model_fields)


def line_of_key(text: str, path: list[str]) -> int | None:
    """The line on which a key of a job file is set, found by its own look at the text; None where it is written oddly.

    Falls back on the line of the section where the key itself is not found.
    """
    section: list[str] = []
    section_line: int | None = None
    for number, line in enumerate(text.splitlines(), 1):
        words = line.partition("#")[0].strip()
        if words.startswith("[") and words.endswith("]") and "=" not in words:
            section = _key_parts(words.strip("[]"))
            if section == path:
                return number
            section_line = number if section and section == path[: len(section)] else section_line
        elif "=" in words:
            key = section + _key_parts(words.partition("=")[0])
            if key == path[: len(key)]:
                return number
    return section_line


def _key_parts(dotted: str) -> list[str]:
    return [part.strip(" \t\"'") for part in dotted.split(".")]

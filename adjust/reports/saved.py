"""`results.json` read back, checked as it is read. The published schema of the file is made of these records."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError
from pydantic.json_schema import GenerateJsonSchema, JsonSchemaMode
from pydantic_core import CoreSchema

from adjust.errors import FieldDataError, Mistake
from adjust.reports.results import SCHEMA

RESULTS = "results.json"
SHOWN = 5
"""Faults of a file that are named: it is written by program, so that one fault explains the rest."""

Status = Literal["fixed", "weighted", "adjusted", "none"]
Height = Literal["orthometric", "ellipsoidal"]
Kind = Literal[
    "direction",
    "angle",
    "azimuth",
    "slope_distance",
    "horizontal_distance",
    "zenith",
    "height_difference",
    "vector",
    "control",
]
Figure = float | None
Figures = Figure | dict[str, Figure]
Row = tuple[Figure, Figure, Figure]


class Saved(BaseModel):
    """A record of the file. Keys that a later version adds are passed over."""

    model_config = ConfigDict(frozen=True, strict=True, allow_inf_nan=False, populate_by_name=True)


class JobRecord(Saved):
    """What was adjusted."""

    title: str
    frame: Literal["plane", "ellipsoid"]
    crs: str | None = Field(description="As the job file names it; null in a plane frame")
    input_sha256: str = Field(description="Of all files read")
    date: str | None = None
    heights: Height | None = Field(None, description="What height_m means; null in a plane frame")


class GlobalTestRecord(Saved):
    """Test of the sum of squares on its two-sided bounds; null without degrees of freedom."""

    statistic: Figure = Field(description="Weighted sum of squared residuals")
    lower: Figure
    upper: Figure
    confidence: float = Field(gt=0, lt=1, description="Of this test and of the confidence ellipses")
    passed: bool | None


class SolutionRecord(Saved):
    """The scalars of the adjustment."""

    observations: int = Field(ge=0, description="Scalars: a vector counts three")
    unknowns: int = Field(ge=0)
    datum_defect: int = Field(ge=0)
    degrees_of_freedom: int = Field(ge=0)
    iterations: int = Field(ge=0)
    converged: bool
    variance_factor: Figure
    global_test: GlobalTestRecord
    condition_number: Figure
    sd_basis: Literal["prior", "posterior"]
    second_opinion_gap: Figure = Field(None, description="Metres or radians")


class EllipseRecord(Saved):
    """An ellipse of a position or of a coordinate difference; null where there is none."""

    semi_major_mm: Figure
    semi_minor_mm: Figure
    azimuth_deg: float | None = Field(ge=0, lt=180, description="Of the major axis, clockwise from north")


class MarkRecord(Saved):
    """A mark."""

    mark: str
    plan_status: Status
    height_status: Status
    easting_m: Figure
    northing_m: Figure
    height_m: Figure
    latitude_deg: float | None = Field(ge=-90, le=90)
    longitude_deg: float | None = Field(ge=-360, le=360, description="East of Greenwich")
    ellipsoidal_height_m: Figure
    sd_easting_mm: Figure
    sd_northing_mm: Figure
    sd_height_mm: Figure
    covariance_mm2: tuple[Row, Row, Row] = Field(description="Of easting, northing and height")
    ellipse: EllipseRecord
    ellipse_confidence: EllipseRecord
    horizontal_95_mm: Figure
    height_95_mm: Figure
    description: str = ""


class ObservationRecord(Saved):
    """One component of one observation."""

    source: str = Field(description="File and line")
    kind: Kind
    component: Literal["x", "y", "z", "easting", "northing", "height"] | None
    at: str | None
    start: str | None = Field(alias="from")
    to: str | None
    setup: str | None
    unit: Literal["m", "deg"] = Field(description="Of the next five")
    observed: Figure
    adjusted: Figure
    residual: Figure = Field(description="Adjusted minus observed")
    sd: Figure
    minimal_detectable_bias: Figure
    redundancy: Figure
    w: Figure
    tau: Figure
    suspect: bool


class LineRecord(Saved):
    """Relative accuracy of two marks that an observation joins."""

    start: str = Field(alias="from")
    to: str
    distance_m: Figure
    ellipse: EllipseRecord
    ellipse_confidence: EllipseRecord
    sd_height_difference_mm: Figure


class StandardRecord(Saved):
    """A published standard that the job is held against."""

    name: str
    source: str
    year: int | None = Field(description="Of the edition, where its source states it")
    recalled: bool = Field(description="Whether a figure is from memory")


class WorstRecord(Saved):
    """A mark or a pair that uses most of what is allowed."""

    marks: list[str]
    distance_m: Figure
    figure_mm: Figure
    allowed_mm: Figure
    share: Figure = Field(description="Figure over what is allowed")
    passed: bool


class RequirementRecord(Saved):
    """One requirement of the specification: how many marks or pairs it was asked of, and how many fail."""

    measure: Literal["mark_plan", "mark_height", "pair_plan", "pair_height"]
    words: str
    rule: str
    standard: str | None
    recalled: bool
    assessed: int = Field(ge=0)
    failing: int = Field(ge=0)
    passed: bool | None
    worst: list[WorstRecord] = Field(description="All that fail, at least the worst, worst first")


class SpecificationRecord(Saved):
    """What the job was to keep, and whether it does."""

    passed: bool | None = Field(description="Null without a specification")
    pairs: Literal["observed", "all"]
    marks: list[str] = Field(description="Those that it applies to; none: all")
    standards: list[StandardRecord]
    checks: list[RequirementRecord]
    note: str


class WeightRecord(Saved):
    """How much a kind of observation weighs, and whether its sds were claimed rightly."""

    kind: Kind
    observations: int = Field(ge=0)
    unchecked: int = Field(ge=0)
    unit: Literal["m", "deg"] = Field(description="Of the sds")
    sd_smallest: Figure
    sd_median: Figure
    sd_largest: Figure
    weighted_square_sum: Figure
    redundancy: Figure
    sd_factor: Figure = Field(description="By which the sds would agree with the residuals as they stand")


class VarianceComponentRecord(Saved):
    """How well the sds of one group of observations were stated. None of it is applied."""

    name: str
    kind: Kind
    instrument: str | None
    file: str | None
    group: str | None
    merged: list[str] = Field(description="Groups too small by themselves that were put together here")
    observations: int = Field(ge=0, description="Scalars that took part")
    redundancy: Figure = Field(description="Sum of redundancy numbers, at the weights estimated")
    factor: Figure = Field(description="Of the sds; null where too little checks the group")
    sd: Figure = Field(description="Of the factor")
    lower: Figure
    upper: Figure
    confidence: float = Field(gt=0, lt=1, description="That the limits of all groups hold together")
    differs: bool | None = Field(description="Whether 1 lies outside the limits")
    left_out: list[str] = Field(description="Sources of observations that took no part")
    sentence: str


class ClosureRecord(Saved):
    """How one check before the adjustment went; check.json has every closure."""

    check: str
    closures: int = Field(ge=0)
    exceeding: int = Field(ge=0)
    largest_share: Figure = Field(description="Of what is allowed")


class WrittenRecord(Saved):
    """A cell of the book that a blunder rests on, and what the network expects there, both as the book writes."""

    source: str = Field(description="File and line")
    column: str
    text: str
    expected: str | None


class CorrectionRecord(Saved):
    """What a cell of the book would have to hold."""

    source: str
    column: str
    value: str = Field(description="Empty: a blank cell")


class ExplanationRecord(Saved):
    """A mistake that would have made the error."""

    mistake: str
    names: list[str] = Field([], description="In the catalogue of mistakes")
    corrected_value: Figures = Field(description="Of the observation; null where another entry changes")
    corrections: list[CorrectionRecord] = []
    w_after: Figure = Field(description="Misfit that the correction leaves, in its sds")
    odds: Figure = Field(description="Against all other explanations together")


class BlunderRecord(Saved):
    """An error that the observations give away, of one row (source) or shared by many (group)."""

    source: str | None
    group: str | None
    nature: str = "observation"
    kind: Kind | None = None
    component: str | None = None
    marks: list[str] = []
    sources: list[str] = Field([], description="Every row that it enters")
    unit: Literal["m", "deg", "1"]
    estimated_error: Figures = Field(description="Written minus true; by component where there are several")
    sd: Figures
    expected_value: Figures = Field(description="What should have been written")
    test: Figure
    critical: Figure
    alternatives: list[str] = Field(description="Sources or groups that could stand in its place")
    alternative_mistakes: list[str | None] = Field([], description="For each of these the likeliest mistake")
    deciding: str | None = Field(None, description="The observation whose repetition tells these apart")
    written: list[WrittenRecord] = []
    explanations: list[ExplanationRecord] = Field(description="The likeliest first; none: no common mistake")
    advice: str


class DecisionRecord(Saved):
    """What the surveyor decided of one line of the book."""

    source: str
    decision: Literal["keep", "leave_out", "correct"]
    column: str | None
    written: str
    value: str | None = Field(description="In place of what is written; null unless it is corrected")
    reason: str


class SavedResults(Saved):
    """The results of one adjustment. Numbers are SI unless the key names a unit; null where there is no such figure."""

    layout: Literal["hubtack-results/1"] = Field(alias="schema")
    job: JobRecord
    solution: SolutionRecord
    marks: list[MarkRecord]
    observations: list[ObservationRecord]
    relative: list[LineRecord]
    suspects: list[str] = Field(description="Sources of suspect observations, worst first")
    cautions: list[str]
    notes: list[str] = []
    specification: SpecificationRecord | None = None
    weights: list[WeightRecord] = []
    variance_components: list[VarianceComponentRecord] | None = Field(None, description="Null: nobody asked for them")
    closures: list[ClosureRecord] = []
    blunders: list[BlunderRecord] | None = Field(None, description="The plainest first; null: nobody searched")
    decisions: list[DecisionRecord] = []


def read_results(path: Path) -> SavedResults:
    """The results in the file `path`, or in the `results.json` of the folder `path`.

    Raises FieldDataError where there is none, or it does not hold what `hubtack adjust` writes.
    """
    file = path / RESULTS if path.is_dir() else path
    try:
        return SavedResults.model_validate_json(file.read_bytes())
    except OSError as error:
        message = f"cannot be read ({error.strerror}); give a {RESULTS} that hubtack adjust wrote, or its folder"
        raise FieldDataError([Mistake(str(file), None, None, message)]) from error
    except ValidationError as error:
        raise FieldDataError(_mistakes(file, error)) from error


def _mistakes(file: Path, error: ValidationError) -> list[Mistake]:
    faults = error.errors(include_url=False, include_context=False)
    return [
        Mistake(
            str(file),
            None,
            ".".join(map(str, fault["loc"])) or None,
            f"{fault['msg']}; expected what hubtack adjust writes ({SCHEMA}): adjust the job again",
        )
        for fault in faults[:SHOWN]
    ]


class _Published(GenerateJsonSchema):
    """Keys stand for themselves; repeated as titles they would only fill the page."""

    def field_title_should_be_set(self, schema: Any) -> bool:
        return False

    def generate(self, schema: CoreSchema, mode: JsonSchemaMode = "validation") -> dict[str, Any]:
        records = super().generate(schema, mode)
        return {"$schema": self.schema_dialect} | records | {"title": f"Hubtack results, {SCHEMA}"}


def published_schema() -> str:
    """The text of the JSON Schema (2020-12) of `results.json`."""
    schema = SavedResults.model_json_schema(schema_generator=_Published)
    return json.dumps(schema, indent=2, ensure_ascii=False) + "\n"

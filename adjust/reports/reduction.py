"""`reduction.json`: what raw readings said of themselves when they were made into observations."""

from __future__ import annotations

import json
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.job import Job
from adjust.reductions.outcome import FaceErrors, LevelsReduced, PointingsReduced, Reduced
from adjust.reductions.spread import Spread
from adjust.reports.records import Record
from adjust.units import ARCSEC

SCHEMA = "hubtack-reduction/1"
KINDS = ("directions", "zeniths", "slopes")
FACE = ("L", "R")
UNITS = {"directions": ("arcsec", ARCSEC), "zeniths": ("arcsec", ARCSEC), "slopes": ("mm", 1e-3)}
"""In which residuals and sds of each kind are written."""


def write_reduction(job: Job, path: Path) -> None:
    """One key a line and one line for each record."""
    parts = [f'"schema": {json.dumps(SCHEMA)}', f'"title": {json.dumps(job.title, ensure_ascii=False)}']
    for key, records in reduction_records(job).items():
        lines = ",\n".join(json.dumps(record, ensure_ascii=False, allow_nan=False) for record in records)
        parts.append(f'"{key}": [\n{lines}\n]' if lines else f'"{key}": []')
    path.write_text("{\n" + ",\n".join(parts) + "\n}\n", encoding="utf-8", newline="\n")


def reduction_records(job: Job) -> dict[str, list[Record]]:
    """Lists of records by name; those of a raw table that the job has not are empty."""
    names = job.marks.names
    pointings, levels = job.reduction.pointings, job.reduction.levels
    records: dict[str, list[Record]] = {
        "spreads": [] if pointings is None else [*spread_records(pointings, job.statistics.confidence)],
        "setups": [] if pointings is None else [*setup_records(pointings, job.statistics.confidence)],
    }
    for key, kind in (("collimations", "directions"), ("indices", "zeniths")):
        errors = None if pointings is None else getattr(pointings, kind).errors
        records[key] = [] if errors is None or pointings is None else [*_pairs(pointings, errors, names)]
    records["both_ends"] = [] if pointings is None else [*both_ends_records(pointings, names)]
    records["horizons"] = [] if pointings is None else [*_horizons(pointings, names)]
    for kind in KINDS:
        reduced = None if pointings is None else getattr(pointings, kind)
        records[f"{kind}_scatter"] = (
            [] if reduced is None or pointings is None else [*_scatter(pointings, kind, reduced, names)]
        )
    records["lines"] = [] if levels is None else [*line_records(levels)]
    records["sections"] = [] if levels is None else [*section_records(levels, names)]
    return records


def spread_records(pointings: PointingsReduced, confidence: float) -> Iterator[Record]:
    """The spread of each kind over all setups."""
    for kind in KINDS:
        reduced: Reduced = getattr(pointings, kind)
        if len(reduced.means):
            yield {"kind": kind, "means": len(reduced.means)} | _spread(reduced.spread(confidence))


def setup_records(pointings: PointingsReduced, confidence: float) -> Iterator[Record]:
    """Each setup: mean errors of the instrument over its pairs, spreads, the worst closure of its half-rounds."""
    setups = len(pointings.directions.redundancy)
    collimation, index = (_by_setup(part.errors, setups) for part in (pointings.directions, pointings.zeniths))
    closure = np.full(setups, np.nan)
    misclosure = np.abs(pointings.horizons.misclosure)
    np.fmax.at(closure, pointings.horizons.setup, misclosure)
    observed = np.zeros(setups, dtype=bool)
    for kind in KINDS:
        observed[getattr(pointings, kind).scatter.setup] = True
    for setup in np.flatnonzero(observed).tolist():
        record: Record = {"setup": pointings.setups[setup]}
        for name, (mean, sd, pairs) in (("collimation", collimation), ("index", index)):
            record |= {
                f"{name}_arcsec": _figure(mean[setup] / ARCSEC),
                f"{name}_sd_arcsec": _figure(sd[setup] / ARCSEC),
            }
            record[f"{name}_pairs"] = int(pairs[setup])
        record["worst_closure_arcsec"] = _figure(closure[setup] / ARCSEC)
        for kind in KINDS:
            reduced: Reduced = getattr(pointings, kind)
            spread, (ending, unit) = reduced.spread(confidence, setup), UNITS[kind]
            record[kind] = _spread(spread) | {f"sd_{ending}": _figure(spread.factor * reduced.stated[setup] / unit)}
        yield record


def _by_setup(errors: FaceErrors, setups: int) -> tuple[FloatArray, FloatArray, IntArray]:
    """Mean error, its scatter and the number of pairs (setups,); NaN without pairs, or with one for the scatter."""
    pairs = np.bincount(errors.setup, minlength=setups)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.bincount(errors.setup, errors.error, setups) / pairs
        square = np.bincount(errors.setup, (errors.error - mean[errors.setup]) ** 2, setups)
        sd = np.where(pairs > 1, np.sqrt(square / np.maximum(pairs - 1, 1)), np.nan)
    return mean, sd, pairs


def _spread(spread: Spread) -> Record:
    return {
        "statistic": _figure(spread.statistic),
        "redundancy": spread.redundancy,
        "factor": _figure(spread.factor),
        "lower": _figure(spread.test.lower),
        "upper": _figure(spread.test.upper),
        "passed": spread.test.passed,
    }


def _pairs(pointings: PointingsReduced, errors: FaceErrors, names: tuple[str, ...]) -> Iterator[Record]:
    for row in range(len(errors)):
        yield {
            "source": errors.provenance.label(row),
            "setup": pointings.setups[errors.setup[row]],
            "to": names[errors.mark[row]],
            "error_arcsec": _figure(errors.error[row] / ARCSEC),
        }


def _horizons(pointings: PointingsReduced, names: tuple[str, ...]) -> Iterator[Record]:
    horizons = pointings.horizons
    for row in range(len(horizons)):
        yield {
            "source": horizons.provenance.label(row),
            "setup": pointings.setups[horizons.setup[row]],
            "to": names[horizons.mark[row]],
            "face": FACE[horizons.face[row]],
            "misclosure_arcsec": _figure(horizons.misclosure[row] / ARCSEC),
        }


def both_ends_records(pointings: PointingsReduced, names: tuple[str, ...]) -> Iterator[Record]:
    """Distances measured from either end of a line, mark to mark, and how far apart they are beside their sds."""
    ends = pointings.both_ends
    for row in range(len(ends.mean)):
        yield {
            "from": names[ends.marks[row, 0]],
            "to": names[ends.marks[row, 1]],
            "mean_m": _figure(ends.mean[row]),
            "difference_mm": _figure(ends.difference[row] * 1e3),
            "sd_difference_mm": _figure(np.sqrt(ends.difference_variance[row]) * 1e3),
        }


def _scatter(pointings: PointingsReduced, kind: str, reduced: Reduced, names: tuple[str, ...]) -> Iterator[Record]:
    scatter, (ending, unit) = reduced.scatter, UNITS[kind]
    for row in range(len(scatter)):
        yield {
            "source": scatter.provenance.label(row),
            "setup": pointings.setups[scatter.setup[row]],
            "to": names[scatter.mark[row]],
            f"residual_{ending}": _figure(scatter.residual[row] / unit),
            f"sd_{ending}": _figure(scatter.sd[row] / unit),
        }


def line_records(levels: LevelsReduced) -> Iterator[Record]:
    """The arithmetic check of each line."""
    check = levels.check
    for row in np.unique(levels.line).tolist():
        yield {
            "line": levels.lines[row],
            "backsights_m": _figure(check.backsights[row]),
            "foresights_m": _figure(check.foresights[row]),
            "rises_m": _figure(check.rises[row]),
            "difference_mm": _figure(round(check.difference[row] * 1e3, 6) + 0.0),
        }


def section_records(levels: LevelsReduced, names: tuple[str, ...]) -> Iterator[Record]:
    """Each section and side shot."""
    sections = levels.sections
    for row in range(len(levels.sd)):
        yield {
            "source": levels.provenance.label(row),
            "line": levels.lines[levels.line[row]],
            "from": names[levels.marks[row, 0]],
            "to": names[levels.marks[row, 1]],
            "side_shot": bool(sections.side[row]),
            "rise_m": _figure(sections.rise[row]),
            "sd_mm": _figure(levels.sd[row] * 1e3),
            "setups": int(sections.setups[row]),
            "length_m": _figure(sections.length[row]),
            "imbalance_m": _figure(sections.imbalance[row]),
            "correction_mm": _figure(sections.correction[row] * 1e3),
        }


def _figure(value: float) -> float | None:
    """A finite float, or None."""
    return float(value) if np.isfinite(value) else None

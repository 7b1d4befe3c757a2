"""`reduction.txt`: what became of the raw readings, for people; a short form of it stands in the listing."""

from __future__ import annotations

from pathlib import Path

from adjust.job import Job
from adjust.reductions.outcome import LevelsReduced, PointingsReduced
from adjust.reports.layout import Column, facts, paragraph, shown_of, table, title
from adjust.reports.records import Record
from adjust.reports.reduction import (
    KINDS,
    both_ends_records,
    line_records,
    reduction_records,
    section_records,
    setup_records,
    spread_records,
)
from adjust.reports.wording import counted, decimals

NAMES = {"directions": "directions", "zeniths": "zenith angles", "slopes": "slope distances"}
CLOSURES_LISTED = 20
"""The largest: a good half-round closes to nothing worth reading."""
LISTED = 1000
"""Rows of one table; reduction.json has them all."""


def write_reduction_text(job: Job, path: Path) -> None:
    """Write the whole of it."""
    path.write_text("\n".join(reduction_text(job)) + "\n", encoding="utf-8", newline="\n")


def reduction_text(job: Job, most: int = LISTED) -> list[str]:
    """Its lines; no table has more than `most` rows."""
    pointings, levels = job.reduction.pointings, job.reduction.levels
    heading = job.title if job.date is None else f"{job.title}, {job.date}"
    lines = [*paragraph(heading), "", *paragraph(reduction_verdict(job))]
    if pointings is not None:
        lines += [*title("Pointings"), *facts(spread_facts(job, pointings)), *_setups(job, pointings, most)]
        lines += [*_both_ends(job, pointings, most), *_horizons(job, most)]
    if levels is not None:
        lines += [*_lines(levels, most), *_sections(job, levels, most)]
    if job.notes:
        lines += [*title("Notes"), *(line for note in job.notes for line in paragraph(f"- {note}"))]
    return lines


def listed_reduction(job: Job) -> list[str]:
    """The section of the listing: nothing where the job has no raw tables."""
    pointings, levels = job.reduction.pointings, job.reduction.levels
    if pointings is None and levels is None:
        return []
    lines = [*title("Raw readings"), *paragraph(reduction_verdict(job))]
    return lines if pointings is None else [*lines, "", *facts(spread_facts(job, pointings))]


def reduction_verdict(job: Job) -> str:
    """A sentence or two: what was made, and whether the readings scatter as the instruments promise."""
    pointings, levels = job.reduction.pointings, job.reduction.levels
    made = []
    if pointings is not None:
        made += [f"{len(getattr(pointings, kind).means)} {NAMES[kind]}" for kind in KINDS]
    if levels is not None:
        made.append(counted(len(levels.sd), "height difference", "height differences"))
    if not made:
        return "The job has no raw readings: nothing was reduced."
    wide = [] if pointings is None else wider_than_stated(job, pointings)
    verdict = f"Scatter beyond what the job file states: {', '.join(wide)}." if wide else "Their scatter is as stated."
    return f"Raw readings made {', '.join(made)}. {verdict if pointings is not None else ''}".rstrip()


def wider_than_stated(job: Job, pointings: PointingsReduced) -> list[str]:
    """Kinds whose readings, over all setups, scatter significantly more than their sds promise."""
    return [
        NAMES[record["kind"]]
        for record in spread_records(pointings, job.statistics.confidence)
        if record["upper"] is not None and record["statistic"] > record["upper"]
    ]


def spread_facts(job: Job, pointings: PointingsReduced) -> list[tuple[str, str]]:
    """The spread of each kind."""
    return [
        (f"Spread of {NAMES[record['kind']]}", _spread_in_words(record))
        for record in spread_records(pointings, job.statistics.confidence)
    ]


def _spread_in_words(record: Record) -> str:
    if not record["redundancy"]:
        return "no readings beyond those that were needed"
    bounds = f"χ² {record['statistic']:.1f} within {record['lower']:.1f} … {record['upper']:.1f}"
    if not record["passed"]:
        bounds = bounds.replace("within", "outside")
    return f"{record['factor']:.2f} × the sd stated ({bounds}, {record['redundancy']} degrees of freedom)"


def _setups(job: Job, pointings: PointingsReduced, most: int) -> list[str]:
    columns = (
        Column("setup", text=True),
        Column("pairs"),
        Column("collimation", "″"),
        Column("scatter", "″"),
        Column("index", "″"),
        Column("scatter", "″"),
        Column("closure", "″"),
        Column("directions", "″"),
        Column("zeniths", "″"),
        Column("slopes", "mm"),
    )
    records = [*setup_records(pointings, job.statistics.confidence)]
    rows = [
        (
            record["setup"],
            str(max(record["collimation_pairs"], record["index_pairs"]) or ""),
            decimals(record["collimation_arcsec"], 1, signed=True),
            decimals(record["collimation_sd_arcsec"], 1),
            decimals(record["index_arcsec"], 1, signed=True),
            decimals(record["index_sd_arcsec"], 1),
            decimals(record["worst_closure_arcsec"], 1),
            *(_marked(record[kind], ending) for kind, ending in zip(KINDS, ("arcsec", "arcsec", "mm"), strict=True)),
        )
        for record in records[:most]
    ]
    explained = paragraph(
        "Of each setup: mean collimation and index error over its pairs of faces and their scatter, the worst closure "
        "of its half-rounds, and the sds that its rounds show of a direction and a zenith angle on both faces and of a "
        "distance (! outside the bounds that χ² sets about the sd stated)."
    )
    return [
        "",
        *explained,
        "",
        *table(columns, rows),
        *shown_of(len(rows), len(records), "the first", "reduction.json"),
    ]


def _marked(spread: Record, ending: str) -> str:
    """The sd found, and whether it is outside the bounds of the one stated."""
    sd = spread[f"sd_{ending}"]
    return "" if sd is None else f"{sd:.2f}{' ' if spread['passed'] else '!'}"


def _both_ends(job: Job, pointings: PointingsReduced, most: int) -> list[str]:
    records = [*both_ends_records(pointings, job.marks.names)]
    if not records:
        return []
    columns = (
        Column("from", text=True),
        Column("to", text=True),
        Column("mean", "m"),
        Column("there − back", "mm"),
        Column("sd", "mm"),
    )
    rows = [
        (
            record["from"],
            record["to"],
            decimals(record["mean_m"], 4),
            decimals(record["difference_mm"], 2, signed=True),
            decimals(record["sd_difference_mm"], 2),
        )
        for record in records[:most]
    ]
    return [
        *title("Distances from both ends, mark to mark"),
        *table(columns, rows),
        *shown_of(len(rows), len(records), "the first", "reduction.json"),
    ]


def _horizons(job: Job, most: int) -> list[str]:
    records = sorted(reduction_records(job)["horizons"], key=lambda record: -abs(record["misclosure_arcsec"]))
    if not records:
        return []
    columns = (
        Column("setup", text=True),
        Column("to", text=True),
        Column("face", text=True),
        Column("misclosure", "″"),
        Column("source", text=True),
    )
    rows = [
        (r["setup"], r["to"], r["face"], decimals(r["misclosure_arcsec"], 1, signed=True), r["source"])
        for r in records[: min(most, CLOSURES_LISTED)]
    ]
    return [
        *title("Horizon closures, largest first"),
        *table(columns, rows),
        *shown_of(len(rows), len(records), "the largest", "reduction.json"),
    ]


def _lines(levels: LevelsReduced, most: int) -> list[str]:
    columns = (
        Column("line", text=True),
        Column("ΣB", "m"),
        Column("ΣF", "m"),
        Column("ΣB − ΣF", "m"),
        Column("Σ rises", "m"),
        Column("difference", "mm"),
    )
    records = [*line_records(levels)]
    rows = [
        (
            record["line"],
            decimals(record["backsights_m"], 4),
            decimals(record["foresights_m"], 4),
            decimals(record["backsights_m"] - record["foresights_m"], 4, signed=True),
            decimals(record["rises_m"], 4, signed=True),
            decimals(record["difference_mm"], 2, signed=True),
        )
        for record in records[:most]
    ]
    return [
        *title("Level lines: arithmetic check"),
        *table(columns, rows),
        *shown_of(len(rows), len(records), "the first", "reduction.json"),
    ]


def _sections(job: Job, levels: LevelsReduced, most: int) -> list[str]:
    columns = (
        Column("line", text=True),
        Column("from", text=True),
        Column("to", text=True),
        Column("", text=True),
        Column("rise", "m"),
        Column("sd", "mm"),
        Column("setups"),
        Column("length", "m"),
        Column("imbalance", "m"),
        Column("corrected", "mm"),
    )
    records = [*section_records(levels, job.marks.names)]
    rows = [
        (
            record["line"],
            record["from"],
            record["to"],
            "side shot" if record["side_shot"] else "",
            decimals(record["rise_m"], 5, signed=True),
            decimals(record["sd_mm"], 2),
            str(record["setups"]),
            decimals(record["length_m"], 1),
            decimals(record["imbalance_m"], 1, signed=True),
            decimals(record["correction_mm"] or None, 2, signed=True),
        )
        for record in records[:most]
    ]
    return [
        *title("Sections between marks"),
        *table(columns, rows),
        *shown_of(len(rows), len(records), "the first", "reduction.json"),
    ]

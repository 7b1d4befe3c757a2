"""Saved records as flat rows: one name, with its unit, for each figure."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from adjust.reports.saved import EllipseRecord, LineRecord, MarkRecord, ObservationRecord, SavedResults
from adjust.reports.tables import COVARIANCE_COLUMNS, VALUES

Cell = str | float | int | bool | None
Row = dict[str, Cell]


def mark_row(mark: MarkRecord) -> Row:
    """The columns of `coordinates.csv`."""
    row: Row = {}
    for key, value in mark:
        if key == "covariance_mm2":
            row |= {name: value[place[0]][place[1]] for name, place in COVARIANCE_COLUMNS.items()}
        else:
            row |= flat(key, value)
    return row


def line_row(line: LineRecord, kinds: Iterable[str], suspects: Iterable[str]) -> Row:
    """The figures of `relative`, the kinds of observation along the line, and the suspect ones among them."""
    row: Row = {"from": line.start, "to": line.to, "kinds": " ".join(kinds), "suspects": " ".join(suspects)}
    for key, value in line:
        if key not in ("start", "to"):
            row |= flat(key, value)
    return row


def observation_row(observation: ObservationRecord) -> Row:
    """The columns of `residuals.csv`: a value in metres and the same in degrees, one of them empty."""
    row: Row = {}
    for key, value in observation:
        name = "from" if key == "start" else key
        if key in VALUES:
            row |= {f"{name}_{unit}": value if observation.unit == unit else None for unit in ("m", "deg")}
        else:
            row[name] = value
    row["suspect"] = "yes" if observation.suspect else "no"
    return row


def flat(key: str, value: EllipseRecord | Cell) -> Row:
    """One cell, or one for each figure of an ellipse."""
    if isinstance(value, EllipseRecord):
        return {f"{key}_{name}": figure for name, figure in value}
    return {key: value}


def lines_observed(
    results: SavedResults,
) -> tuple[Mapping[frozenset[str], list[str]], Mapping[frozenset[str], list[str]]]:
    """Kinds of observation, and sources of suspect ones, by the pair of marks that they join, each named once."""
    kinds: dict[frozenset[str], dict[str, None]] = {}
    suspects: dict[frozenset[str], dict[str, None]] = {}
    for observation in results.observations:
        for pair in _pairs(observation):
            kinds.setdefault(pair, {})[observation.kind] = None
            if observation.suspect:
                suspects.setdefault(pair, {})[observation.source] = None
    return _listed(kinds), _listed(suspects)


def _pairs(observation: ObservationRecord) -> list[frozenset[str]]:
    """The lines of an observation: an angle has two, control none."""
    at, start, to = observation.at, observation.start, observation.to
    legs = [(at, start), (at, to)] if at is not None else [(start, to)]
    return [frozenset((first, second)) for first, second in legs if first is not None and second is not None]


def _listed(found: Mapping[frozenset[str], Mapping[str, None]]) -> dict[frozenset[str], list[str]]:
    return {pair: list(names) for pair, names in found.items()}

"""The heights of instrument and target: not entered, changed over, or those of another setup."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import HEIGHTS, Entry, Suspect
from adjust.observations.sighted import HeightedSight

LEAST_SPREAD = 0.05
"""Metres: how far a height may lie from the others of a job at least, 1σ. Tripods are set up for the same eyes: common
practice, no source."""


class HeightMissing:
    """A blank cell, or a zero, where other sights have a height."""

    name = "height missing"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """What other sights have at the same mark; else about what they have anywhere."""
        parts = [self._of_entry(suspect, entry) for entry in entries_of(suspect) if not written_height(suspect, entry)]
        return Candidates.together(parts)

    def _of_entry(self, suspect: Suspect, entry: Entry) -> Candidates | None:
        marks, heights = heights_of(suspect, entry)
        given = heights[heights != 0.0]
        if not len(given):
            return None
        here = np.unique(heights[(marks == suspect_mark(suspect, entry)) & (heights != 0.0)])
        known = entry.valued(here, lambda place: f"{words(entry)} not entered") if len(here) else None
        unknown = self._unknown(entry, float(given.mean()), max(float(given.std()), LEAST_SPREAD))
        together = Candidates.together([known, unknown])
        return None if together is None else replace(together, rarity=float(np.mean(heights == 0.0)))

    @staticmethod
    def _unknown(entry: Entry, mean: float, spread: float) -> Candidates:
        at_mean, further = entry.error_of(np.array([mean, mean + spread]))

        def remedy(place: int, error: FloatArray) -> Remedy:
            along = further - at_mean
            height = mean + spread * float((error - at_mean) @ along / (along @ along))
            return entry.remedy(f"{words(entry)} not entered, by the network", entry.notation.write(height), height)

        return Candidates(at_mean[None], np.ones(1), remedy, (further - at_mean)[None])


class HeightsExchanged:
    """The instrument's height in the target's column and the reverse."""

    name = "heights exchanged"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The two heights of the sight, or of the first sight of a group, changed over."""
        row = suspect.row_itself
        if not isinstance(row, HeightedSight) or row.heights[0, 0] == row.heights[0, 1]:
            return None
        if suspect.heights:
            other = suspect.copies(1, heights=row.heights[:, ::-1])
            entries = suspect.heights
            texts = [entry.cell.text for entry in reversed(entries)]
            corrections = tuple(entry.correction(text) for entry, text in zip(entries, texts, strict=True))
            detail = f"{texts[0]} and {texts[1]} in place of the reverse"
            remedy = Remedy("instrument and target height exchanged", detail, corrections, other)
            return Candidates.listed(suspect.error_if(other), [remedy])
        if suspect.nature in ("instrument height", "target height"):
            entry = suspect.values[0]
            other_role = 1 - HEIGHTS.index(entry.name)
            what = f"{words(entry)} exchanged with that of the other end"
            return entry.valued(row.heights[:, other_role], lambda place: what)
        return None


class HeightOfAnotherSetup:
    """A height that belongs to another setup or target of the job."""

    name = "height of another setup"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """Every height that the job has in the same column."""
        parts = []
        for entry in entries_of(suspect):
            _, heights = heights_of(suspect, entry)
            written = written_height(suspect, entry)
            others = np.setdiff1d(heights, [written, 0.0])
            if written and len(others):
                parts.append(entry.valued(others, lambda place, entry=entry: f"{words(entry)} of another setup"))  # type: ignore[misc]
        return Candidates.together(parts)


def entries_of(suspect: Suspect) -> tuple[Entry, ...]:
    """The heights that a sight, or a group of sights, rests on."""
    return suspect.values if suspect.nature in ("instrument height", "target height") else suspect.heights


def written_height(suspect: Suspect, entry: Entry) -> float:
    """The height as it is used, metres; 0 where none was written."""
    return float(suspect.row_itself.heights[0, HEIGHTS.index(entry.name)])


def suspect_mark(suspect: Suspect, entry: Entry) -> int:
    """The mark below the instrument or the target."""
    return int(suspect.row_itself.marks[0, HEIGHTS.index(entry.name)])


def heights_of(suspect: Suspect, entry: Entry) -> tuple[IntArray, FloatArray]:
    """Marks and heights (rows,) of all sights of the job in the column of `entry`; 0 where none was written."""
    role = HEIGHTS.index(entry.name)
    sights = [rows for rows in suspect.job.observations if isinstance(rows, HeightedSight)]
    return (
        np.concatenate([rows.marks[:, role] for rows in sights]),
        np.concatenate([rows.heights[:, role] for rows in sights]),
    )


def words(entry: Entry) -> str:
    """Instrument height, target height."""
    return entry.name.replace("_", " ")

"""The heights of instrument and target: not entered, changed over, or those of another setup."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.mistakes.entries import HEIGHTS, SHARED_HEIGHTS
from adjust.blunders.mistakes.entry import Entry
from adjust.blunders.mistakes.interface import Candidates, Remedy
from adjust.blunders.mistakes.suspect import Suspect
from adjust.observations.sighted import HeightedSight

LEAST_SPREAD = 0.05
"""Metres: how far a height may lie from the others of a job at least, 1σ. Tripods are set up for the same eyes: common
practice, no source."""


@dataclass(frozen=True)
class Height:
    """One height of the suspect among those (rows,) that the job has in the same column, and their marks."""

    entry: Entry
    role: int
    written: float
    mark: int
    marks: IntArray
    heights: FloatArray

    @property
    def words(self) -> str:
        """Instrument height, target height."""
        return self.entry.name.replace("_", " ")

    @property
    def given(self) -> FloatArray:
        """All heights that were written and are not this one."""
        given: FloatArray = self.heights[(self.heights != 0.0) & (self.heights != self.written)]
        return given

    @property
    def coincidence(self) -> float:
        """How often two marks have exactly the same height, by the other marks; one more is added, as none seen does
        not mean never (Laplace's rule of succession)."""
        pairs = np.unique(np.column_stack([self.marks, self.heights]), axis=0)
        others = pairs[pairs[:, 0] != self.mark, 1]
        _, count = np.unique(others, return_counts=True)
        return float((count[count > 1].sum() + 1) / (len(others) + 2))

    @property
    def is_another_marks(self) -> bool:
        """Whether another mark has exactly this height."""
        return bool(np.any((self.heights == self.written) & (self.marks != self.mark)))

    @property
    def at_the_mark(self) -> FloatArray:
        """Other heights (k,) than the written one that sights have at the same mark."""
        here = self.heights[self.marks == self.mark]
        return np.setdiff1d(here, [0.0, self.written])

    @property
    def odd_ones(self) -> float:
        """Share of the rows that have another height than most have at their mark."""
        pairs, place, count = np.unique(
            np.column_stack([self.marks, self.heights]), axis=0, return_inverse=True, return_counts=True
        )
        most = np.zeros(int(self.marks.max()) + 1, dtype=np.int64)
        np.maximum.at(most, pairs[:, 0].astype(np.int64), count)
        return float(np.mean(count[place.reshape(-1)] < most[self.marks]))

    def own(self, what: str) -> Candidates | None:
        """The heights that other sights have at the same mark."""
        here = self.at_the_mark
        return self.entry.valued(here, lambda place: f"{self.words} {what}") if len(here) else None

    def usual(self, what: str) -> Candidates | None:
        """Any height like the others of the job."""
        if not len(self.given):
            return None
        mean, spread = float(self.given.mean()), max(float(self.given.std()), LEAST_SPREAD)
        at_mean, further = self.entry.error_of(np.array([mean, mean + spread]))
        along = further - at_mean

        def remedy(place: int, error: FloatArray) -> Remedy:
            height = mean + spread * float((error - at_mean) @ along / (along @ along))
            return self.entry.remedy(f"{self.words} {what}", self.entry.notation.write(height), height)

        return Candidates(at_mean[None], np.ones(1), remedy, along[None]) if along.any() else None


def heights_of(suspect: Suspect) -> Iterator[Height]:
    """The heights that a sight, or a group of sights, rests on."""
    shared = suspect.nature in SHARED_HEIGHTS
    sights = [rows for rows in suspect.job.observations if isinstance(rows, HeightedSight)]
    for entry in suspect.values if shared else suspect.heights:
        role = HEIGHTS.index(entry.name)
        yield Height(
            entry,
            role,
            float(suspect.row_itself.heights[0, role]),
            int(suspect.row_itself.marks[0, role]),
            np.concatenate([rows.marks[:, role] for rows in sights]),
            np.concatenate([rows.heights[:, role] for rows in sights]),
        )


class HeightMissing:
    """A blank cell, or a zero, where other sights have a height."""

    name = "height missing"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """What other sights have at the same mark; else about what they have anywhere."""
        parts = [self._of(height) for height in heights_of(suspect) if height.written == 0.0]
        return Candidates.together(parts)

    @staticmethod
    def _of(height: Height) -> Candidates | None:
        found = Candidates.together([height.own("not entered"), height.usual("not entered, by the network")])
        return None if found is None else replace(found, rarity=float(np.mean(height.heights == 0.0)))


class HeightOfAnotherSetup:
    """A height that belongs to another setup or target: the one before, not changed."""

    name = "height of another setup"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """What other sights have at the same mark; where the height is exactly another mark's, any usual one."""
        return Candidates.together([self._of(height) for height in heights_of(suspect) if height.written != 0.0])

    @staticmethod
    def _of(height: Height) -> Candidates | None:
        own = height.own("of another setup")
        if own is not None:
            return replace(own, rarity=height.odd_ones)
        if not height.is_another_marks:
            return None
        usual = height.usual("of another setup, the right one by the network")
        return None if usual is None else replace(usual, rarity=height.coincidence)


class HeightsExchanged:
    """The instrument's height in the target's column and the reverse."""

    name = "heights exchanged"

    def candidates(self, suspect: Suspect) -> Candidates | None:
        """The two heights of the sight changed over."""
        row = suspect.row_itself
        if not suspect.heights or row.heights[0, 0] == row.heights[0, 1]:
            return None
        other = suspect.copies(1, heights=row.heights[:, ::-1])
        entries = suspect.heights
        texts = [entry.cell.text for entry in reversed(entries)]
        corrections = tuple(entry.correction(text) for entry, text in zip(entries, texts, strict=True))
        detail = f"{texts[0] or 'a blank'} and {texts[1] or 'a blank'} in place of the reverse"
        remedy = Remedy("instrument and target height exchanged", detail, corrections, other)
        found = Candidates.listed(suspect.error_if(other), [remedy])
        theirs = [height for height in heights_of(suspect) if row.heights[0, 1 - height.role] in height.at_the_mark]
        return replace(found, rarity=min(height.odd_ones for height in theirs)) if theirs else found

"""The table of marks: coordinates into the frame, control, geoid heights and deflections."""

from __future__ import annotations

import numpy as np

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.field_book.columns import TableRows
from adjust.field_book.mistakes import ENOUGH, Mistakes
from adjust.field_book.vocabulary import NO_NAME, Vocabulary
from adjust.frames import EllipsoidFrame, Frame
from adjust.job import Control, Marks

_CONTROL = np.array([Control.FREE, Control.FIXED, Control.WEIGHTED])
"""The `Control` of each word, in the order of the schema's choices."""

PLAN, HEIGHT = slice(0, 2), slice(2, 3)


class MarkReader:
    """Makes `Marks` of the rows of `marks.csv`, noting what is wrong with them."""

    def __init__(self, rows: TableRows, names: Vocabulary, descriptions: Vocabulary, mistakes: Mistakes) -> None:
        self.rows = rows
        self.names = names
        self.descriptions = descriptions
        self.mistakes = mistakes

    def read(self, frame: Frame) -> Marks:
        """The marks; meaningful only where no mistake was noted."""
        self.check_names()
        grid, geographic = self._numbers("easting", "northing"), self._numbers("longitude", "latitude")
        written = np.where(np.isnan(geographic), grid, geographic)
        given = np.column_stack([self._plan(frame, grid, geographic), self.rows.numbers["height"]])
        control = np.column_stack([_CONTROL[self.rows.indices[f"{part}_control"]] for part in ("plan", "height")])
        sd = self._numbers("sd_easting", "sd_northing", "sd_height")
        self._check_control("plan", control[:, 0], written, sd[:, PLAN])
        self._check_control("height", control[:, 1], given[:, HEIGHT], sd[:, HEIGHT])
        texts = (*self.descriptions.names, "")
        return Marks(
            names=tuple(self.names.names),
            given=given,
            control=control,
            sd=sd,
            geoid=np.nan_to_num(self.rows.numbers["geoid"]),
            deflection=np.nan_to_num(self._numbers("deflection_north", "deflection_east")),
            descriptions=tuple(texts[number] for number in self.rows.indices["description"]),
            provenance=self.rows.provenance,
        )

    def _numbers(self, *names: str) -> FloatArray:
        return np.column_stack([self.rows.numbers[name] for name in names])

    def _complain(self, where: BoolArray, column: str, message: str) -> None:
        for row in np.flatnonzero(where)[:ENOUGH]:
            self.rows.complain(self.mistakes, int(row), column, message.format(mark=repr(self._name(row))))

    def _name(self, row: int) -> str:
        return self.names.names[int(self.rows.indices["mark"][row])]

    def check_names(self) -> None:
        """Note marks that stand twice, and names that no listing could print."""
        number = self.rows.indices["mark"]
        named = np.flatnonzero(number != NO_NAME)
        _, first = np.unique(number[named], return_index=True)
        again = np.setdiff1d(named, named[first])
        if len(again):
            first_row: IntArray = np.full(len(self.names.names), -1)
            first_row[number[named[first]]] = named[first]
            for row in again[:ENOUGH]:
                earlier = int(first_row[number[row]])
                self.rows.complain(self.mistakes, int(row), "mark", self._twice(int(row), earlier))
        odd = np.array([not name.isprintable() for name in self.names.names], dtype=bool)
        if odd.any():
            self._complain((number != NO_NAME) & odd[number], "mark", "{mark} holds characters that cannot be printed")

    def _twice(self, row: int, earlier: int) -> str:
        message = f"mark {self._name(row)!r} stands already in {self.rows.provenance.label(earlier)}"
        heights = self.rows.numbers["height"][[earlier, row]]
        if heights[0] != heights[1] and not np.isnan(heights).any():
            return f"{message}, with another height ({heights[0]:g} m there, {heights[1]:g} m here); keep the right row"
        return f"{message}; keep one row for each mark"

    def _plan(self, frame: Frame, grid: FloatArray, geographic: FloatArray) -> FloatArray:
        """Plan coordinates (n, 2) in the frame, NaN where none are given."""
        for pair, names in ((grid, ("easting", "northing")), (geographic, ("longitude", "latitude"))):
            lacks = np.isnan(pair)
            for column in (0, 1):
                message = f"mark {{mark}} has a {names[1 - column]} and no {names[column]}; give both or neither"
                self._complain(lacks[:, column] & ~lacks[:, 1 - column], names[column], message)
        if not isinstance(frame, EllipsoidFrame):
            message = "a plane frame has no latitude and longitude; give eastings and northings, or an ellipsoid frame"
            self._refuse("latitude", geographic, message)
            return grid
        if frame.is_geographic:
            message = (
                "a geographic CRS has no eastings and northings; give latitudes and longitudes, or a projected CRS"
            )
            self._refuse("easting", grid, message)
        turns = np.sign(geographic[:, 0]) * (np.abs(geographic[:, 0]) > np.pi)
        geographic = geographic - np.column_stack([turns * 2 * np.pi, np.zeros_like(turns)])
        return np.where(np.isnan(geographic), self._unprojected(frame, grid), geographic)

    def _refuse(self, column: str, values: FloatArray, message: str) -> None:
        """Note once, on the first row that has one, that a column is of no use in this frame."""
        present = np.flatnonzero(~np.isnan(values).all(axis=1))
        if len(present):
            self.rows.complain(self.mistakes, int(present[0]), column, message)

    def _unprojected(self, frame: EllipsoidFrame, grid: FloatArray) -> FloatArray:
        if np.isnan(grid).all():
            return np.full_like(grid, np.nan)
        plan = frame.from_grid(grid)
        lost = ~np.isnan(grid[:, 0] + grid[:, 1]) & np.isnan(plan[:, 0] + plan[:, 1])
        message = (
            "mark {mark} lies where the map projection has no inverse; check the coordinates, their unit and the CRS"
        )
        if not frame.is_geographic:
            self._complain(lost, "easting", message)
        return plan

    def _check_control(self, part: str, control: IntArray, given: FloatArray, sd: FloatArray) -> None:
        word = {"plan": ("easting", "its plan coordinates"), "height": ("height", "a height")}[part]
        missing = np.isnan(given).any(axis=1)
        for held, verb in ((Control.FIXED, "fixed"), (Control.WEIGHTED, "weighted")):
            message = f"mark {{mark}} is {verb} and lacks {word[1]}; give it, or make its {part}_control 'free'"
            self._complain((control == held) & missing, word[0], message)
        lacks_sd = (control == Control.WEIGHTED) & np.isnan(sd).any(axis=1)
        message = f"mark {{mark}} is weighted in {part} and has no sd; give it, or make its {part}_control 'fixed'"
        self._complain(lacks_sd, f"sd_{word[0]}", message)

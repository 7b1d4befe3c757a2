"""Everything that is supposed to be wrong, in turn: each observation, each correlated one as a whole, each group."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import block_diag, csc_array, csr_array, hstack

from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.blunders.evidence import LEAST_INFORMATION, Evidence
from adjust.blunders.groups import Group, find_groups
from adjust.blunders.hypothesis import Hypothesis
from adjust.blunders.information import DenseInformation, InformationMatrix, SparseInformation
from adjust.blunders.system import System
from adjust.model import Block

MOST_DENSE = 2500
"""Columns up to which all of G is held, 50 MB; beyond it comes column by column, from the factor."""


@dataclass(frozen=True)
class Hypotheses:
    """All hypotheses of a system, numbered: components in the order of system rows, then whole vectors, then groups.

    `considered` system rows, ascending and of correlated observations whole, are the only ones supposed to be wrong by
    themselves, where they are given.
    """

    system: System
    groups: tuple[Group, ...]
    considered: IntArray | None = None

    @classmethod
    def of(cls, system: System, interesting: IntArray | None = None, considered: IntArray | None = None) -> Hypotheses:
        """With all groups, or those that enter one of the `interesting` system rows."""
        mask = None
        if interesting is not None:
            mask = np.zeros(system.model.observation_rows, dtype=bool)
            mask[interesting] = True
        return cls(system, tuple(find_groups(system, mask)), considered)

    @cached_property
    def singles(self) -> IntArray:
        """System rows, ascending, that are the hypotheses of single components."""
        return np.arange(self.system.model.observation_rows) if self.considered is None else self.considered

    @property
    def rows(self) -> int:
        """How many they are."""
        return len(self.singles)

    @cached_property
    def _whole(self) -> list[tuple[int, int]]:
        """Kind and row of the correlated observations among them, which are the next hypotheses."""
        return [
            (place, int(row))
            for place, block in enumerate(self.system.model.blocks)
            if block.components > 1
            for row in (self._of_block(block) - block.offset)[:: block.components] // block.components
        ]

    def _of_block(self, block: Block) -> IntArray:
        first, last = np.searchsorted(self.singles, [block.system_rows.start, block.system_rows.stop])
        return self.singles[first:last]

    @cached_property
    def first_group(self) -> int:
        """Number of the first group."""
        return self.rows + len(self._whole)

    def hypothesis(self, number: int) -> Hypothesis:
        """One of them, with its words."""
        if number >= self.first_group:
            return self.groups[number - self.first_group].hypothesis
        blocks = self.system.model.blocks
        if number >= self.rows:
            place, row = self._whole[number - self.rows]
            return _of_row(place, blocks[place], row, blocks[place].observations.components)
        place, row, component = self._component(number)
        return _of_row(place, blocks[place], row, (blocks[place].observations.components[component],))

    def _component(self, number: int) -> tuple[int, int, int]:
        """Kind, row and component of a single."""
        system_row = int(self.singles[number])
        place = max(i for i, block in enumerate(self.system.model.blocks) if block.offset <= system_row)
        block = self.system.model.blocks[place]
        return place, *divmod(system_row - block.offset, block.components)

    def number_in(self, other: Hypotheses, number: int) -> int | None:
        """The number of one of them in another numbering, None where it is not among those."""
        if number < self.rows:
            place = int(np.searchsorted(other.singles, self.singles[number]))
            return place if self.singles[number] in other.singles[place : place + 1] else None
        if number < self.first_group:
            whole = self._whole[number - self.rows]
            return other.rows + other._whole.index(whole) if whole in other._whole else None
        return other._number_of_group.get(self.hypothesis(number).name)

    @cached_property
    def _number_of_group(self) -> dict[str, int]:
        return {group.hypothesis.name: number for number, group in enumerate(self.groups, self.first_group)}

    def whole_observations(self, rows: IntArray) -> IntArray:
        """System rows, ascending, with all components of the observations that some `rows` belong to."""
        mask: BoolArray = np.zeros(self.system.model.observation_rows, dtype=np.bool_)
        mask[rows] = True
        for block in self.system.model.blocks:
            own: BoolArray = mask[block.system_rows].reshape(-1, block.components)
            own[own.any(axis=1)] = True
        return np.flatnonzero(mask)

    @cached_property
    def columns(self) -> csr_array:
        """H (rows, columns), whitened: what an error of one metre or radian does to each row in its own sds."""
        singles = block_diag([self._singles(block, factor) for block, factor in self.system.blocks()], format="csc")
        return csr_array(hstack([singles[:, self.singles], *map(self._group_columns, self.groups)], format="csr"))

    @staticmethod
    def _singles(block: Block, factor: FloatArray) -> csc_array:
        width = block.components
        count = len(factor) * width
        row = np.repeat(np.arange(count), width)
        column = np.repeat(np.arange(count).reshape(-1, width), width, axis=0).ravel()
        return csc_array((factor.ravel(), (row, column)), shape=(count, count))

    def _group_columns(self, group: Group) -> csc_array:
        width = len(group.hypothesis.components)
        columns = csc_array((self.system.model.observation_rows, width))
        for (place, rows), effect in zip(group.hypothesis.rows, group.effects, strict=True):
            block, factor = self.system.model.blocks[place], self.system.linearisation.factors[place]
            values = np.einsum("rij,rjq->riq", factor[rows], effect)
            row = block.offset + rows[:, None] * block.components + np.arange(block.components)
            places = (np.repeat(row.ravel(), width), np.tile(np.arange(width), row.size))
            columns = columns + csc_array((values.ravel(), places), shape=columns.shape)
        return csc_array(columns)

    @cached_property
    def lasting(self) -> BoolArray:
        """Which columns (columns,) are errors of held coordinates, which no repetition rids of."""
        singles = np.zeros(self.rows, dtype=np.bool_)
        parts = [np.full(group.width, group.hypothesis.nature == "control") for group in self.groups]
        return np.concatenate([singles, *parts])

    @cached_property
    def limits(self) -> FloatArray:
        """The least and the largest error (columns, 2) that each column can be."""
        singles = np.tile([-np.inf, np.inf], (self.rows, 1))
        return np.concatenate([singles, *(np.tile(group.limits, (group.width, 1)) for group in self.groups)])

    @cached_property
    def information(self) -> InformationMatrix:
        """G of all columns."""
        columns, factor = self.columns, self.system.factor
        through = csr_array(self.system.matrix.T @ columns)
        if columns.shape[1] <= MOST_DENSE:
            return DenseInformation.of(columns, through, factor)
        return SparseInformation(columns, through, factor, self.diagonal)

    @cached_property
    def diagonal(self) -> FloatArray:
        """Diagonal (system rows,) of G among the singles of the whole system: that of L⁻ᵀ (I − leverage) L⁻¹."""
        blocks = zip(self.system.blocks(), self.system.leverage, strict=True)
        own = [
            np.einsum("rij,rik,rkj->rj", factor, np.eye(block.components) - leverage, factor).ravel()
            for (block, factor), leverage in blocks
        ]
        return np.concatenate(own)

    @cached_property
    def untestable_rows(self) -> IntArray:
        """System rows (k,), ascending, in which an error shows in no residual."""
        weight = np.concatenate(
            [np.einsum("rij,rij->rj", factor, factor).ravel() for _, factor in self.system.blocks()]
        )
        return np.flatnonzero(self.diagonal <= LEAST_INFORMATION * weight)

    def evidence(self, chosen: Sequence[int] = (), errors: FloatArray | None = None) -> Evidence:
        """Scores and information of all columns.

        `chosen` hypotheses with their `errors` ∇₀ (s,) are known about already. The observations are freed of them
        before the residuals e₀ are taken, and score and vᵀPv put together again as g = Hᵀe₀ + G∇₀ and
        e₀ᵀe₀ + 2∇₀ᵀHᵀe₀ + ∇₀ᵀG∇₀: what is small then stays exact beside errors that are a million times as large.
        """
        members, numbers = self._members()
        owned = [members[size][numbers[size] == number][0] for number in chosen for size in [self._size(number)]]
        known = np.concatenate([np.empty(0, dtype=np.int64), *owned])
        sizes = np.empty(0) if errors is None else errors
        residual = self.system.residual_without(self.columns[:, known] @ sizes)
        score = np.asarray(self.columns.T @ residual)
        strips = self.information.columns(known)
        returned = strips @ sizes
        return Evidence(
            score=score + returned,
            information=self.information,
            limits=self.limits,
            weight=np.asarray(self.columns.multiply(self.columns).sum(axis=0)).ravel(),
            members=members,
            numbers=numbers,
            shared=np.arange(self.first_group + len(self.groups)) >= self.first_group,
            square_sum=float(residual @ residual + 2.0 * sizes @ score[known] + sizes @ returned[known]),
            freedom=self.system.freedom,
        )

    def _size(self, number: int) -> int:
        return len(self.hypothesis(number).components)

    def _members(self) -> tuple[dict[int, IntArray], dict[int, IntArray]]:
        """Columns (m, q) and numbers (m,) of the hypotheses by their size q."""
        parts: list[tuple[IntArray, int]] = [(np.arange(self.rows)[:, None], 0)]
        number, used = self.rows, self.rows
        for block in self.system.model.blocks:
            if block.components > 1:
                own = np.searchsorted(self.singles, self._of_block(block)).reshape(-1, block.components)
                parts.append((own, number))
                number += len(own)
        for group in self.groups:
            width = len(group.hypothesis.components)
            parts.append((np.arange(used, used + width)[None], number))
            number, used = number + 1, used + width
        sizes = sorted({part.shape[1] for part, _ in parts})
        of_size = {size: [(part, first) for part, first in parts if part.shape[1] == size] for size in sizes}
        return (
            {size: np.concatenate([part for part, _ in found]) for size, found in of_size.items()},
            {
                size: np.concatenate([first + np.arange(len(part)) for part, first in found])
                for size, found in of_size.items()
            },
        )


def _of_row(place: int, block: Block, row: int, components: Sequence[str]) -> Hypothesis:
    rows = block.observations
    name = rows.provenance.label(row)
    nature = "vector" if len(components) > 1 else "observation"
    return Hypothesis(nature, name, ((place, np.array([row])),), tuple(components), rows.unit)  # type: ignore[arg-type]
